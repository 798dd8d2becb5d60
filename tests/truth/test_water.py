"""Water: viscosity and density against IAPWS releases, two reference libraries and older formulas."""

import numpy as np
import pytest
from CoolProp.CoolProp import PropsSI
from iapws import IAPWS95
from iapws._iapws import _Viscosity

from labbook.errors import Refusal
from labbook.physics import fluids

CELSIUS = 273.15


def test_viscosity_repeats_the_computer_program_check_of_the_release():
    # IAPWS SR6-08, check values at 260, 298.15 and 375 K as the reference library iapws prints them;
    # 1e-7 because nine figures are printed.
    T = np.array([260.0, 298.15, 375.0])
    np.testing.assert_allclose(fluids.water_viscosity(T=T),
                               [3058.36075e-6, 889.996774e-6, 276.207245e-6], rtol=1e-7)


@pytest.mark.parametrize("t, rho, mu", [
    # IAPWS-95 and IAPWS R12-08 at 101 325 Pa, rounded from iapws, CoolProp and chemicals.
    (5, 999.9666, 1518.17e-6), (20, 998.2072, 1001.60e-6), (25, 997.0476, 890.02e-6),
    (40, 992.2164, 652.73e-6), (60, 983.1958, 466.04e-6), (80, 971.7904, 354.05e-6),
])
def test_printed_table(t, rho, mu):
    # 0.002 kg/m3: 0.0006 for 1325 Pa of pressure and the rest for a fit of few terms; 0.02 % likewise.
    assert fluids.water_density(T=t + CELSIUS) == pytest.approx(rho, abs=0.002)
    assert fluids.water_viscosity(T=t + CELSIUS) == pytest.approx(mu, rel=2e-4)


@pytest.mark.parametrize("T", [274.0, 285.0, 298.15, 310.0, 330.0, 350.0, 372.0])
def test_full_formulations_of_iapws(T):
    # iapws (PyPI): IAPWS-95 density, R12-08 viscosity at that density. SR6-08 claims 1e-6 in density
    # (0.001 kg/m3) and far less than 1 % in viscosity; measured 0.003 %.
    rho = IAPWS95(T=T, P=0.1).rho
    assert fluids.water_density(T=T) == pytest.approx(rho, abs=0.001)
    assert fluids.water_viscosity(T=T) == pytest.approx(_Viscosity(rho, T), rel=1e-4)


def test_second_reference_library():
    T = np.linspace(0.5, 99.0, 30) + CELSIUS
    rho = [PropsSI("D", "T", x, "P", 1.0e5, "Water") for x in T]
    mu = [PropsSI("V", "T", x, "P", 1.0e5, "Water") for x in T]
    np.testing.assert_allclose(fluids.water_density(T=T), rho, atol=0.001, rtol=0)
    np.testing.assert_allclose(fluids.water_viscosity(T=T), mu, rtol=1e-4)


def kell(t, denominator):
    """Kell, J. Chem. Eng. Data 20:97 (1975), coefficients from memory."""
    numerator = np.polyval([-280.54253e-12, 105.56302e-9, -46.170461e-6, -7.9870401e-3, 16.945176, 999.83952], t)
    return numerator / (1.0 + denominator * t)


def tanaka(t):
    """Tanaka et al., Metrologia 38:301 (2001), 0 to 40 degC, coefficients from memory."""
    return 999.974950 * (1.0 - (t - 3.983035) ** 2 * (t + 301.797) / (522528.9 * (t + 69.34881)))


def test_density_of_older_formulas_and_their_misprint():
    # Kell stands on the 1968 scale and a maximum 0.003 lower: within 0.015 to 100 degC.
    t = np.linspace(1.0, 99.0, 50)
    rho = fluids.water_density(T=t + CELSIUS)
    np.testing.assert_allclose(kell(t, 16.879850e-3), rho, atol=0.015, rtol=0)
    cool = t[t <= 40.0]
    np.testing.assert_allclose(tanaka(cool), rho[t <= 40.0], atol=0.0015, rtol=0)
    # A transposed digit in circulation, 16.897850e-3, lowers 20 degC by 0.27: the tolerances here see it.
    wrong = kell(20.0, 16.897850e-3) - fluids.water_density(T=293.15)
    assert wrong == pytest.approx(-0.27, abs=0.01)


def test_density_has_its_maximum_at_4_degrees():
    # SMOW: 3.98 degC, 999.975 kg/m3 (Tanaka et al. 2001).
    T = CELSIUS + np.linspace(0.0, 8.0, 8001)
    rho = fluids.water_density(T=T)
    assert T[np.argmax(rho)] - CELSIUS == pytest.approx(3.98, abs=0.02)
    assert rho.max() == pytest.approx(999.975, abs=0.001)


@pytest.mark.parametrize("function", [fluids.water_viscosity, fluids.water_density])
def test_complex_step_is_the_slope(function):
    # Central difference of half a kelvin squared: truncation about 1e-7 of the value per K.
    T = np.array([275.0, 298.15, 360.0])
    slope = function(T=T + 1e-20j).imag / 1e-20
    h = 1e-3
    np.testing.assert_allclose(slope, (function(T=T + h) - function(T=T - h)) / (2 * h), rtol=1e-6)


def test_ranges_and_uncertainties_are_data():
    assert (fluids.WATER_VISCOSITY.u_rel, fluids.WATER_DENSITY.u_rel) == (0.002, 1e-4)
    for row in (fluids.WATER_VISCOSITY, fluids.WATER_DENSITY):
        np.testing.assert_array_equal(row.covers(T=[253.0, 253.15, 300.0, 383.15, 384.0]),
                                      [False, True, True, True, False])
    assert len({row.key for row in fluids.CORRELATIONS}) == len(fluids.CORRELATIONS) == 6


@pytest.mark.parametrize("T", [0.0, -5.0, np.nan, np.inf, "20", [300.0, np.nan]])
def test_absurd_temperature_is_refused(T):
    for function in (fluids.water_viscosity, fluids.water_density):
        with pytest.raises(Refusal, match="T"):
            function(T=T)


def test_no_garbage_far_outside():
    # The volume terms have poles at 232 and 593 K: no density beyond them.
    assert np.isnan(fluids.water_density(T=np.array([100.0, 231.0, 594.0, 1e5]))).all()
    value = fluids.water_viscosity(T=np.geomspace(1e-9, 1e6, 100))
    assert np.all(np.isnan(value) | (value > 0.0))


def test_shape_is_kept():
    assert np.ndim(fluids.water_viscosity(T=300.0)) == 0
    assert np.ndim(fluids.water_density(T=300)) == 0
    assert fluids.water_density(T=np.full((2, 3), 300.0)).shape == (2, 3)
