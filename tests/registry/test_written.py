"""Values as the trade writes them, checked by hand and by reading what was written."""

import math

import pytest
import uncertainties
from hypothesis import given, settings
from hypothesis import strategies as st

from labbook.registry import typed
from labbook.registry.quantities import QUANTITIES
from labbook.registry.written import SHOWN, shown, written, written_in


# the rule is that of JCGM 100:2008, 7.2.6 (at most two digits of u, value rounded to match); which of one or
# two is common practice, no source: two where one would round a leading 1 by up to half of itself
@pytest.mark.parametrize(("value", "u", "text"), [
    (2.31, 0.03, "2.31(3)"),
    (2.3149, 0.0312, "2.31(3)"),
    (0.021, 0.001, "0.0210(10)"),
    (4.0e-4, 0.3e-4, "4.0(3)e-4"),
    (55.0, 4.0, "55(4)"),
    (0.5, 0.099, "0.50(10)"),
    (0.5, 0.096, "0.50(10)"),
    (0.5, 0.094, "0.50(9)"),
    (0.5, 0.17, "0.50(17)"),
    (0.5, 0.196, "0.5(2)"),
    (1234.0, 12.0, "1234(12)"),
    (1234.0, 96.0, "1230(100)"),
    (5678.0, 1234.0, "5700(1200)"),
    (5678.0, 234.0, "5700(200)"),
    (-0.31, 0.02, "-0.31(2)"),
    (-2.0, 50.0, "0(50)"),
    (0.0, 0.3, "0.0(3)"),
    (1234567.0, 89.0, "1.23457(9)e6"),
    (-1.5e-7, 2e-9, "-1.50(2)e-7"),
    (30.0, 1.0, "30.0(10)"),
    (30.0, 1.7, "30.0(17)"),
])  # fmt: skip
def test_value_and_uncertainty(value, u, text):
    assert written(value, u) == text


@pytest.mark.parametrize(("value", "u", "unit", "text"), [
    (None, None, "mm", ""), (float("nan"), 0.1, "mm", ""),
    (12.4, None, "mm", "12.4 mm"), (12.4, 0.0, "mm", "12.4 mm"), (12.4, float("nan"), "mm", "12.4 mm"),
    (12.4, 0.3, "mm", "12.4(3) mm"), (12.4, 0.3, "1", "12.4(3)"), (12.4, 0.3, "", "12.4(3)"),
    (1.0, 1e-14, "", "1"), (1.23456e-7, None, "", "1.235e-7"),
])  # fmt: skip
def test_units_and_absent_parts(value, u, unit, text):
    assert written(value, u, unit) == text


@given(st.floats(1e-9, 1e9), st.floats(1e-6, 2.0), st.booleans())
@settings(max_examples=2000)
def test_never_more_digits_than_the_uncertainty_allows(value, relative, negative):
    value, u = (-value if negative else value), value * relative
    text = written(value, u)
    back = uncertainties.ufloat_fromstr(text)
    # u keeps one digit, or two where it leads with 1: rounded by at most a quarter (0.02 for 0.0249...)
    assert back.std_dev == pytest.approx(u, rel=0.251)
    inside = text[text.index("(") + 1 : text.index(")")].rstrip("0") or "0"
    assert len(inside.replace(".", "")) <= 2
    assert len(inside) == 1 or inside.startswith("1")
    # the value is rounded at the last digit of u, so by less than half of u
    assert abs(back.nominal_value - value) <= 0.51 * back.std_dev
    if not text.startswith("0(") and "(" in text and "e" not in text and "." in text:
        places = len(text.partition("(")[0].partition(".")[2])
        assert math.isclose(back.std_dev, round(back.std_dev, places), rel_tol=1e-9)


@given(st.floats(1e-6, 1e6), st.floats(1e-5, 0.3))
def test_what_was_written_reads_again(value, relative):
    found = typed.read("L_tail", written(value, value * relative, "mm"))
    assert found.value == pytest.approx(value * 1e-3, abs=0.51 * found.u)
    assert found.u == pytest.approx(value * relative * 1e-3, rel=0.251)


@pytest.mark.parametrize(("key", "value", "u", "unit", "text"), [
    ("U", 0.2e-3, 0.01e-3, "mm/min", "12.0(6) mm/min"),
    ("T", 296.25, 0.2, "degC", "23.1(2) degC"),  # the difference is not shifted by 273.15
    ("T", 296.25, 0.1, "degF", "73.58(18) degF"),
    ("theta0", math.pi / 6, math.pi / 180, "deg", "30.0(10) deg"),
    ("U", None, None, "mm/s", ""),
])  # fmt: skip
def test_a_quantity_in_another_of_its_units(key, value, u, unit, text):
    assert written_in(key, value, u, unit) == text


@pytest.mark.parametrize(("key", "value", "u", "unit", "text"), [
    ("mu", 0.098, 0.002, None, "98(2) mPa.s"),
    ("mu", 0.098, 0.002, "Pa.s", "0.098(2) Pa.s"),
    ("EI", 7.36e-8, 0.04e-8, None, "7.36(4)e-8 N.m2"),
    ("Sp", 2.31, 0.03, None, "2.31(3)"),  # a number has no unit
    ("glycerol", 0.85, 0.005, None, "85.0(5) wt%"),
    ("turns", 100.0, None, None, "100"),
])  # fmt: skip
def test_a_value_as_a_page_shows_it(key, value, u, unit, text):
    assert shown(key, value, u, unit) == text


def test_the_shown_units_are_accepted_ones():
    assert all(unit in QUANTITIES[key].units for key, unit in SHOWN.items())
