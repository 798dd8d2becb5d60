"""Limits of a range as people type and read them: in the key's usual unit, or with a unit of their own."""

import math

from labbook.errors import Refusal
from labbook.registry.quantities import QUANTITIES
from labbook.registry.typed import read
from labbook.registry.units import from_si, to_si
from labbook.registry.written import SHOWN


def limit_unit(key: str) -> str:
    """The unit that a bare limit of this key is in; empty for a pure number."""
    row = QUANTITIES.get(key)
    if row is None or row.unit == "1":
        return ""
    return SHOWN.get(key, row.unit) if row.units else row.unit


def read_limit(key: str, text: str) -> float | None:
    """A limit in SI from '1.5' in the key's usual unit, or from '0.5 Pa.s'; None where nothing is typed."""
    text = text.strip()
    if not text:
        return None
    row = QUANTITIES.get(key)
    if row is None or not row.units:
        return _number(key, text)
    try:
        bare = float(text)
    except ValueError:
        return read(key, text).value
    # not through `read`: a limit may be zero or negative where no value of the quantity is
    return to_si(key, bare, limit_unit(key)) if math.isfinite(bare) else _number(key, text)


def limits(key: str, low: str, high: str) -> tuple[float, float] | None:
    """The range in SI of two limits as typed, an empty one open; None where both are empty."""
    found = read_limit(key, low), read_limit(key, high)
    if found == (None, None):
        return None
    span = (-math.inf if found[0] is None else found[0], math.inf if found[1] is None else found[1])
    if span[0] > span[1]:
        raise Refusal(key, f"{low} to {high}", "is an empty range", "give the lower limit first")
    return span


def _number(key: str, text: str) -> float:
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if math.isnan(value):
        raise Refusal(key, text, "is no number", "write e.g. 1.5, or leave it empty for no limit")
    return value


def in_limit_unit(key: str, values):
    """SI values (float or array) in the unit of the key's bare limits."""
    row = QUANTITIES.get(key)
    return (
        from_si(key, values, limit_unit(key)) if row is not None and row.units and limit_unit(key) else values
    )


def written_limit(key: str, value: float) -> str:
    """A limit as it would be typed: in the key's usual unit, empty where it is open."""
    if not math.isfinite(value):
        return ""
    return f"{in_limit_unit(key, value):.6g}"


def range_in_words(key: str, low: float, high: float) -> str:
    """A range as a page shows it: 'Sp 1 to 3', 'μ from 500 mPa.s'."""
    symbol = QUANTITIES[key].symbol if key in QUANTITIES else key
    unit = limit_unit(key)
    tail = f" {unit}" if unit else ""
    if math.isinf(low) and math.isinf(high):
        return f"any {symbol}"
    if not math.isfinite(high):
        return f"{symbol} from {written_limit(key, low)}{tail}"
    if not math.isfinite(low):
        return f"{symbol} up to {written_limit(key, high)}{tail}"
    return f"{symbol} {written_limit(key, low)} to {written_limit(key, high)}{tail}"
