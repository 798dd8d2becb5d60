"""Quantities as typed: '12.4(3) mm/min', '0.50 +- 0.02 Hz', '23,1 °C' to SI value and uncertainty."""

import math
import re
from functools import lru_cache
from typing import NamedTuple

from labbook.errors import Refusal
from labbook.registry.quantities import quantity
from labbook.registry.units import accepted, spread_to_si, to_si

DIGITS = "digits"  # no uncertainty was typed: half the last written digit, rectangular
STATED = "stated"
REDUCED = "reduced"  # from a track: the text was written by labbook, and reads as value and uncertainty
MOST_CHARACTERS = 80
ROOT_3 = math.sqrt(3)


class Typed(NamedTuple):
    """One quantity as typed.

    text: as written; unit: house spelling of the unit it was in; value and u: SI value and standard
    uncertainty; origin: 'stated' where an uncertainty was typed, 'digits' where it follows from the digits,
    'reduced' where nobody typed it: it comes from a track.
    """

    text: str
    unit: str
    value: float
    u: float
    origin: str


_NUMBER = r"[+-]?(?:\d+(?:\.\d*)?|\.\d+)"
_EXP = r"[eE][+-]?\d+"
_UNIT = r"(?:[^\d\s+().,-][^+()]*?|(?<=\s)1(?:/\w+)?)"
_PLAIN = re.compile(rf"({_NUMBER})({_EXP})?\s*({_UNIT})?")
_SHORT = re.compile(rf"({_NUMBER})\((\d+(?:\.\d+)?)\)({_EXP})?\s*({_UNIT})?")
_BOTH = re.compile(
    rf"(\(?)\s*({_NUMBER})({_EXP})?\s*({_UNIT})?\s*\+-\s*"
    rf"(\d+(?:\.\d*)?(?:{_EXP})?|\.\d+)\s*(\)?)({_EXP})?\s*({_UNIT})?"
)
# what most cells of a sheet hold, read and printed without the detours: 12.4 and 12.4(3), the unit in the header
_BARE = re.compile(r"([+-]?\d+(?:\.(\d*))?)(?:\((\d+)\))?", re.ASCII)
_THOUSANDS = re.compile(r"(?<![\d.,])[1-9]\d{0,2}(,\d{3})+(?!\d)")
_TIMES_TEN = re.compile(r"(?<=[\d.)])\s*[x×]\s*10(?:\^([+-]?\d+)|([+-]\d+)|([⁺⁻]?[⁰¹²³⁴⁵⁶⁷⁸⁹]+))")
_RAISED = str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁺⁻", "0123456789+-")


def plain(key: str, text: str, decimal_comma: bool = False) -> str:
    """The text with a decimal point, plain signs and '+-'.

    Errors: Refusal for '1,000', which is a thousand to one reader and one to another, unless the caller
    knows that the comma is decimal.
    """
    if len(text) > MOST_CHARACTERS:
        raise Refusal(key, text[:20] + "...", "is too long for one quantity", "write e.g. 12.4(3) mm/s")
    tidy = text.strip().replace("−", "-").replace("–", "-").replace("±", "+-").replace("+/-", "+-")
    tidy = tidy.replace("\u00a0", " ")
    if "10" in tidy:
        tidy = _TIMES_TEN.sub(lambda m: "e" + (m[1] or m[2] or m[3].translate(_RAISED)), tidy)
    if "," in tidy:
        if not decimal_comma and _THOUSANDS.search(tidy):
            raise Refusal(
                key, text, "may mean a thousand or a decimal comma", "write 1000 or 1.000, with a point"
            )
        if re.search(r",.*,", tidy) and "+-" not in tidy or re.search(r"\d\.\d*,|,\d*\.\d", tidy):
            raise Refusal(key, text, "cannot be read as a number", "write it with one decimal point")
        tidy = re.sub(r"(?<=\d),(?=\d)", ".", tidy)
    return tidy


def printed(key: str, typed: Typed) -> str:
    """A text that reads as the same value, uncertainty and unit wherever it is typed again."""
    if _BARE.fullmatch(typed.text):
        return f"{typed.text} {typed.unit}"
    tidy = plain(key, typed.text, decimal_comma=True)
    _, _, own_unit, _, relative = _parts(key, typed.text, True)
    if own_unit is not None:
        return tidy
    if relative:  # the per cent sign stands last, so the unit goes to the value
        return re.sub(r"\s*\+-", f" {typed.unit} +-", tidy, count=1)
    return f"{tidy} {typed.unit}"


@lru_cache(maxsize=200_000)
def read(key: str, text: str, unit: str | None = None, decimal_comma: bool = False) -> Typed:
    """Read one quantity; `unit` is the header's, used where the text has none of its own.

    Errors: Refusal (unreadable, not finite, unit missing, unknown or of the wrong kind, impossible sign).
    """
    value, u, own_unit, origin, relative = _parts(key, text, decimal_comma)
    row = quantity(key)
    if own_unit is None and unit is None:
        if row.unit != "1":
            raise Refusal(key, text, "has no unit", f"add one of {', '.join(row.units[:6])}")
        unit = "1"
    try:
        house = accepted(key, own_unit if own_unit is not None else unit)
    except Refusal as refusal:
        raise Refusal(
            key, text, f"{refusal.typed} {refusal.reason}", refusal.remedy
        ) from None
    if relative and house in ("degC", "degF"):
        raise Refusal(
            key, text, f"a percentage in {house} depends on where the scale starts", f"write +- 0.5 {house}"
        )
    si = to_si(key, value, house)
    spread = abs(si) * u if relative else spread_to_si(key, u, house)
    if not (math.isfinite(si) and math.isfinite(spread)):
        raise Refusal(key, text, "is not a finite number")
    if row.sign == "positive" and si <= 0:
        raise Refusal(key, text, f"{row.one} must be greater than zero")
    if row.sign == "not negative" and si < 0:
        raise Refusal(key, text, f"{row.one} cannot be negative")
    if key == "glycerol" and si > 1:
        raise Refusal(key, text, "a mass fraction cannot exceed 100 wt%", "type it in wt%, e.g. 85 wt%")
    return Typed(text.strip(), house, si, spread, origin)


def _parts(key, text, decimal_comma):
    """(value, u, unit or None, origin, whether u is relative) in the typed unit."""
    if len(text) <= MOST_CHARACTERS and (match := _BARE.fullmatch(text)):
        digits, decimals, u = match.groups()
        half = 10.0 ** -len(decimals or "")
        if u is None:
            return float(digits), 0.5 * half / ROOT_3, None, DIGITS, False
        return float(digits), float(f"{u}e-{len(decimals or '')}"), None, STATED, False
    tidy = plain(key, text, decimal_comma)
    if match := _PLAIN.fullmatch(tidy):
        digits, exponent, unit = match.groups()
        decimals = len(digits.partition(".")[2])
        half = float(f"0.5e{int((exponent or 'e0')[1:]) - decimals}")
        return float(digits + (exponent or "")), half / ROOT_3, unit, DIGITS, False
    if match := _SHORT.fullmatch(tidy):
        digits, u, exponent, unit = match.groups()
        power = int((exponent or "e0")[1:])
        places = 0 if "." in u else len(digits.partition(".")[2])  # 1.2(34) is 3.4, and so is 1.2(3.4)
        return float(digits + (exponent or "")), float(f"{u}e{power - places}"), unit, STATED, False
    if match := _BOTH.fullmatch(tidy):
        return _value_and_spread(key, text, match)
    if re.match(r"[+-]?(nan|inf)", tidy.lower()):
        raise Refusal(key, text, "is not a finite number")
    row = quantity(key)
    raise Refusal(key, text, f"cannot be read as {row.one}", f"write e.g. {_example(row)}")


def _example(row) -> str:
    unit = "" if row.unit == "1" and len(row.units) == 1 else f" {row.units[min(1, len(row.units) - 1)]}"
    return f"12.4(3){unit} or 12.4 +- 0.3{unit}"


def _value_and_spread(key, text, match):
    opened, digits, exponent, inner, spread, closed, outer_exponent, outer = match.groups()
    if bool(opened) != bool(closed) or (outer_exponent and not closed):
        raise Refusal(key, text, "has an unmatched bracket")
    value = float(digits + (exponent or "")) * float("1" + (outer_exponent or "e0"))
    u = float(spread) * float("1" + (outer_exponent or "e0"))
    inner, outer = (inner or "").strip() or None, (outer or "").strip() or None
    per_cent_is_its_unit = "%" in quantity(key).units
    if outer and outer.startswith("%") and not closed and not (per_cent_is_its_unit and inner in (None, "%")):
        if per_cent_is_its_unit:
            raise Refusal(key, text, "is a percentage of the value or of the whole", "write +- 0.5 wt%")
        rest = outer[1:].strip() or None
        if inner and rest:
            raise Refusal(key, text, "has two units")
        return value, u / 100, inner or rest, STATED, True
    if inner and outer and accepted(key, inner) != accepted(key, outer):
        raise Refusal(key, text, "value and uncertainty are in different units", "use one unit for both")
    return value, u, outer or inner, STATED, False


def read_uncertainty(key: str, text: str, unit: str | None = None) -> Typed:
    """Read a stated uncertainty of `key`: '0.5 %' (origin 'relative') or '0.002 Hz' (origin 'absolute')."""
    field = f"u_{key}"
    value, _, own_unit, _, _ = _parts(key, text, False)
    chosen = own_unit if own_unit is not None else unit
    if value < 0:
        raise Refusal(field, text, "an uncertainty cannot be negative")
    if not math.isfinite(value):
        raise Refusal(field, text, "is not a finite number")
    if chosen is None:
        raise Refusal(field, text, "has no unit", f"add % or one of {', '.join(quantity(key).units[:6])}")
    if chosen.strip() == "%":
        return Typed(text.strip(), "%", value / 100, 0.0, "relative")
    house = accepted(key, chosen)
    return Typed(text.strip(), house, spread_to_si(key, value, house), 0.0, "absolute")


def reduced(key: str, value: float, u: float) -> Typed:
    """A quantity from a track: written in SI with three digits of u, and rounded to what that text reads as.

    Errors: Refusal (not finite, no uncertainty, impossible sign).
    """
    if not (math.isfinite(value) and math.isfinite(u) and u > 0):
        raise Refusal(key, f"{value:g} +- {u:g}", "is not measured by this track", "leave it out")
    first = math.floor(math.log10(max(abs(value), u)))
    places = min(first - math.floor(math.log10(u)) + 2, 15)  # a float has no more
    scaled, last = value / 10.0**first, max(round(u / 10.0 ** (first - places)), 1)
    text = f"{scaled + 0.0:.{places}f}({last})" + (f"e{first}" if first else "") + f" {quantity(key).unit}"
    return read(key, text)._replace(origin=REDUCED)


def printed_uncertainty(typed: Typed) -> str:
    """A text that reads as the same stated uncertainty wherever it is typed again."""
    return typed.text if not typed.text[-1:].isdigit() else f"{typed.text} {typed.unit}"
