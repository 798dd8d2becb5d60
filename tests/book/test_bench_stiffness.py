"""Bench tests of stiffness: worked by hand, uncertainty against the `uncertainties` package from PyPI."""

import math

import pytest
from uncertainties import ufloat, ufloat_fromstr

from labbook.book.bench_stiffness import SECTIONS, TESTS, cells_of_test, modulus_from_test
from labbook.errors import Refusal, Refusals

G = 9.80665  # CGPM 1901


def same(text, wanted):
    """Value and uncertainty agree to half the last written digit: no closer can be asked of a text."""
    number, unit = text.split()
    factor = {"kPa": 1e3, "MPa": 1e6, "GPa": 1e9}[unit]
    found = ufloat_fromstr(number)
    digits = number.partition("(")[0]
    half = 0.5 * 10.0 ** -len(digits.partition(".")[2])
    assert found.n == pytest.approx(wanted.n / factor, abs=1.001 * half)
    assert found.s == pytest.approx(wanted.s / factor, abs=1.001 * half)


def test_a_rod_that_sags():
    # Roark: delta = rho A g L^4/(8 E I), with A/I = 16/d^2 for a rod
    d, L, rho, delta = (
        ufloat(1.00e-3, 0.01e-3),
        ufloat(40e-3, 0.2e-3),
        ufloat(1080, 10),
        ufloat(3.2e-3, 0.1e-3),
    )
    wanted = rho * G * L**4 * 16 / (8 * delta * d**2)
    cells = {"d": "1.00(1) mm", "L": "40.0(2) mm", "rho_s": "1.08(1) g/cm3", "delta": "3.2(1) mm"}
    text, doubt = modulus_from_test("sag", "rod", cells)
    same(text, wanted)
    assert doubt == ""
    assert "more than a tenth" in modulus_from_test("sag", "rod", {**cells, "delta": "5.0(1) mm"})[1]


def test_a_strip_that_rings():
    # Blevins: f1 = 1.8751^2/(2 pi) sqrt(E I/(rho A L^4)), with A/I = 12/t^2 for a strip
    t, L, rho, f1 = ufloat(0.8e-3, 0.01e-3), ufloat(30e-3, 0.1e-3), ufloat(1120, 10), ufloat(4.1, 0.1)
    wanted = (2 * math.pi * f1 / 1.875104069**2) ** 2 * rho * 12 / t**2 * L**4
    text, _ = modulus_from_test("ring-down", "strip", {
        "w": "3.00(1) mm", "t": "0.80(1) mm", "L": "30.0(1) mm", "rho_s": "1.12(1) g/cm3", "f1": "4.1(1) Hz",
    })  # fmt: skip
    same(text, wanted)


def test_a_tube_that_sags():
    D, d_in, L = ufloat(2e-3, 0.01e-3), ufloat(1e-3, 0.01e-3), ufloat(50e-3, 0.2e-3)
    rho, delta = ufloat(1080, 10), ufloat(2.1e-3, 0.1e-3)
    # A/I = 16/(D^2 + d^2) for a round tube
    wanted = rho * G * L**4 * 16 / (8 * delta * (D**2 + d_in**2))
    cells = {
        "D": "2.00(1) mm",
        "d_in": "1.00(1) mm",
        "L": "50.0(2) mm",
        "rho_s": "1.08(1) g/cm3",
        "delta": "2.1(1) mm",
    }
    same(modulus_from_test("sag", "tube", cells)[0], wanted)
    with pytest.raises(Refusal, match="bore"):
        modulus_from_test("sag", "tube", {**cells, "d_in": "2.00 mm"})


def test_every_fault_is_said_at_its_cell():
    with pytest.raises(Refusals) as told:
        modulus_from_test("sag", "rod", {"d": "1 kg", "L": "", "rho_s": "1.08 g/cm3", "delta": "-1 mm"})
    assert [f.field for f in told.value.findings] == ["d", "L", "delta"]
    for test, section in (("twang", "rod"), ("sag", "blob")):
        with pytest.raises(Refusal):
            cells_of_test(test, section)
    assert {(t, s) for t in TESTS for s in SECTIONS} and len(cells_of_test("ring-down", "tube")) == 5
