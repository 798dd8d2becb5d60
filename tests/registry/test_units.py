"""Unit conversion against printed factors, and what a wrong unit is told."""

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from labbook.errors import Refusal
from labbook.registry import units
from labbook.registry.quantities import BASE, QUANTITIES

BASE_IN_PINT = ("[mass]", "[length]", "[time]", "[current]", "[temperature]")

# SI value of 1 unit. Decimal prefixes and the degree, minute, litre: SI Brochure, 9th edition (2019), tables
# 7 and 8. P, cP, St, cSt, G, g/cm3: NIST SP 811 (2008), appendix B.8. The emu of magnetic moment is 1e-3
# A.m2: Goldfarb & Fickett, NBS SP 696 (1985). Rows not listed are a prefix or a product of these.
MINUTE = 60.0
PRINTED = {
    "m": 1.0, "mm": 1e-3, "cm": 1e-2, "um": 1e-6, "nm": 1e-9,
    "Hz": 1.0, "mHz": 1e-3, "kHz": 1e3, "rpm": 1 / MINUTE, "1/s": 1.0,
    "fps": 1.0,  # frames a second: a count, common practice, no source
    "rad": 1.0, "mrad": 1e-3, "deg": math.pi / 180,
    "m/s": 1.0, "mm/s": 1e-3, "um/s": 1e-6, "cm/s": 1e-2, "mm/min": 1e-3 / MINUTE, "um/min": 1e-6 / MINUTE,
    "cm/min": 1e-2 / MINUTE, "m/min": 1 / MINUTE,
    "T": 1.0, "mT": 1e-3, "uT": 1e-6, "G": 1e-4,
    "A": 1.0, "mA": 1e-3,
    "Pa.s": 1.0, "mPa.s": 1e-3, "uPa.s": 1e-6, "cP": 1e-3, "P": 0.1,
    "kg/m3": 1.0, "g/cm3": 1e3, "g/mL": 1e3, "kg/L": 1e3, "g/L": 1.0,
    "m2/s": 1.0, "mm2/s": 1e-6, "cSt": 1e-6, "St": 1e-4,
    "s": 1.0, "ms": 1e-3, "us": 1e-6,
    "Pa": 1.0, "kPa": 1e3, "MPa": 1e6, "GPa": 1e9, "N/mm2": 1e6,
    "A.m2": 1.0, "mA.m2": 1e-3, "uA.m2": 1e-6, "nA.m2": 1e-9, "emu": 1e-3,
    "T/A": 1.0, "mT/A": 1e-3, "uT/A": 1e-6, "G/A": 1e-4,
    "m/px": 1.0, "mm/px": 1e-3, "um/px": 1e-6, "nm/px": 1e-9,
    "1": 1.0, "wt%": 0.01, "%": 0.01,
}  # fmt: skip
AFFINE = {"K", "degC", "degF"}

EVERY_UNIT = [(key, unit) for key, row in QUANTITIES.items() for unit in row.units]


@pytest.mark.parametrize("key", QUANTITIES)
def test_the_si_unit_of_a_quantity_has_its_dimension(key):
    # pint's own definitions are the outside source; a pixel is a counting unit, so px drops out
    found = {name: power for name, power in units.si_dimension(key).items() if name != "[printing_unit]"}
    row = QUANTITIES[key].dimension
    assert found == {pint: power for pint, power in zip(BASE_IN_PINT, row, strict=True) if power}
    assert len(BASE) == len(BASE_IN_PINT)


@pytest.mark.parametrize(("key", "unit"), EVERY_UNIT)
def test_an_accepted_unit_converts_by_its_printed_factor(key, unit):
    if unit in AFFINE:
        return  # checked by its fixed points below
    # 1e-14: the factors are exact, a conversion is a few roundings of 1e-16
    assert units.to_si(key, 3.7, unit) == pytest.approx(3.7 * PRINTED[unit], rel=1e-14)
    assert units.spread_to_si(key, 0.2, unit) == pytest.approx(0.2 * PRINTED[unit], rel=1e-14)


@pytest.mark.parametrize(("value", "unit", "kelvin"), [
    (0.0, "degC", 273.15), (25.0, "degC", 298.15), (-10.0, "degC", 263.15),  # SI Brochure, 2.3.1: K - 273.15
    (32.0, "degF", 273.15), (212.0, "degF", 373.15),  # NIST SP 811, B.8: T/K = (t/degF + 459.67)/1.8
    (68.0, "degF", (68 + 459.67) / 1.8), (300.0, "K", 300.0),
])  # fmt: skip
def test_temperatures_shift_as_well_as_scale(value, unit, kelvin):
    assert units.to_si("T", value, unit) == pytest.approx(kelvin, abs=1e-10)  # kelvin / 2^52 is 1e-13


@pytest.mark.parametrize(("unit", "kelvin"), [("K", 1.0), ("degC", 1.0), ("degF", 1 / 1.8)])
def test_a_difference_of_temperature_only_scales(unit, kelvin):
    assert units.spread_to_si("T", 0.5, unit) == pytest.approx(0.5 * kelvin, rel=1e-12)


def test_rpm_counts_revolutions_and_carries_no_two_pi():
    # SP 811 lists rpm as 0.1047198 rad/s; f counts cycles, and 60 revolutions a minute are one a second
    assert units.to_si("f", 60.0, "rpm") == pytest.approx(1.0, rel=1e-14)


@given(st.sampled_from(EVERY_UNIT), st.floats(-1e6, 1e6), st.floats(0, 1e3))
@settings(max_examples=1000)
def test_conversion_and_its_inverse_agree(row, value, u):
    key, unit = row
    shift = 500.0 if unit in AFFINE else 0.0  # 459.67 in degF; the sum rounds at its own size
    back = units.from_si(key, units.to_si(key, value, unit), unit)
    assert back == pytest.approx(
        value, rel=1e-14, abs=1e-14 * shift + 1e-300
    )  # 1e-300: below it floats thin out
    assert units.spread_from_si(key, units.spread_to_si(key, u, unit), unit) == pytest.approx(
        u, 1e-14, 1e-300
    )


def test_arrays_convert_back():
    assert units.from_si("T", np.array([273.15, 298.15]), "degC") == pytest.approx([0.0, 25.0], abs=1e-10)


@pytest.mark.parametrize(("written", "house"), [
    ("µm", "um"), ("μm", "um"), ("°C", "degC"), ("℃", "degC"), ("C", "degC"), ("°F", "degF"),
    ("mPa·s", "mPa.s"),
    ("mPa s", "mPa.s"), ("mPa*s", "mPa.s"), ("mPas", "mPa.s"), ("Pa.s", "Pa.s"), ("m²/s", "m2/s"),
    ("mm^2/s", "mm2/s"), ("mm**2/s", "mm2/s"), ("mm s-1", "mm/s"), ("mm s⁻¹", "mm/s"), ("mm s^-1", "mm/s"),
    ("mm / s", "mm/s"), ("kg/m³", "kg/m3"), ("kg/m^3", "kg/m3"), ("hz", "Hz"), ("RPM", "rpm"),
    ("rev/min", "rpm"), ("°", "deg"), ("A m²", "A.m2"), ("wt %", "wt%"), (" mm ", "mm"),
])  # fmt: skip
def test_common_spellings(written, house):
    assert units.spelled(written) == house


@pytest.mark.parametrize(("key", "unit", "reason"), [
    ("U", "kg", "is a mass, and a speed is needed"),
    ("U", "mm", "is a length, and a speed is needed"),
    ("L_tail", "s", "is a time, and a length is needed"),
    ("mu", "cSt", "is a kinematic viscosity, and a viscosity is needed"),
    ("nu", "mPa.s", "is a viscosity, and a kinematic viscosity is needed"),
    ("E", "Pa.s", "is a viscosity, and a modulus is needed"),
    ("mu", "Pa", "is a pressure or modulus, and a viscosity is needed"),
    ("B", "A/m", "is of dimension [current] / [length], and a flux density is needed"),
    ("T", "m", "is a length, and a temperature is needed"),
    ("theta0", "mm", "is a length, and an angle is needed"),
    ("L_tail", "inch", "is not a unit used here for a length"),
    ("L_tail", "furlongz", "is no unit that labbook knows; a length is needed"),
])  # fmt: skip
def test_a_wrong_unit_is_told_what_it_measures(key, unit, reason):
    with pytest.raises(Refusal) as refused:
        units.accepted(key, unit)
    assert refused.value.field == key
    assert refused.value.reason == reason
    assert refused.value.remedy == f"type it in {', '.join(QUANTITIES[key].units[:6])}"


@pytest.mark.parametrize("unit", ["rad/s", "rad/min", "rad s-1"])
def test_an_angular_frequency_is_refused_for_f_with_what_to_type(unit):
    with pytest.raises(Refusal) as refused:
        units.accepted("f", unit)
    assert "counts cycles: divide by 2 pi" in str(refused.value)
    assert "type it in Hz" in str(refused.value)


@pytest.mark.parametrize("unit", ["M", "k", "molar", "mol"])
def test_letters_that_stand_for_other_things_are_no_length(unit):
    with pytest.raises(Refusal):
        units.accepted("L_tail", unit)


@pytest.mark.parametrize("text", [
    "", " ", "m(", "kg)", "'''a", "m\n(", "\\", "m**", "9^ 9^ 9^ 9", "9**9**9**9", "m^-9^-9^-9", "lambda: 1",
    "__import__('os')", "\x00", "½", "µ0", "m0", "m/s0", "dB/m", "m" * 3000, "1e999999999",
])  # fmt: skip
def test_odd_texts_for_a_unit_are_refused_and_quickly(text):
    with pytest.raises(Refusal):
        units.accepted("U", text)


@given(
    st.sampled_from(sorted(QUANTITIES)),
    st.text(max_size=20) | st.text("0123456789^*/.-()eEmsPaKg%°µ ", max_size=20),
)
def test_any_text_for_a_unit_is_accepted_or_refused(key, text):
    try:
        assert units.accepted(key, text) in QUANTITIES[key].units
    except Refusal:
        pass
