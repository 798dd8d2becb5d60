"""What stands on an axis: titles from the registry, domains, tick values and their lettering."""

import math
import re
from collections.abc import Iterable, Mapping
from fractions import Fraction

import altair as alt
import numpy as np

from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS, Number
from labbook.registry.formula import Leaf, Power, Product, Sum
from labbook.registry.quantities import QUANTITIES

HOUSE = "house dialect"
_SUPERSCRIPTS = str.maketrans("0123456789-", "⁰¹²³⁴⁵⁶⁷⁸⁹⁻")
LONGEST_TITLE = 48  # letters in a line of an axis title
LONGEST_FORMULA = 60  # letters: a longer definition stands in the caption alone


def written_formula(node) -> str:
    """A formula tree in symbols, for example 'L_tail (ζ_n ω/EI)^(1/4)'."""
    match node:
        case Leaf(key="", number=number):
            return "π" if number == math.pi else f"{number:g}"
        case Leaf(key=key):
            return QUANTITIES[key].symbol
        case Power(base=base, exponent=exponent):
            inner = written_formula(base) if isinstance(base, Leaf) else f"({written_formula(base)})"
            return inner + _written_exponent(exponent)
        case Sum(left=left, right=right, sign=sign):
            lower = _bracketed(right, Sum) if sign == "-" else written_formula(right)
            return f"{written_formula(left)} {'−' if sign == '-' else '+'} {lower}"
        case Product(left=left, right=right, sign="/"):
            return f"{_bracketed(left, Sum)}/{_bracketed(right, Sum, Product)}"
        case Product(left=left, right=right):
            factors = [f"({t})" if "/" in t and not t.endswith(")") else t
                       for t in (_bracketed(left, Sum), _bracketed(right, Sum))]
            return ("" if factors[0][-1].isdigit() and factors[1] == "π" else " ").join(factors)
    raise Refusal("formula", node, "not a formula tree")


def _bracketed(node, *kinds) -> str:
    text = written_formula(node)
    return f"({text})" if isinstance(node, kinds) else text


def _written_exponent(exponent: Fraction) -> str:
    if exponent.denominator == 1:
        return str(exponent.numerator).translate(_SUPERSCRIPTS)
    return f"^({exponent})"


def written_unit(unit: str) -> str:
    """An SI unit as printed: 'Pa.s' is 'Pa s', 'kg/m3' is 'kg/m³'; empty for a pure number."""
    if unit == "1":
        return ""
    raised = "".join(
        c.translate(_SUPERSCRIPTS) if c.isdigit() and i and unit[i - 1].isalpha() else c
        for i, c in enumerate(unit)
    )
    return raised.replace(".", " ")


def label(key: str, numbers: Mapping[str, Number] = NUMBERS) -> str:
    """The symbol of a key; Refusal for a key that is neither quantity nor number."""
    row = numbers.get(key) or QUANTITIES.get(key)
    if row is None:
        raise Refusal("key", key, "no quantity or number has this key")
    return row.symbol


def title(key: str, dialect: str = HOUSE, numbers: Mapping[str, Number] = NUMBERS) -> str:
    """The axis title of a key: symbol, definition and dialect of a number, name and unit of a quantity."""
    if key in numbers:
        row = numbers[key]
        head = _defined(row)
        head = head if len(head) <= LONGEST_FORMULA else f"{row.name} {row.symbol}"
        return f"{head}, {dialect}" if dialect else head
    symbol = label(key, numbers)
    row = QUANTITIES[key]
    unit = written_unit(row.unit)
    return f"{symbol} {row.name} ({unit})" if unit else f"{symbol} {row.name}"


def _defined(row: Number) -> str:
    """A number with its definition."""
    formula = written_formula(row.parsed.tree)
    return f"{row.name} {formula}" if row.symbol == formula else f"{row.symbol} = {formula}"


def house_words(keys: Iterable[str], numbers: Mapping[str, Number] = NUMBERS) -> str:
    """The numbers among some keys with the house dialect of each, in sentences; '' where none is a number."""
    named = [
        _defined(numbers[key]) + (f", {HOUSE} ({numbers[key].dialect})" if numbers[key].dialect else "")
        for key in dict.fromkeys(keys) if key in numbers
    ]
    return f"{'. '.join(named)}." if named else ""


def title_lines(text: str, longest: int = LONGEST_TITLE) -> list[str]:
    """A title in lines of at most `longest` letters where it allows that.

    It breaks after a comma first, then at a space, never inside brackets; nothing is cut.
    """
    if len(text) <= longest:
        return [text]
    lines = []
    for piece in re.split(r"(?<=,) (?![^(]*\))", text):
        lines.append("")
        for word in re.split(r" (?![^(]*\))", piece):
            if lines[-1] and len(lines[-1]) + 1 + len(word) > longest:
                lines.append(word)
            else:
                lines[-1] = f"{lines[-1]} {word}".strip()
    return lines


def log_domain(values) -> tuple[float, float]:
    """Low and high of a log axis: the positive values and 4 % of their span, at least a third of a decade."""
    values = np.asarray(values, dtype=float)
    values = values[np.isfinite(values) & (values > 0)]
    if not values.size:
        return 0.1, 10.0
    low, high = math.log10(values.min()), math.log10(values.max())
    pad = max(0.04 * (high - low), (1 / 3 - (high - low)) / 2, 0.02)
    return 10 ** (low - pad), 10 ** (high + pad)


def linear_domain(values) -> tuple[float, float]:
    """Low and high of a linear axis: the values and 4 % of their span; for a single value 10 % of it."""
    values = np.asarray(values, dtype=float)
    values = values[np.isfinite(values)]
    if not values.size:
        return 0.0, 1.0
    low, high = float(values.min()), float(values.max())
    pad = 0.04 * (high - low) or 0.1 * abs(low) or 1.0
    return low - pad, high + pad


_MANTISSAS = (
    (0.55, (1, 1.5, 2, 2.5, 3, 4, 5, 6, 8)),
    (1.4, (1, 2, 3, 4, 6)),
    (2.3, (1, 2, 5)),
    (4.5, (1, 3)),
)


def log_ticks(low: float, high: float) -> list[float]:
    """Tick values of a log axis from low to high: whole decades on a long one, 1 2 3 4 6 on a short one."""
    span = math.log10(high / low)
    mantissas = next((m for limit, m in _MANTISSAS if span < limit), (1,))
    decades = range(math.floor(math.log10(low)), math.ceil(math.log10(high)) + 1)
    if len(mantissas) == 1:
        step = math.ceil(span / 8)
        decades = [d for d in decades if d % step == 0]
    ticks = [float(f"{m}e{d}") for d in decades for m in mantissas]
    inside = [v for v in ticks if low <= v <= high]
    return inside if len(inside) >= 3 else linear_ticks(low, high)


def linear_ticks(low: float, high: float, about: int = 6) -> list[float]:
    """Tick values of a linear axis: multiples of 1, 2 or 5 times a power of ten, about six of them."""
    rough = (high - low) / about
    power = 10.0 ** math.floor(math.log10(rough))
    step = power * next(m for m in (1, 2, 5, 10) if m * power >= rough * 0.999)
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    # twelve digits: k * step leaves 0.30000000000000004
    return [float(f"{k * step:.12g}") for k in range(first, last + 1)]


def tick_label(value: float) -> str:
    """A tick as printed: plain from 0.001 to 9999, else as 3×10⁻⁴ or 10⁻⁴."""
    if value == 0 or 0.999e-3 < abs(value) < 9999.5:
        return f"{value:.6g}".replace("-", "−")
    mantissa, exponent = f"{value:.4e}".split("e")
    mantissa = f"{float(mantissa):g}"
    power = "10" + str(int(exponent)).translate(_SUPERSCRIPTS)
    if mantissa in ("1", "-1"):
        return mantissa.replace("1", "").replace("-", "−") + power
    return f"{mantissa}×{power}".replace("-", "−")


def axis(low: float, high: float, log: bool, *, factor: float = 1.0, **options) -> alt.Axis:
    """An axis whose ticks are chosen and lettered here.

    factor turns the scale's values into the printed ones; options go to altair.
    """
    ticks = (log_ticks if log else linear_ticks)(low * factor, high * factor)
    labels = [tick_label(v) for v in ticks]
    # a tick's index runs from 0 to 1 in Vega, and is not a number where there is one tick
    pick = f"[{', '.join(repr(t) for t in labels)}][round((datum.index || 0) * {len(labels) - 1})]"
    return alt.Axis(values=[v / factor for v in ticks], labelExpr=pick, **options)


def scale(low: float, high: float, log: bool) -> alt.Scale:
    """A scale from low to high, neither rounded out nor forced to zero."""
    return alt.Scale(type="log" if log else "linear", domain=[low, high], nice=False, zero=False)
