"""Rotating helical tails by resistive-force theory: resistances and free swimming speed."""

from math import pi

import numpy as np

from labbook.errors import Refusal
from labbook.physics import rods, walls

COEFFICIENTS = {
    "gray_hancock": "ln(2 pitch/a) -1/2 and +1/2 (Gray & Hancock type; not the 1955 pair of rods)",
    "lighthill": "Lighthill 1976, ln(0.18 W/a) with W the filament's length per turn",
}


def resistance(*, R, pitch, L, a, mu, coefficients="gray_hancock"):
    """Resistances (A11, A12, A22) of a helix: force on speed, thrust on rate of turn, torque on rate of turn.

    R helix radius, pitch along the axis, L axial length, a filament radius: m; mu: Pa.s. Force along the axis
    = A11 U - A12 Omega, torque = A22 Omega - A12 U: N.s/m, N.s, N.m.s. Scalars or arrays, real or complex.
    Refuses unknown coefficients. Resistive-force theory: up to three times off at pitch/R = 2 (Rodenborn et
    al. 2013). Source: Lauga & Powers 2009, Rep. Prog. Phys. 72:096601.
    """
    tan = 2.0 * pi * np.asarray(R) / pitch
    cos = 1.0 / np.sqrt(1.0 + tan**2)
    sin = tan * cos
    c_n, c_t = _coefficients(coefficients, pitch, pitch / cos, L, a, mu)
    a11 = (c_n * sin**2 + c_t * cos**2) * L / cos
    a12 = (c_n - c_t) * sin * R * L
    a22 = (c_n * cos**2 + c_t * sin**2) * np.asarray(R) ** 2 * L / cos
    return a11, a12, a22


def free_speed(*, drive, omega, R, pitch, L, a, b, mu, coefficients="gray_hancock"):
    """Speed along the axis of a free helix behind a sphere of radius b, m/s.

    drive "field": the whole swimmer turns at omega (below step-out); "motor": omega is the rate of the tail
    relative to the head, which turns the other way. omega: rad/s; the rest as in resistance. Refuses an
    unknown drive. Source: Purcell 1997, PNAS 94:11307; Lauga & Powers 2009.
    """
    if drive not in ("field", "motor"):
        raise Refusal("drive", drive, "is not a drive of a helix", "field or motor")
    a11, a12, a22 = resistance(R=R, pitch=pitch, L=L, a=a, mu=mu, coefficients=coefficients)
    drag = a11 + walls.sphere_drag(mu=mu, b=b)
    if drive == "field":
        return a12 * omega / drag
    turn = walls.sphere_rotational_drag(mu=mu, b=b)
    tail_rate = turn * omega / (a22 - a12**2 / drag + turn)
    return a12 * tail_rate / drag


def _coefficients(coefficients, pitch, arc, L, a, mu):
    if coefficients == "lighthill":
        return rods.resistive_coefficients(model="lighthill", L=L, a=a, mu=mu, wavelength=arc)
    if coefficients == "gray_hancock":
        log_ratio = np.log(2.0 * np.asarray(pitch) / a)
        return 4.0 * pi * mu / (log_ratio + 0.5), 2.0 * pi * mu / (log_ratio - 0.5)
    raise Refusal("coefficients", coefficients, "are not known here", "one of " + ", ".join(COEFFICIENTS))
