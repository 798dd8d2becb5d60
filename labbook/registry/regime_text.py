"""Regimes from what people type: bands in signs such as '0.1 <= Re_omega < 1', regimes from cells."""

import math
import re
from collections.abc import Collection, Mapping

from labbook.errors import Refusal, Refusals
from labbook.registry.catalogue import Number
from labbook.registry.regimes import COLOURS, INF, LONGEST_NAME, Band, Regime

FIELDS = ("name", "band", "second", "colour", "source")
MOST_TEXT = 400
HOW = "write e.g. Sp > 4 or 0.2 <= St <= 0.4"
_SIGN = re.compile(r"(<=|>=|<|>)")
_LIMIT = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?")
# signs as a keyboard, a text processor or this app's own pages write them
_PLAIN = str.maketrans({"≤": "<=", "≥": ">=", "⩽": "<=", "⩾": ">=", "−": "-", "\u00a0": " "})
_NO_KEY = object()


def read_band(text: str, numbers: Mapping[str, Number] | None = None, field: str = "band") -> Band:
    """The band of '0.1 <= Re_omega < 1', 'Sp > 4', '1 < Sp' or '4 >= Sp > 1', as Band.words writes it.

    ≤ and ≥ will do, and so will a decimal comma. numbers: the numbers that a band may stand on, then also
    by their symbol; left out: any key. Errors: Refusal of `field`, with what would do.
    """
    typed = text.strip()
    if len(typed) > MOST_TEXT:
        raise Refusal(field, typed[:40] + "...", f"is longer than {MOST_TEXT} characters", HOW)
    parts = [p.strip() for p in _SIGN.split(typed.translate(_PLAIN))]
    terms, signs = parts[::2], parts[1::2]
    if len(signs) not in (1, 2) or not all(terms):
        raise Refusal(field, typed or None, _not_a_band(typed, terms, signs), HOW)
    if len({s[0] for s in signs}) > 1:
        raise Refusal(field, typed, "the two signs point different ways", "write e.g. 1 < Sp <= 4")
    if signs[0][0] == ">":
        terms, signs = terms[::-1], [s.replace(">", "<") for s in signs[::-1]]
    # from here on everything ascends: low < key < high, or a side of it
    keys = [_key(term, numbers) for term in terms]
    # what names a number stands in the middle of three terms; of two, where no limit stands
    place = (
        1 if len(signs) == 2 or keys[0] is _NO_KEY and (keys[1] is not _NO_KEY or _is_limit(terms[0])) else 0
    )
    key = keys[place]
    if key is _NO_KEY:
        raise Refusal(field, typed, f"{terms[place]!r} is no number of the registry", _known(numbers))
    low = _limit(terms[place - 1], typed, field) if place else -INF
    high = _limit(terms[place + 1], typed, field) if place + 1 < len(terms) else INF
    low_closed = signs[0] == "<=" if place else True
    high_closed = signs[-1] == "<=" if place + 1 < len(terms) else True
    if not low < high:
        reason = (
            "holds a single value" if low == high else "is empty: the lower limit lies above the upper one"
        )
        raise Refusal(field, typed, reason, "give the lower limit first, and a higher one after it")
    return Band(key, low, high, low_closed, high_closed)


def read_regime(
    cells: Mapping[str, str], numbers: Mapping[str, Number] | None = None, taken: Collection[str] = ()
) -> Regime:
    """The regime of some cells as typed: name, band, second (a band on another number), colour, source.

    second and colour may be empty; numbers: as in read_band; taken: names it may not have, blind to case.
    Errors: Refusal of the field, or Refusals with every finding.
    """
    given = {k: str(v).strip() for k, v in cells.items() if v is not None and str(v).strip()}
    found = [Refusal(k, None, "a regime has no such field", f"it has {', '.join(FIELDS)}")
             for k in given if k not in FIELDS]  # fmt: skip
    name, source, colour = (given.get(k, "") for k in ("name", "source", "colour"))
    found += _of_name(name, taken)
    bands = _bands(given, numbers, found)
    if not source:
        found.append(Refusal("source", None, "is missing", "at least 'common practice, no source'"))
    elif not source.isprintable() or len(source) > MOST_TEXT:
        found.append(Refusal("source", source[:40], f"is no one line of at most {MOST_TEXT} characters"))
    if colour and colour not in COLOURS:
        found.append(Refusal("colour", colour, "is not a colour of regimes", f"one of {', '.join(COLOURS)}"))
    if found:
        raise Refusals(found) if len(found) > 1 else found[0]
    return Regime(name, bands, source, colour)


def tried_regime(cells: Mapping[str, str], numbers: Mapping[str, Number] | None = None) -> Regime | None:
    """The regime that some unfinished cells would make, None where its bands cannot be read yet.

    A name or source that is missing or cannot stand is stood in for: this one is to be looked at, not kept.
    """
    given = {k: str(v or "").strip() for k, v in cells.items()}
    found: list[Refusal] = []
    bands = _bands(given, numbers, found)
    if found:
        return None
    name, colour = given.get("name", ""), given.get("colour", "")
    return Regime("this regime" if _of_name(name, ()) else name, bands, "not given yet",
                  colour if colour in COLOURS else "")  # fmt: skip


def band_words(band: Band, numbers: Mapping[str, Number]) -> str:
    """A band told without signs: 'sperm number Sp from 1 (included) to 4 (left out)'."""
    row = numbers.get(band.number)
    of = band.number if row is None else row.name if "/" in row.symbol else f"{row.name} {row.symbol}"
    low, high = f"{band.low:.12g}", f"{band.high:.12g}"
    if math.isinf(band.high):
        return f"{of} of {low} and more" if band.low_closed else f"{of} above {low}"
    if math.isinf(band.low):
        return f"{of} of {high} and less" if band.high_closed else f"{of} below {high}"
    first, last = ("included" if closed else "left out" for closed in (band.low_closed, band.high_closed))
    return f"{of} from {low} ({first}) to {high} ({last})"


def pretty(text: str, numbers: Mapping[str, Number]) -> str:
    """A text in signs as a page shows it: ≤ and ≥, and the numbers' symbols in place of their keys."""

    def symbol(match):
        row = numbers.get(match[0])
        return match[0] if row is None or "/" in row.symbol else row.symbol

    return re.sub(r"[A-Za-z_]\w*", symbol, text).replace("<=", "≤").replace(">=", "≥")


def _bands(given, numbers, found: list) -> tuple[Band, ...]:
    """The bands that can be read; what cannot joins `found`."""
    bands = []
    for field in ("band", "second") if given.get("second") else ("band",):
        try:
            bands.append(read_band(given.get(field, ""), numbers, field))
        except Refusal as refusal:
            found.append(refusal)
    if len({b.number for b in bands}) < len(bands):
        reason = f"stands on {bands[1].number}, as the first band does"
        found.append(Refusal("second", given["second"], reason, "choose another number, or leave it empty"))
    return tuple(bands)


def _of_name(name: str, taken: Collection[str]) -> list[Refusal]:
    if not name:
        return [Refusal("name", None, "is missing", "e.g. soft tail")]
    if not name.isprintable() or len(name) > LONGEST_NAME:
        return [Refusal("name", name[:40], f"is no one line of 1 to {LONGEST_NAME} characters")]
    same = next((t for t in taken if t.lower() == name.lower()), None)
    if same is not None:
        return [
            Refusal(
                "name", name, f"the regime {same!r} stands already", "choose it to change it, or another name"
            )
        ]
    return []


def _not_a_band(typed: str, terms: list[str], signs: list[str]) -> str:
    if not typed:
        return "is missing"
    if "=" in typed and not signs:
        return "a single value is no band"
    if not signs:
        return "has no sign such as < or <="
    return "has more than two signs" if len(signs) > 2 else "lacks a number or a limit beside a sign"


def _key(term: str, numbers: Mapping[str, Number] | None):
    """The key that a term names, by key or symbol; _NO_KEY where it names none."""
    if numbers is None:
        return term if term.isidentifier() else _NO_KEY
    if term in numbers:
        return term
    return next((k for k, n in numbers.items() if n.symbol == term), _NO_KEY)


def _known(numbers: Mapping[str, Number] | None) -> str:
    return f"one of {', '.join(numbers)}" if numbers else HOW


def _is_limit(term: str) -> bool:
    return _LIMIT.fullmatch(term.replace(",", ".")) is not None


def _limit(term: str, typed: str, field: str) -> float:
    if not _is_limit(term):
        raise Refusal(
            field, typed, f"{term!r} is no plain number", "numbers have no unit: write e.g. 0.1 or 1e-3"
        )
    value = float(term.replace(",", "."))
    if math.isinf(value):
        raise Refusal(field, typed, f"{term} is too large to tell from no limit", "leave that side out")
    return value
