"""Magnetic drive: coil pairs, dipoles, torques and step-out."""

from math import pi

import numpy as np

MU_0 = 4e-7 * pi  # H/m; the 2019 SI value differs by 1.3e-10 relative


def helmholtz_flux_density(*, turns, radius, current):
    """Flux density at the centre of a Helmholtz pair, (4/5)^(3/2) mu_0 N I/R.

    turns per coil; radius: m; current: A; answer in T. Source: Biot-Savart law, any text on electromagnetism.
    """
    return 0.8**1.5 * MU_0 * turns * np.asarray(current) / radius


def sphere_moment(*, diameter, remanence):
    """Dipole moment of a uniformly magnetised sphere, B_r V/mu_0.

    diameter: m; remanence: T; answer in A.m^2.
    """
    return remanence * (pi / 6.0) * np.asarray(diameter) ** 3 / MU_0


def torque(*, m_mag, B, angle=pi / 2.0):
    """Torque on a dipole at an angle to the field, m B sin(angle): its largest value by default.

    m_mag: A.m^2; B: T; angle: rad; answer in N.m.
    """
    return m_mag * np.asarray(B) * np.sin(angle)


def step_out(*, m_mag, B, resistance):
    """Rate of a rotating field above which the magnet loses it, m B/resistance.

    m_mag: A.m^2; B: T; resistance: torque per rate of turn of all that turns (head 8 pi mu b^3, plus A22 of
    a helix), N.m.s; answer in rad/s.
    """
    return m_mag * np.asarray(B) / resistance


def sphere_step_out(*, m_mag, B, mu, b):
    """Step-out rate of a sphere of radius b alone, m B/(8 pi mu b^3), rad/s.

    m_mag: A.m^2; B: T; mu: Pa.s; b: m. For a magnet that fills the sphere it is B_r B/(6 mu_0 mu).
    """
    return step_out(m_mag=m_mag, B=B, resistance=8.0 * pi * mu * np.asarray(b) ** 3)


def mean_rate_above_step_out(*, omega, omega_c):
    """Mean rate of turn of a magnet in a field that rotates at omega: omega up to omega_c, then less.

    omega, omega_c: rad/s, scalars or arrays, real or complex; omega - sqrt(omega^2 - omega_c^2) above
    step-out. Source: overdamped rotor (Adler equation).
    """
    omega, omega_c = np.asarray(omega), np.asarray(omega_c)
    above = omega.real > omega_c.real
    slip = np.where(above, omega**2 - omega_c**2, 0.0)
    return (omega - np.sqrt(slip))[()]
