"""Quantities as typed: what each form means, what is refused, and that printing and reading agree."""

import math
import random
import re

import pytest
import uncertainties
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from labbook.errors import Refusal
from labbook.registry import typed, units
from labbook.registry.catalogue import NUMBERS
from labbook.registry.quantities import QUANTITIES

TYPED_KEYS = [key for key, row in QUANTITIES.items() if row.units]
EVERY_UNIT = [(key, unit) for key in TYPED_KEYS for unit in QUANTITIES[key].units]
ROOT3 = math.sqrt(3.0)


def read(key, text, **more):
    """(value, u) with the unit and origin aside."""
    found = typed.read(key, text, **more)
    return found.value, found.u


# what the brackets mean: JCGM 100:2008 (GUM), 7.2.2; a percentage is of the value; no uncertainty typed:
# half the last digit as a rectangular distribution, half-width over the root of 3 (JCGM 100:2008, 4.3.7).
# 1e-12: rounding
@pytest.mark.parametrize(("key", "text", "value", "u"), [
    ("U", "12.4(3) mm/min", 12.4e-3 / 60, 0.3e-3 / 60),
    ("f", "0.50 +- 0.02 Hz", 0.50, 0.02),
    ("f", "0.50 Hz +- 0.02 Hz", 0.50, 0.02),
    ("f", "0.50 ± 0.02 Hz", 0.50, 0.02),
    ("f", "0.50 +/- 0.02 Hz", 0.50, 0.02),
    ("f", "0.50 Hz +- 3 %", 0.50, 0.015),
    ("f", "0.50 +- 3 % Hz", 0.50, 0.015),
    ("f", "30(3) rpm", 0.5, 0.05),
    ("T", "23,1 °C", 296.25, 0.05 / ROOT3),
    ("T", "23.1(2) degC", 296.25, 0.2),
    ("T", "73.4(9) degF", 296.15, 0.5),
    ("L_tail", "20 mm", 0.020, 0.5e-3 / ROOT3),
    ("L_tail", "20.0 mm", 0.020, 0.05e-3 / ROOT3),
    ("L_tail", "20. mm", 0.020, 0.5e-3 / ROOT3),
    ("L_tail", ".5 mm", 0.5e-3, 0.05e-3 / ROOT3),
    ("L_tail", "1.0e-3 m", 1e-3, 0.05e-3 / ROOT3),
    ("L_tail", "1.20(3)e-2 m", 0.012, 3e-4),
    ("L_tail", "1.20 x 10^-2 m", 0.012, 0.005e-2 / ROOT3),
    ("L_tail", "1.20×10⁻² m", 0.012, 0.005e-2 / ROOT3),
    ("L_tail", "1.20x10-2 m", 0.012, 0.005e-2 / ROOT3),
    ("L_tail", "(1.20 +- 0.03)e-2 m", 0.012, 3e-4),
    ("L_tail", "(12.0 +- 0.3) mm", 0.012, 3e-4),
    ("L_tail", "12.0(1.3) mm", 0.012, 1.3e-3),
    ("L_tail", "12.0(13) mm", 0.012, 1.3e-3),
    ("L_tail", "1200(30) um", 1.2e-3, 3e-5),
    ("L_tail", "12\tmm", 0.012, 0.5e-3 / ROOT3),
    ("L_tail", "12\u00a0mm", 0.012, 0.5e-3 / ROOT3),
    ("U", "-0.3(1) mm/s", -0.3e-3, 1e-4),
    ("U", "−0.3(1) mm/s", -0.3e-3, 1e-4),
    ("U", "0.0(1) mm/s", 0.0, 1e-4),
    ("mu", "98 cP", 0.098, 0.5e-3 / ROOT3),
    ("glycerol", "85.0(5) wt%", 0.85, 0.005),
    ("glycerol", "85.0 +- 0.5 %", 0.85, 0.005),
    ("glycerol", "0.850(5)", 0.85, 0.005),
    ("turns", "100", 100.0, 0.5 / ROOT3),
    ("fps", "100.0(1) 1/s", 100.0, 0.1),
    ("fps", "100.0 +- 0.1 1/s", 100.0, 0.1),
    ("theta0", "30(1) deg", math.pi / 6, math.pi / 180),
])  # fmt: skip
def test_what_a_text_means(key, text, value, u):
    assert read(key, text) == pytest.approx((value, u), rel=1e-12)


def test_the_digits_of_a_text_give_its_uncertainty_as_printed():
    # design figures: half a millimetre over root 3, and half of 1e-4 over root 3; three and two figures
    # printed
    assert read("L_tail", "20 mm")[1] == pytest.approx(0.289e-3, abs=0.5e-6)
    assert read("L_tail", "1.0e-3 m")[1] == pytest.approx(2.9e-5, abs=0.05e-5)
    assert typed.read("L_tail", "20 mm").origin == typed.DIGITS
    assert typed.read("L_tail", "20(1) mm").origin == typed.STATED


@given(
    st.integers(0, 10**9), st.integers(0, 8), st.integers(1, 10**4), st.sampled_from(("", "e-3", "e+2", "E5"))
)
def test_shorthand_agrees_with_uncertainties(mantissa, places, u, exponent):
    text = f"{mantissa // 10**places}.{mantissa % 10**places:0{places}d}" if places else str(mantissa)
    reference = uncertainties.ufloat_fromstr(
        f"{text}({u}){exponent.lower()}"
    )  # Lebigot's reader, an outside one
    value, spread = read("U", f"{text}({u}){exponent} m/s")
    assert value == pytest.approx(reference.nominal_value, rel=1e-14)  # the last bit: it multiplies by 10**n
    assert spread == pytest.approx(reference.std_dev, rel=1e-14)


def test_the_header_unit_serves_a_bare_number_and_the_cell_wins():
    assert read("L_tail", "12.0(3)", unit="mm") == pytest.approx((0.012, 3e-4))
    assert read("L_tail", "12.0(3) cm", unit="mm") == pytest.approx((0.12, 3e-3))
    assert read("L_tail", "12,0", unit="mm", decimal_comma=True)[0] == pytest.approx(0.012)
    assert read("L_tail", "1,000", unit="mm", decimal_comma=True)[0] == pytest.approx(1e-3)


@pytest.mark.parametrize(("key", "text", "reason"), [
    ("U", "1.0 kg", "kg is a mass, and a speed is needed"),
    ("f", "3.1 rad/s", "divide by 2 pi"),
    ("f", "0.5", "has no unit"),
    ("f", "fast", "cannot be read as a frequency"),
    ("f", "", "cannot be read as a frequency"),
    ("theta0", "?", "cannot be read as an angle"),
    ("f", "0.5.1 Hz", "cannot be read"),
    ("f", "0.5 furlongz", "no unit that labbook knows"),
    ("f", "-0.5 Hz", "a frequency must be greater than zero"),
    ("f", "0 Hz", "a frequency must be greater than zero"),
    ("L_tail", "0.0(1) mm", "must be greater than zero"),
    ("E", "-1 MPa", "must be greater than zero"),
    ("mu", "0 Pa.s", "must be greater than zero"),
    ("T", "-300 degC", "must be greater than zero"),
    ("B", "-1 mT", "cannot be negative"),
    ("f", "nan", "not a finite number"),
    ("f", "NaN Hz", "not a finite number"),
    ("f", "inf Hz", "not a finite number"),
    ("f", "-inf Hz", "not a finite number"),
    ("f", "1e999 Hz", "not a finite number"),
    ("f", "1 +- 1e999 Hz", "not a finite number"),
    ("f", "1 +- nan Hz", "cannot be read"),
    ("U", "1,000 mm/s", "may mean a thousand or a decimal comma"),
    ("U", "12.4 +- 1,000 mm/s", "may mean a thousand or a decimal comma"),
    ("U", "1,234.5 mm/s", "may mean a thousand or a decimal comma"),
    ("U", "1.234,5 mm/s", "cannot be read as a number"),
    ("U", "1,2,3 mm/s", "cannot be read as a number"),
    ("L_tail", "20 mm +- 3 cm", "value and uncertainty are in different units"),
    ("L_tail", "(20 +- 3 mm", "unmatched bracket"),
    ("L_tail", "20 +- 3) mm", "unmatched bracket"),
    ("L_tail", "5 x 100 mm", "no unit that labbook knows"),  # a product is not a power of ten
    ("L_tail", "20 mm +- -3 mm", "cannot be read"),
    ("L_tail", "(20 +- 3) %", "% is a pure number, and a length is needed"),
    ("T", "23 degC +- 3 %", "depends on where the scale starts"),
    ("glycerol", "85", "cannot exceed 100 wt%"),
    ("glycerol", "85 wt% +- 1 % wt%", "percentage of the value or of the whole"),
    ("L_tail", "2" * 90 + " mm", "too long"),
    ("L_tail", "2" * 100_000, "too long"),
])  # fmt: skip
def test_what_is_refused_and_why(key, text, reason):
    with pytest.raises(Refusal) as refused:
        typed.read(key, text)
    assert refused.value.field == key
    assert reason in str(refused.value)


def test_a_refusal_shows_what_was_typed_and_what_would_do():
    with pytest.raises(Refusal) as refused:
        typed.read("U", "1.0 kg")
    assert str(refused.value).startswith("U '1.0 kg': kg is a mass")
    assert "type it in m/s, mm/s, um/s" in str(refused.value)


@pytest.mark.parametrize(("text", "value", "origin"), [
    ("0.5 %", 0.005, "relative"), ("0.002 Hz", 0.002, "absolute"), ("3 rpm", 0.05, "absolute"),
])  # fmt: skip
def test_a_stated_uncertainty(text, value, origin):
    found = typed.read_uncertainty("f", text)
    assert (found.value, found.origin) == (pytest.approx(value, rel=1e-12), origin)


def test_a_stated_uncertainty_of_temperature_is_a_difference():
    assert typed.read_uncertainty("T", "0.1 degC").value == pytest.approx(0.1, rel=1e-12)


@pytest.mark.parametrize("text", ["-0.5 %", "0.5", "0.5 kg", "1e999 %", "lots"])
def test_a_bad_stated_uncertainty_is_refused(text):
    with pytest.raises(Refusal):
        typed.read_uncertainty("f", text)


def decimals(draw, low, high):
    """A decimal text as a person writes one, and no float in between."""
    whole = draw(st.integers(low, high))
    places = draw(st.integers(0, 6))
    return f"{whole}.{draw(st.integers(0, 10**places - 1)):0{places}d}" if places else str(whole)


@st.composite
def typed_texts(draw):
    """(key, unit, text, header unit, decimal comma) in every form of number, uncertainty and unit."""
    key, unit = draw(st.sampled_from(EVERY_UNIT))
    sign = draw(st.sampled_from(("", "-"))) if QUANTITIES[key].sign == "any" else ""
    value = sign + decimals(draw, 1, 9999)
    exponent = draw(st.sampled_from(("", "e-3", "e2", "E+1", " x 10^-2")))
    u = decimals(draw, 0, 99)
    comma = draw(st.booleans())
    own = draw(st.booleans())
    tail = (
        f"{draw(st.sampled_from(('', ' ')))}{unit}" if own and unit[0] != "1" else f" {unit}" if own else ""
    )
    text = draw(st.sampled_from((
        f"{value}{exponent}{tail}",
        f"{value}({draw(st.integers(0, 999))}){exponent}{tail}",
        f"{value} +- {u}{tail}",
        f"{value}{tail} +- {u}{tail}",
        f"{value} ± {u}{tail}",
        f"({value} +- {u}){exponent}{tail}",
        f"{value}{tail} +- {u} %",
        f"{value} +- {u}% {unit if own else ''}",
    )))  # fmt: skip
    return key, unit, re.sub(r"(?<=\d)\.(?=\d)", ",", text) if comma else text, None if own else unit, comma


@given(typed_texts())
@settings(max_examples=3000, deadline=None)
def test_a_typed_quantity_printed_and_read_again_is_the_same(case):
    key, unit, text, header, comma = case
    try:
        first = typed.read(key, text, unit=header, decimal_comma=comma)
    except Refusal as refusal:
        reason = refusal.reason  # forms that mean nothing for this quantity, refused for their own reason
        known = ("percentage", "cannot exceed", "greater than zero", "% is no", "% 1 is no")
        assert any(part in reason for part in known), (case, reason)
        assume(False)
    again = typed.read(key, typed.printed(key, first))
    assert (again.value, again.u, again.unit, again.origin) == (
        first.value,
        first.u,
        first.unit,
        first.origin,
    )
    assert first.unit == unit or (key == "glycerol" and first.unit == "%")  # there % is a unit of its own
    assert first.text == text.strip()


@given(
    st.sampled_from(TYPED_KEYS),
    st.sampled_from((None, "mm", "1", "%", "")),
    st.booleans(),
    st.text(max_size=90) | st.text("0123456789.,eE+-()±% x10^mkgsHzPa/°µ\t\u00a0", max_size=40),
)
@settings(max_examples=4000, deadline=None)
def test_any_text_is_a_quantity_or_a_refusal(key, unit, comma, text):
    try:
        found = typed.read(key, text, unit=unit, decimal_comma=comma)
    except Refusal:
        return
    assert math.isfinite(found.value)
    assert math.isfinite(found.u) and found.u >= 0
    assert found.unit in QUANTITIES[key].units


@pytest.mark.parametrize("text", ["١٢ mm", "１２ mm"])
def test_other_digits_read_as_their_value(text):
    assert read("L_tail", text)[0] == pytest.approx(0.012)


@pytest.mark.parametrize("key", NUMBERS)
def test_a_change_of_unit_leaves_every_number_unchanged(key):
    row = NUMBERS[key]
    chance = random.Random(key)
    for _ in range(20):
        inputs = {}
        for name in row.inputs:
            quantity = QUANTITIES[name]
            inputs[name] = float(row.example[name])
            if quantity.units and inputs[name] != 0.0:
                unit = chance.choice(quantity.units)
                # 17 figures carry a float to text and back
                inputs[name] = typed.read(
                    name, f"{units.from_si(name, inputs[name], unit):.17g} {unit}"
                ).value
        assert row.parsed.value(inputs) == pytest.approx(row.parsed.value(row.example), rel=1e-12)
