"""Rotating helical tails by resistive-force theory: resistances, free speed, and how far it is off."""

from math import pi

import numpy as np

from labbook.errors import Refusal
from labbook.physics import magnets, rods, walls

COEFFICIENTS = {
    "gray_hancock": "ln(2 pitch/a) -1/2 and +1/2 (Gray & Hancock type; not the 1955 pair of rods)",
    "lighthill": "Lighthill 1976, ln(0.18 W/a) with W the filament's length per turn",
}

# theory ("gray_hancock") over tank measurement at two pitch/R: thrust, torque, drag. Rodenborn et al. 2013,
# PNAS 110:E338, digitised; R 6.3 mm, L 130 mm, a 0.397 mm
TANK = {
    2.226: (18.85 / 6.26, 110.0 / 131.9, 156.5 / 52.06),
    9.811: (9.066 / 9.57, 43.53 / 72.69, 35.18 / 35.29),
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
    a11, a12, a22 = resistance(R=R, pitch=pitch, L=L, a=a, mu=mu, coefficients=coefficients)
    return speed_of(drive=drive, omega=omega, a11=a11, a12=a12, a22=a22, axial=walls.sphere_drag(mu=mu, b=b),
                    spinning=walls.sphere_rotational_drag(mu=mu, b=b))


def speed_of(*, drive, omega, a11, a12, a22, axial, spinning, m_mag=None, B=None):
    """Speed along the axis of a free helix behind any head, from the resistances of both, m/s.

    a11, a12, a22: as resistance gives them; axial, spinning: the head's along and about the axis, N.s/m and
    N.m.s. For "field" with m_mag (A.m^2) and B (T): above step-out, omega_c = m B/(spinning + a22), the mean
    rate of turn drives it; None or NaN: it follows the field. Scalars or arrays, real or complex; refusals
    and sources as free_speed.
    """
    if drive not in ("field", "motor"):
        raise Refusal("drive", drive, "is not a drive of a helix", "field or motor")
    drag = a11 + axial
    if drive == "motor":
        return a12 * (spinning * omega / (a22 - a12**2 / drag + spinning)) / drag
    if m_mag is not None and B is not None:
        known = ~np.isnan(m_mag * np.asarray(B))
        limit = magnets.step_out(m_mag=m_mag, B=B, resistance=spinning + a22)
        follows = np.real(omega)  # a limit that is not known is taken as not passed
        omega = magnets.mean_rate_above_step_out(omega=omega, omega_c=np.where(known, limit, follows))
    return a12 * omega / drag


def speed_range(*, drive, omega, R, pitch, L, a, mu, axial, spinning, m_mag=None, B=None):
    """Lowest and highest of three answers of resistive-force theory, m/s: what it leaves open.

    Both coefficient pairs, and "gray_hancock" with thrust, torque and drag divided by what TANK has for the
    nearer of its two pitches. A guide, not a bound: the tank's helix had L/R = 21 and a/R = 0.063.
    Arguments as in resistance and speed_of, real; arrays of the broadcast shape.
    """
    head = dict(drive=drive, omega=omega, axial=axial, spinning=spinning, m_mag=m_mag, B=B)
    helix = dict(R=R, pitch=pitch, L=L, a=a, mu=mu)
    plain, slender = (resistance(**helix, coefficients=key) for key in COEFFICIENTS)
    short, long = sorted(TANK)
    near = np.asarray(pitch) / R < np.sqrt(short * long)
    thrust, torque, drag = (np.where(near, x, y) for x, y in zip(TANK[short], TANK[long], strict=True))
    answers = [speed_of(a11=a11, a12=a12, a22=a22, **head) for a11, a12, a22 in
               (plain, slender, (plain[0] / drag, plain[1] / thrust, plain[2] / torque))]
    return np.minimum.reduce(answers), np.maximum.reduce(answers)


def _coefficients(coefficients, pitch, arc, L, a, mu):
    if coefficients == "lighthill":
        return rods.resistive_coefficients(model="lighthill", L=L, a=a, mu=mu, wavelength=arc)
    if coefficients == "gray_hancock":
        log_ratio = np.log(2.0 * np.asarray(pitch) / a)
        return 4.0 * pi * mu / (log_ratio + 0.5), 2.0 * pi * mu / (log_ratio - 0.5)
    raise Refusal("coefficients", coefficients, "are not known here", "one of " + ", ".join(COEFFICIENTS))
