"""Sag and ring-down of a clamped tail against worked values, mode roots and the large-deflection elastica."""

import numpy as np
import pytest
from scipy import integrate, optimize

from labbook.errors import Refusal
from labbook.physics import sections, stiffness

TAIL = dict(rho_s=1030.0, area=sections.rod_area(d=1e-3), L=0.02, I_area=sections.rod_second_moment(d=1e-3))


def test_worked_sag_and_frequency():
    # E = 1.5 MPa, rho = 1030 kg/m3, d = 1 mm, L = 20 mm [C], eight figures
    assert stiffness.sag(E=1.5e6, **TAIL) == pytest.approx(2.1548479e-3, rel=3e-8)
    assert stiffness.natural_frequency(n=1, E=1.5e6, **TAIL) == pytest.approx(13.346824, rel=5e-8)


def test_moduli_come_back():
    # the worked values above, read the other way
    assert stiffness.modulus_from_sag(delta=2.1548479e-3, **TAIL) == pytest.approx(1.5e6, rel=3e-8)
    assert stiffness.modulus_from_ringdown(f1=13.346824, **TAIL) == pytest.approx(1.5e6, rel=1e-7)


def test_mode_constants_solve_their_equation():
    # Roark; Blevins: roots of cos x cosh x = -1, found here by bracketing
    for n, bracket in ((1, (1.5, 2.5)), (2, (4.0, 5.0)), (3, (7.0, 8.5))):
        root = optimize.brentq(lambda x: np.cos(x) * np.cosh(x) + 1.0, *bracket, xtol=1e-13)
        assert stiffness.CLAMPED_FREE_BETA[n - 1] == pytest.approx(root, rel=1e-9)
        high, low = (stiffness.natural_frequency(n=mode, E=1e6, **TAIL) for mode in (n, 1))
        assert high / low == pytest.approx((root / 1.875104069) ** 2, rel=2e-9)


def elastica_sag(q):
    """Tip deflection over L of a clamped inextensible rod under its own weight, q = w L^3/(E I)."""
    s = np.linspace(0.0, 1.0, 101)
    found = integrate.solve_bvp(
        lambda s, y: np.vstack([y[1], -q * (1.0 - s) * np.cos(y[0]), np.sin(y[0])]),
        lambda at, end: np.array([at[0], end[1], at[2]]),
        s, np.zeros((3, s.size)), tol=1e-9)
    return found.y[2, -1]


@pytest.mark.parametrize(("q", "over"), [(1.0, 0.012), (2.0, 0.048)])
def test_linear_sag_overestimates_as_stated(q, over):
    # 1.2 % and 4.8 % [C], printed to 0.1 %; q = w L^3/EI with w = rho A g
    E = TAIL["rho_s"] * TAIL["area"] * 9.80665 * TAIL["L"] ** 3 / (TAIL["I_area"] * q)
    linear = stiffness.sag(E=E, **TAIL) / TAIL["L"]
    assert linear / elastica_sag(q) - 1.0 == pytest.approx(over, abs=6e-4)


def test_small_sag_flag():
    # delta/L = q/8: the limit 0.1 keeps the error below the 1.2 % of q = 1
    np.testing.assert_array_equal(
        stiffness.sag_is_small(delta=np.array([1e-3, 2e-3, 2.2e-3]), L=0.02), [True, True, False])
    assert 0.1 / elastica_sag(0.8) - 1.0 < 0.012


def test_other_modes_are_refused():
    with pytest.raises(Refusal, match="mode"):
        stiffness.natural_frequency(n=4, E=1e6, **TAIL)


def test_powers_by_complex_step():
    # delta ~ L^4/E, f ~ L^-2: exponents of the formulas in Roark and Blevins
    step = stiffness.sag(E=1.5e6, **{**TAIL, "L": 0.02 + 1e-30j})
    assert step.imag / 1e-30 * 0.02 / step.real == pytest.approx(4.0, rel=1e-12)
    step = stiffness.modulus_from_ringdown(f1=13.0 + 1e-30j, **TAIL)
    assert step.imag / 1e-30 * 13.0 / step.real == pytest.approx(2.0, rel=1e-12)
