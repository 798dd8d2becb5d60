"""The one file that knows pint: spellings of units, conversion to SI and back, what a wrong unit measures."""

import re
from collections.abc import Iterable
from fractions import Fraction
from functools import lru_cache

import pint

from labbook.errors import Refusal
from labbook.registry.quantities import QUANTITIES, Quantity, quantity

# our spelling -> pint's, where pint would read another thing or nothing
_PINT = {
    "rpm": "1/min",  # a frequency counts revolutions; pint's rpm carries 2 pi
    "fps": "1/s",
    "wt%": "percent",
    "%": "percent",
    "1": "dimensionless",
    "emu": "mA*m**2",
    "G": "si_gauss",
    "P": "poise",
    "cP": "centipoise",
    "degC": "degC",
    "degF": "degF",
    "px": "pixel",
}

_ALIASES = {
    "C": "degC", "F": "degF", "°C": "degC", "℃": "degC", "°F": "degF", "degrees": "deg", "°": "deg",
    "hz": "Hz", "HZ": "Hz", "RPM": "rpm", "rev/min": "rpm", "1/min": "rpm", "s-1": "1/s",
    "Pas": "Pa.s", "mPas": "mPa.s", "mPa-s": "mPa.s", "Am2": "A.m2", "mAm2": "mA.m2", "wt-%": "wt%",
    "cst": "cSt", "kg/m^3": "kg/m3",
}  # fmt: skip

# what pint may be asked about: other text can raise anything in it, or keep it busy for ever (9**9**9)
_ASKABLE = re.compile(r"(?:1|(?:[^\W\d_]|[°%])+-?\d?)(?:[./](?:[^\W\d_]|[°%])+-?\d?)*")

_NOUNS = {
    "[mass]": "a mass", "[length]": "a length", "[time]": "a time", "[current]": "a current",
    "[temperature]": "a temperature", "[length] / [time]": "a speed", "1 / [time]": "a frequency",
    "[length] ** 2": "an area", "[length] ** 3": "a volume", "[mass] / [length] / [time]": "a viscosity",
    "[length] ** 2 / [time]": "a kinematic viscosity", "[mass] / [length] ** 3": "a density",
    "[mass] / [length] / [time] ** 2": "a pressure or modulus", "[length] * [mass] / [time] ** 2": "a force",
    "[length] / [time] ** 2": "an acceleration", "dimensionless": "a pure number",
    "[mass] / [current] / [time] ** 2": "a flux density", "[length] ** 2 * [mass] / [time] ** 2": "an energy",
}  # fmt: skip


@lru_cache(maxsize=1)
def _pint_registry() -> pint.UnitRegistry:
    registry = pint.UnitRegistry(cache_folder=None)
    registry.define("si_gauss = 1e-4 * tesla")  # pint's own gauss belongs to another system of units
    return registry


@lru_cache(maxsize=4096)
def spelled(unit: str) -> str:
    """The house spelling of a typed unit: 'µm' 'um', '°C' 'degC', 'mPa·s' 'mPa.s', 'm²/s' 'm2/s'."""
    text = unit.strip()
    text = text.replace("µ", "u").replace("μ", "u").replace("²", "2").replace("³", "3").replace("⁻", "-")
    text = text.replace("¹", "1").replace("·", ".").replace("⋅", ".").replace("**", "^").replace("*", ".")
    text = re.sub(r"\^(?=\d)", "", text)
    text = re.sub(r"\s*/\s*", "/", text)
    text = re.sub(r"[\s.]+(s|min)\^?-1$", r"/\1", text)
    text = re.sub(r"(?<=\w)\s+(?=[A-Za-z])", ".", text)
    text = text.replace("wt.%", "wt%").replace("wt %", "wt%")
    return _ALIASES.get(text, text)


def _pint_text(unit: str) -> str:
    if unit in _PINT:
        return _PINT[unit]
    parts = re.split(r"([./])", unit)
    known = [{"px": "pixel", "G": "si_gauss", "C": "coulomb"}.get(p, p) for p in parts]
    return re.sub(r"(?<=[A-Za-z])(\d)", r"**\1", "".join(known).replace(".", "*"))


@lru_cache(maxsize=4096)
def _line(key: str, unit: str) -> tuple[float, float]:
    """(slope, offset) with SI = slope * x + offset; the offset is what makes degC right."""
    registry = _pint_registry()
    si = _pint_text(quantity(key).unit)
    zero = registry.Quantity(0.0, _pint_text(unit)).to(si).magnitude
    one = registry.Quantity(1.0, _pint_text(unit)).to(si).magnitude
    if zero == 0.0:
        return float(one), 0.0
    return float(registry.Quantity(1.0, "delta_" + unit).to("kelvin").magnitude), float(zero)


def accepted(key: str, unit: str) -> str:
    """The house spelling of `unit` if the quantity accepts it.

    Errors: Refusal that names the units that would do and, where pint knows the unit, what it measures.
    """
    row, house = quantity(key), spelled(unit)
    if house in row.units:
        return house
    raise Refusal(key, unit, _why_not(row, house), f"type it in {', '.join(row.units[:6])}")


def _why_not(row: Quantity, unit: str) -> str:
    if row.key == "f" and unit in ("rad/s", "rad/min"):
        return "is an angular frequency, and f counts cycles: divide by 2 pi"
    unknown = f"is no unit that labbook knows; {row.one} is needed"
    if not _ASKABLE.fullmatch(unit):
        return unknown
    try:
        found = _pint_registry().Unit(_pint_text(unit)).dimensionality
    except (pint.PintError, ValueError, TypeError, AttributeError, ArithmeticError, LookupError,
            SyntaxError, AssertionError):
        return unknown
    measured = " ".join(str(found).split())
    noun = _NOUNS.get(measured, f"of dimension {measured}")
    if found == _pint_registry().Unit(_pint_text(row.unit)).dimensionality:
        return f"is not a unit used here for {row.one}"
    return f"is {noun}, and {row.one} is needed"


def to_si(key: str, value: float, unit: str) -> float:
    """The SI value of `value` in an accepted unit (house spelling)."""
    slope, offset = _line(key, unit)
    return slope * value + offset


def spread_to_si(key: str, u: float, unit: str) -> float:
    """The SI value of a difference or standard uncertainty in an accepted unit."""
    return abs(_line(key, unit)[0]) * u


def from_si(key: str, value, unit: str):
    """A value (float or array) in `unit` from its SI value."""
    slope, offset = _line(key, unit)
    return (value - offset) / slope


def spread_from_si(key: str, u, unit: str):
    """A standard uncertainty in `unit` from its SI value."""
    return u / abs(_line(key, unit)[0])


def si_dimension(key: str) -> dict[str, float]:
    """pint's dimensionality of a quantity's SI unit, as {'[mass]': 1.0, ...} (to check the vocabulary)."""
    unit = QUANTITIES[key].unit
    text = "" if unit == "1" else _pint_text(unit)
    return {name: float(power) for name, power in _pint_registry().Unit(text).dimensionality.items()}


def pure_products(keys: Iterable[str]) -> list[dict[str, Fraction]]:
    """As many independent pure products of powers as the quantities allow, as {key: exponent}.

    One for each quantity beyond the rank of their dimensions (Buckingham, Phys. Rev. 4:345 (1914)), by pint
    from the SI units alone; which of the equivalent sets it finds is pint's affair. Pixels count for nothing.
    Errors: Refusal for an unknown key.
    """
    dimensions = {key: _without_counts(key) for key in dict.fromkeys(keys)}
    found = [{key: Fraction(1)} for key, powers in dimensions.items() if not powers]
    rest = {key: powers for key, powers in dimensions.items() if powers}
    if rest:  # pint cannot be asked about pure numbers alone
        for product in _pint_registry().pi_theorem(rest):
            found.append({key: Fraction(power).limit_denominator(1000) for key, power in product.items()})
    return found


def _without_counts(key: str) -> dict[str, float]:
    quantity(key)
    return {name: power for name, power in si_dimension(key).items() if name != "[printing_unit]"}
