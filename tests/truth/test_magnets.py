"""Magnetic drive against worked values, Biot-Savart quadrature and a time march of the slipping rotor."""

import numpy as np
import pytest
from scipy import constants, integrate

from labbook.physics import magnets


def test_helmholtz_pair():
    # N = 100, R = 0.1 m, 1 A: 8.99176285e-4 T [C], nine figures
    assert magnets.helmholtz_flux_density(turns=100, radius=0.1, current=1.0) == pytest.approx(
        8.99176285e-4, rel=2e-9)


def test_helmholtz_by_biot_savart():
    # two loops at +-R/2, integrated round the wire
    R, z = 0.1, 0.05
    loop = integrate.quad(lambda phi: R * R / (R * R + z * z) ** 1.5, 0.0, 2.0 * np.pi)[0]
    expected = 2.0 * 50 * constants.mu_0 * 0.7 / (4.0 * np.pi) * loop
    found = magnets.helmholtz_flux_density(turns=50, radius=R, current=0.7)
    assert found == pytest.approx(expected, rel=1e-8)


def test_dipole_and_torque():
    # 1 mm sphere, Br 1.3 T: 5.41667e-4 A m2; in 5 mT 2.70833e-6 N m [C], six figures
    m_mag = magnets.sphere_moment(diameter=1e-3, remanence=1.3)
    assert m_mag == pytest.approx(5.41667e-4, rel=1e-6)
    assert magnets.torque(m_mag=m_mag, B=5e-3) == pytest.approx(2.70833e-6, rel=2e-6)
    assert magnets.torque(m_mag=m_mag, B=5e-3, angle=np.pi / 6.0) == pytest.approx(1.354165e-6, rel=2e-6)


@pytest.mark.parametrize("b", [1e-4, 5e-4, 3e-3])
def test_step_out_of_a_full_sphere_does_not_depend_on_size(b):
    # Br 1.3 T, 5 mT, 1 Pa.s: 862.089 rad/s = 137.206 Hz [C], six figures
    m_mag = magnets.sphere_moment(diameter=2 * b, remanence=1.3)
    omega_c = magnets.sphere_step_out(m_mag=m_mag, B=5e-3, mu=1.0, b=b)
    assert omega_c == pytest.approx(862.089, rel=1e-6)
    assert omega_c / (2.0 * np.pi) == pytest.approx(137.206, rel=4e-6)


def test_step_out_with_a_tail_in_tow():
    # torque balance m B = (8 pi mu b^3 + A22) omega_c: twice the resistance, half the rate
    alone = magnets.sphere_step_out(m_mag=1e-4, B=5e-3, mu=1.0, b=1e-3)
    turn = 8.0 * np.pi * 1e-9
    assert magnets.step_out(m_mag=1e-4, B=5e-3, resistance=2.0 * turn) == pytest.approx(alone / 2.0)


@pytest.mark.parametrize("ratio", [1.1, 1.5, 4.0])
def test_mean_rate_above_step_out_by_time_march(ratio):
    # phase lag obeys lag' = omega - omega_c sin(lag) (torque balance); one slip of 2 pi takes time t
    slip_time = integrate.quad(lambda lag: 1.0 / (ratio - np.sin(lag)), 0.0, 2.0 * np.pi)[0]
    expected = ratio - 2.0 * np.pi / slip_time
    assert magnets.mean_rate_above_step_out(omega=ratio, omega_c=1.0) == pytest.approx(expected, rel=1e-8)


def test_below_step_out_the_magnet_follows():
    np.testing.assert_array_equal(
        magnets.mean_rate_above_step_out(omega=np.array([0.2, 1.0]), omega_c=1.0), [0.2, 1.0])
    step = magnets.mean_rate_above_step_out(omega=np.array([0.5, 1.25]) + 1e-30j, omega_c=1.0).imag / 1e-30
    np.testing.assert_allclose(step, [1.0, 1.0 - 1.25 / 0.75], rtol=1e-12)  # derivative by hand
