"""Regimes: named bands on one or two numbers, read in the house dialect on the signed value."""

import math
from collections.abc import Container, Iterable, Mapping
from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal

INF = float("inf")

LONGEST_NAME = 64

# Okabe & Ito (2008), told apart by colour-blind readers. Their vermilion is too near the rust of the run in
# hand, their black is the ink of the page; charts/palette.py gives each name its hue
COLOURS = ("orange", "sky", "green", "yellow", "blue", "purple")


@dataclass(frozen=True)
class Band:
    """From low to high on one number; the *_closed flags say which printed limit belongs to the band.

    Errors: Refusal where low is not below high, where neither limit is finite, or without a number's key.
    """

    number: str
    low: float = -INF
    high: float = INF
    low_closed: bool = True
    high_closed: bool = True

    def __post_init__(self):
        if not isinstance(self.number, str) or not self.number.isidentifier():
            raise Refusal("number", self.number, "a band stands on one number's key")
        for side in ("low", "high"):
            limit, closed = getattr(self, side), getattr(self, f"{side}_closed")
            if isinstance(limit, bool) or not isinstance(limit, int | float) or math.isnan(limit):
                raise Refusal(side, limit, "a limit is a number")
            if not isinstance(closed, bool):
                raise Refusal(f"{side}_closed", closed, "is true or false")
            object.__setattr__(self, side, float(limit))
        if not self.low < self.high:
            raise Refusal(
                "high", f"{self.high:g}", f"must lie above the lower limit, {self.low:g}", "swap the limits"
            )
        if math.isinf(self.low) and math.isinf(self.high):
            raise Refusal(self.number, None, "a band needs at least one limit")

    def holds(self, value):
        """Whether each value lies in the band: a scalar, None or an array; an absent value never does."""
        value = np.asarray(value, dtype=float)
        above = value >= self.low if self.low_closed else value > self.low
        below = value <= self.high if self.high_closed else value < self.high
        return above & below

    @property
    def words(self) -> str:
        """'0.1 <= Re_omega <= 1', or one-sided: 'Re_omega < 0.1'."""
        return interval_words(self.number, self.low, self.high, self.low_closed, self.high_closed)


def interval_words(number: str, low: float, high: float, low_closed: bool, high_closed: bool) -> str:
    """An interval of a number in signs; a single point is 'Sp = 1'."""
    if low == high:
        return f"{number} = {low:.12g}"
    under, over = "<=" if low_closed else "<", "<=" if high_closed else "<"
    if math.isinf(low) and math.isinf(high):
        return f"every {number}"
    if math.isinf(high):
        return f"{number} >{under[1:]} {low:.12g}"
    return (f"{low:.12g} {under} " if math.isfinite(low) else "") + f"{number} {over} {high:.12g}"


@dataclass(frozen=True)
class Regime:
    """A named band on one number, or two bands on two numbers that must both hold.

    source: where the limits come from; colour: one of COLOURS, or '' for the page to choose.
    Errors: Refusal for a name that is not one line of at most 64 characters, no or more than two bands, two
    bands on one number, a missing source or an unknown colour.
    """

    name: str
    bands: tuple[Band, ...]
    source: str
    colour: str = ""

    def __post_init__(self):
        if not _is_line(self.name) or len(self.name) > LONGEST_NAME:
            raise Refusal("name", self.name, f"a regime's name is one line of 1 to {LONGEST_NAME} characters")
        if not isinstance(self.bands, tuple | list) or not all(isinstance(b, Band) for b in self.bands):
            raise Refusal("bands", self.bands, "a regime is made of bands")
        object.__setattr__(self, "bands", tuple(self.bands))
        if len(self.bands) not in (1, 2):
            raise Refusal(self.name, len(self.bands), "a regime stands on one or two numbers")
        if len(set(self.numbers)) < len(self.bands):
            raise Refusal(
                self.name, self.bands[0].number, "both bands stand on the same number",
                "choose another number, or give one band",
            )
        if not _is_line(self.source):
            raise Refusal(self.name, None, "a regime needs a source", "at least 'common practice, no source'")
        if self.colour and self.colour not in COLOURS:
            raise Refusal("colour", self.colour, "is not a colour of regimes", f"one of {', '.join(COLOURS)}")

    @property
    def numbers(self) -> tuple[str, ...]:
        """The keys of the numbers that it stands on."""
        return tuple(b.number for b in self.bands)

    @property
    def words(self) -> str:
        """The bands in signs: '0.1 <= Re_omega <= 1 and Sp < 1'."""
        return " and ".join(b.words for b in self.bands)

    def holds(self, values):
        """Whether each run lies in the regime.

        values: a mapping of number keys to scalars, None or arrays of one shape, where an absent key never
        holds; or, for a regime on one number, that number's values alone.
        """
        if not isinstance(values, Mapping):
            return self._only.holds(values)
        first, *others = (b.holds(values.get(b.number)) for b in self.bands)
        for other in others:
            first = first & other
        return first

    @property
    def _only(self) -> Band:
        if len(self.bands) > 1:
            raise Refusal(self.name, None, "stands on two numbers and has no one band", "read its bands")
        return self.bands[0]

    @property
    def number(self) -> str:
        """The number of a regime on one number; this and the four below are refused for two."""
        return self._only.number

    @property
    def low(self) -> float:
        return self._only.low

    @property
    def high(self) -> float:
        return self._only.high

    @property
    def low_closed(self) -> bool:
        return self._only.low_closed

    @property
    def high_closed(self) -> bool:
        return self._only.high_closed

    def content(self) -> dict:
        """The regime as plain values for JSON; an endless side is None."""
        rows = [
            {"number": b.number, "low": _finite(b.low), "high": _finite(b.high),
             "low_closed": b.low_closed, "high_closed": b.high_closed}
            for b in self.bands
        ]  # fmt: skip
        return {"name": self.name, "bands": rows, "source": self.source, "colour": self.colour}


def from_content(content: Mapping) -> Regime:
    """The regime that `content()` told; Refusal where it is not one."""
    try:
        bands = tuple(
            Band(row["number"], -INF if row["low"] is None else row["low"],
                 INF if row["high"] is None else row["high"], row["low_closed"], row["high_closed"])
            for row in content["bands"]
        )  # fmt: skip
        return Regime(content["name"], bands, content["source"], content["colour"])
    except (KeyError, TypeError):
        raise Refusal(
            "regime", str(content)[:80], "is not a regime's content", "give name, bands, source and colour"
        ) from None


def _is_line(text) -> bool:
    return isinstance(text, str) and bool(text) and text == text.strip() and text.isprintable()


def _finite(limit: float) -> float | None:
    return limit if math.isfinite(limit) else None


_COMMON = "common practice, no source"


def _regime(name, number, low, high, source=_COMMON, *, low_closed=True, high_closed=True):
    return Regime(name, (Band(number, low, high, low_closed, high_closed),), source)


REGIMES: dict[str, Regime] = {
    r.name: r
    for r in (
        _regime("creeping", "Re_omega", -INF, 0.1, high_closed=False),
        _regime("nearly creeping", "Re_omega", 0.1, 1.0),
        _regime("transitional", "Re_omega", 1.0, 1000.0, low_closed=False),
        _regime("inertial", "Re_omega", 1000.0, INF, low_closed=False),
        _regime("stiff tail", "Sp", -INF, 1.0, high_closed=False),
        _regime("working tail", "Sp", 1.0, 4.0),
        _regime("floppy tail", "Sp", 4.0, INF, low_closed=False),
        _regime("cruising", "St", 0.2, 0.4, "Taylor, Nudds & Thomas, Nature 425:707 (2003)"),
    )
}


def regime(name: str, regimes: Mapping[str, Regime] = REGIMES) -> Regime:
    """The regime of a name; Refusal for an unknown one."""
    try:
        return regimes[name]
    except KeyError:
        raise Refusal("regime", name, "no regime has this name", f"one of {', '.join(regimes)}") from None


def regimes_of(values: Mapping, regimes: Mapping[str, Regime] = REGIMES) -> list[str]:
    """The names of the regimes that a run's numbers (a mapping key to value or None) fall in."""
    return [r.name for r in regimes.values() if r.holds(values)]


def checked(row: Regime, numbers: Container[str] | Iterable[str]) -> Regime:
    """The regime, if it stands on known numbers; Refusal otherwise."""
    for key in row.numbers:
        if key not in numbers:
            raise Refusal("number", key, "no number has this key", f"one of {', '.join(sorted(numbers))}")
    return row
