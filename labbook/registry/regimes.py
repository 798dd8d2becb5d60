"""The regimes at birth: named bands on one number each, read in the house dialect on the signed value."""

from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal


@dataclass(frozen=True)
class Regime:
    """A named band low to high on `number`; the closed_* flags say which printed limit belongs to it."""

    name: str
    number: str
    low: float
    high: float
    source: str
    low_closed: bool = True
    high_closed: bool = True

    def holds(self, value):
        """Whether each value lies in the band (NaN never does)."""
        value = np.asarray(value, dtype=float)
        above = value >= self.low if self.low_closed else value > self.low
        below = value <= self.high if self.high_closed else value < self.high
        return above & below


INF = float("inf")
_COMMON = "common practice, no source"

REGIMES: dict[str, Regime] = {
    r.name: r
    for r in (
        Regime("creeping", "Re_omega", -INF, 0.1, _COMMON, high_closed=False),
        Regime("nearly creeping", "Re_omega", 0.1, 1.0, _COMMON),
        Regime("transitional", "Re_omega", 1.0, 1000.0, _COMMON, low_closed=False),
        Regime("inertial", "Re_omega", 1000.0, INF, _COMMON, low_closed=False),
        Regime("stiff tail", "Sp", -INF, 1.0, _COMMON, high_closed=False),
        Regime("working tail", "Sp", 1.0, 4.0, _COMMON),
        Regime("floppy tail", "Sp", 4.0, INF, _COMMON, low_closed=False),
        Regime("cruising", "St", 0.2, 0.4, "Taylor, Nudds & Thomas, Nature 425:707 (2003)"),
    )
}


def regime(name: str) -> Regime:
    """The band of a name; Refusal for an unknown one."""
    try:
        return REGIMES[name]
    except KeyError:
        raise Refusal("regime", name, "no regime has this name", f"one of {', '.join(REGIMES)}") from None


def regimes_of(values) -> list[str]:
    """The names of the regimes that a run's numbers (a mapping key to value or None) fall in."""
    known = (r for r in REGIMES.values() if values.get(r.number) is not None)
    return [r.name for r in known if r.holds(values[r.number])]
