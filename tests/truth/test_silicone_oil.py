"""Silicone oil: the makers' standard curve, its temperature coefficient, density, and what is refused."""

import numpy as np
import pytest

from labbook.errors import Refusal
from labbook.physics import fluids

CELSIUS = 273.15


def test_ratios_of_the_standard_curve():
    # log10(nu/nu25) = 763.1/(273 + t) - 2.559, from memory; worked by hand at three temperatures to 5 figures.
    nu = fluids.silicone_oil_kinematic_viscosity(nu25=1e-3, T=np.array([20.0, 25.0, 30.0]) + CELSIUS)
    np.testing.assert_allclose(nu / 1e-3, [1.1103, 1.0040, 0.9109], atol=5e-5)


@pytest.mark.parametrize("nu25, vtc", [(1e-4, 0.60), (1e-3, 0.61)])
def test_viscosity_temperature_coefficient(nu25, vtc):
    # VTC = 1 - nu(98.9 degC)/nu(37.8 degC) of makers' data, from memory; two figures, and 3 % of the ratio.
    cool, hot = fluids.silicone_oil_kinematic_viscosity(nu25=nu25, T=np.array([37.8, 98.9]) + CELSIUS)
    assert 1.0 - hot / cool == pytest.approx(vtc, abs=0.012)


def test_density():
    # 970 kg/m3 at 25 degC and -0.95e-3 per K, makers' data from memory: 20 K warmer is 1.9 % lighter.
    assert fluids.silicone_oil_density(T=298.15) == pytest.approx(970.0, abs=1e-9)
    assert fluids.silicone_oil_density(T=318.15) == pytest.approx(951.57, abs=0.01)
    assert np.isnan(fluids.silicone_oil_density(T=2000.0))


@pytest.mark.parametrize("nu25", [1e-6, 5e-5, 0.0, -1e-3, np.nan, [1e-3, 2e-5]])
def test_grades_below_100_cst_are_refused(nu25):
    with pytest.raises(Refusal, match="100 cSt"):
        fluids.silicone_oil_kinematic_viscosity(nu25=nu25, T=298.15)


def test_100_cst_itself_is_taken_however_it_was_converted():
    assert fluids.silicone_oil_kinematic_viscosity(nu25=100 * 1e-6 * (1 - 1e-15), T=298.15) > 0.0


@pytest.mark.parametrize("T", [0.0, -3.0, np.nan])
def test_absurd_temperature_is_refused(T):
    with pytest.raises(Refusal, match="above 0 K"):
        fluids.silicone_oil_kinematic_viscosity(nu25=1e-3, T=T)
    with pytest.raises(Refusal, match="above 0 K"):
        fluids.silicone_oil_density(T=T)


def test_complex_step_is_the_slope():
    # d ln nu/dT = -ln(10) 763.1/(273 + t)^2, by hand; the grade enters in proportion.
    t = 22.0
    nu = fluids.silicone_oil_kinematic_viscosity(nu25=1e-3, T=t + CELSIUS + 1e-20j)
    assert nu.imag / 1e-20 / nu.real == pytest.approx(-np.log(10) * 763.1 / (273 + t) ** 2, rel=1e-12)
    by_grade = fluids.silicone_oil_kinematic_viscosity(nu25=1e-3 + 1e-20j, T=t + CELSIUS).imag / 1e-20
    assert by_grade == pytest.approx(nu.real / 1e-3, rel=1e-12)
    assert fluids.silicone_oil_density(T=300 + 1e-20j).imag / 1e-20 == pytest.approx(-970 * 0.95e-3, rel=1e-12)


def test_uncertainties_are_data():
    # A tolerance of 3 % taken as rectangular, as for a nominal grade: common practice, no source.
    assert fluids.SILICONE_OIL_VISCOSITY.u_rel == pytest.approx(0.017321, abs=1e-6)
    assert fluids.SILICONE_OIL_DENSITY.u_rel == 5e-3


def test_no_garbage_far_outside():
    nu = fluids.silicone_oil_kinematic_viscosity(nu25=1e-3, T=np.geomspace(1e-6, 1e6, 200))
    assert np.all(np.isnan(nu) | (nu > 0.0))
