"""The numbers at birth against outside facts, and what a row must have to be constructed."""

import dataclasses
import math
import re

import pytest

from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS, Number, number

# the numbers that the group keeps, and no others at birth
AT_BIRTH = ["Re", "Re_omega", "Wo", "Sp", "St", "Sw", "stride", "U_scaled", "De", "Mn", "f_ratio",
            "zeta_ratio", "slenderness", "wall", "U_ratio", "F_scaled"]  # fmt: skip


def value(key, **inputs):
    return NUMBERS[key].parsed.value(inputs)


def test_the_numbers_at_birth():
    assert list(NUMBERS) == AT_BIRTH
    assert [key for key, row in NUMBERS.items() if row.signed] == ["Re", "St", "stride", "U_scaled", "U_ratio", "F_scaled"]


@pytest.mark.parametrize(("U", "L_body", "Re"), [
    (30e-6, 2e-6, 6e-5),  # Escherichia coli
    (100e-6, 60e-6, 6e-3),  # bull sperm
    (1e-3, 250e-6, 0.25),  # paramecium
])  # fmt: skip
def test_reynolds_numbers_of_small_swimmers_in_water(U, L_body, Re):
    # speeds and lengths: from memory; water of 1000 kg/m3 and 1 mPa.s makes the figures exact products
    assert value("Re", rho=1000.0, U=U, L_body=L_body, mu=1e-3) == pytest.approx(Re, rel=1e-12)


def test_a_cruising_dace_of_bainbridge():
    # Bainbridge, J. Exp. Biol. 35:109 (1958): V = L(3f - 4)/4 in cm and s, from memory; A = 0.2 L.
    # Three printed figures of 0.308
    L, f = 30.0, 10.0
    V = L * (3 * f - 4) / 4
    assert V == 195.0
    assert value("St", f=f, A_tip=0.2 * L / 100, U=V / 100) == pytest.approx(0.308, abs=5e-4)
    assert value("stride", U=V / 100, f=f, L_body=L / 100) == pytest.approx(0.65, rel=1e-12)
    # peak to peak is the dialect: half the excursion would give half, below the cruising band of 0.2
    assert value("St", f=f, A_tip=0.1 * L / 100, U=V / 100) == pytest.approx(0.154, abs=5e-4)


def test_the_oscillatory_example_and_its_penetration_depth():
    # rho 970 kg/m3, L 20 mm, mu 1 Pa.s, 2 Hz: 4.875752 and sqrt(2 nu/omega) = 12.80926 mm, recomputed
    # independently; seven figures. Stokes' second problem (Batchelor, Introduction to Fluid Dynamics, 4.3)
    omega = 4 * math.pi
    Re_omega = value("Re_omega", rho=970.0, omega=omega, L_tail=0.02, mu=1.0)
    assert Re_omega == pytest.approx(4.875752, abs=5e-7)
    depth = 12.80926e-3
    assert Re_omega == pytest.approx(2 * (0.02 / depth) ** 2, rel=2e-6)
    assert value("Wo", L_tail=0.02, omega=omega, nu=1 / 970) ** 2 == pytest.approx(Re_omega, rel=1e-12)


@pytest.mark.parametrize(("coefficient", "Sp"), [
    (2.99994, 3.00847), (3.23706, 3.06623), (3.26861, 3.07367), (1.0, 2.28595), (4 * math.pi, 4.30397),
    (8 * math.pi, 5.11832),
])  # fmt: skip
def test_sperm_numbers_of_the_worked_rod(coefficient, Sp):
    # L 20 mm, d 1 mm, E 1.5 MPa, 1 Pa.s, 2 Hz, recomputed independently with each resistive coefficient;
    # half of the sixth figure is 2e-6, and the quarter power quarters the rounding of the coefficient
    EI = 1.5e6 * math.pi * 1e-3**4 / 64
    found = value("Sp", L_tail=0.02, zeta_n=coefficient, omega=4 * math.pi, EI=EI)
    assert found == pytest.approx(Sp, rel=3e-6)


def test_step_out_of_a_magnet_that_fills_its_sphere():
    # torque balance m B = 8 pi mu b^3 omega_c with m = Br V/mu0: Br B/(6 mu0 mu) = 862.089 rad/s, whatever
    # the size
    Br, B, mu, mu0 = 1.3, 5e-3, 1.0, 4e-7 * math.pi
    for b in (1e-5, 0.5e-3, 1e-2):
        m_mag = Br * (4 / 3) * math.pi * b**3 / mu0
        inputs = dict(mu=mu, b=b, A22=0.0, m_mag=m_mag, B=B)
        assert value("f_ratio", f=862.089 / (2 * math.pi), **inputs) == pytest.approx(1.0, rel=1e-6)
        assert value("f_ratio", f=137.206, **inputs) == pytest.approx(1.0, rel=4e-6)  # six figures
    # a helix of the head's own resistance halves the step-out
    inputs["A22"] = 8 * math.pi * mu * b**3
    assert value("f_ratio", f=137.206, **inputs) == pytest.approx(2.0, rel=4e-6)


def test_the_worked_free_head_scales_to_its_table():
    # physics sheet, section 8: U 7.43970681e-05 m/s, and by its table U/(omega L theta0^2) lies between the
    # values at Sp 3 and 4 (b/L 0.1, close to the 0.0667 here)
    scaled = value("U_scaled", U=7.43970681e-5, omega=2 * math.pi, L_tail=0.03, theta0=0.3)
    assert 4.14155887e-3 < scaled < 7.64872873e-3


def test_a_number_of_one_anisotropy_and_one_slenderness():
    # Tirado & Garcia de la Torre 1979 at L/d = 100: (zeta_t, zeta_n)/mu = 1.42542, 2.30743
    assert value("zeta_ratio", zeta_n=2.30743, zeta_t=1.42542) == pytest.approx(1.61877, abs=5e-6)
    assert value("slenderness", L_tail=0.02, a=5e-4) == pytest.approx(
        20.0, rel=1e-12
    )  # L/d of a 20 x 1 mm rod


GOOD = dict(
    key="Bo", symbol="Bo", name="a test number", formula="rho * U**2 / E", compares="inertia to elasticity",
    source="common practice, no source", example=dict(rho=1000.0, U=2.0, E=8000.0), answer=0.5,
)  # fmt: skip


def test_a_good_row_is_constructed():
    assert Number(**GOOD).inputs == ("rho", "U", "E")


@pytest.mark.parametrize(("change", "reason"), [
    (dict(key="has space"), "new plain identifier"),
    (dict(key="a.b"), "new plain identifier"),
    (dict(key="mu"), "new plain identifier"),
    (dict(name=" "), "needs a name"),
    (dict(compares=""), "needs a name"),
    (dict(source="  "), "and a source"),
    (dict(formula="rho * U / E"), "L^-1 T is left over"),
    (dict(formula="rho * U**2 + E"), "M L^-1 T^-2 is left over"),
    (dict(formula="rho + U"), "terms must agree"),
    (dict(formula="rho * V**2 / E"), "not a key of the vocabulary"),
    (dict(formula="max(rho, U)"), "calls are not allowed"),
    (dict(example=dict(rho=1000.0, U=2.0)), "lacks E"),
    (dict(answer=0.51), "the worked example gives 0.5"),
    (dict(answer=float("nan")), "the worked example gives 0.5"),
    (dict(example=dict(rho=1000.0, U=2.0, E=0.0)), "has no value"),
    (dict(example=dict(rho=1000.0, U="2", E=8000.0)), "has no value"),
    (dict(formula="rho * U**2 / E * 1e200**3"), "has no value"),
    (dict(formula="(0 - rho * U**2 / E)**0.3"), "has no value"),  # a root of a negative
    (dict(tolerance=0.0), "tolerance"),
    (dict(tolerance=0.5), "tolerance"),
    (dict(tolerance=float("nan")), "tolerance"),
])  # fmt: skip
def test_a_bad_row_is_refused(change, reason):
    with pytest.raises(Refusal) as refused:
        Number(**GOOD | change)
    assert reason in str(refused.value)


def init_fields(row):
    return {f.name: getattr(row, f.name) for f in dataclasses.fields(row) if f.init}


def broken(text):
    """Variants of a formula that keep its dimension or not: a factor, and a stray square on each key."""
    yield f"2 * ({text})"
    yield f"({text}) / (2 * pi)"
    yield f"({text})**2"
    for key in dict.fromkeys(re.findall(r"[A-Za-z]\w*", text)):
        if key != "pi":
            yield re.sub(rf"\b{key}\b(?!\w)", f"({key}**2)", text, count=1)


@pytest.mark.parametrize("key", NUMBERS)
def test_a_broken_formula_cannot_be_constructed(key):
    row = init_fields(NUMBERS[key])
    Number(**row)
    for text in broken(row["formula"]):
        with pytest.raises(Refusal):
            Number(**row | {"formula": text})


def test_an_unknown_number_is_refused_with_those_that_exist():
    with pytest.raises(Refusal, match="one of Re, Re_omega, Wo, Sp"):
        number("Reynolds")
    assert number("Sp") is NUMBERS["Sp"]
