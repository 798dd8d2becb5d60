"""Spheres in Stokes flow, alone and near a wall or on the axis of a tube."""

from math import pi

import numpy as np

TUBE_KAPPA_LIMIT = 0.5  # above it the Haberman-Sayre fit leaves the exact solution by more than 1.3 %
TUBE_KAPPA_CHECKED = 0.4  # up to here it is within 0.3 %
PLANE_X_CHECKED = 1.0 / 3.0  # up to here Faxen's expansion is within 0.1 %


def sphere_drag(*, mu, b):
    """Force per speed of a sphere in unbounded fluid, 6 pi mu b.

    mu: Pa.s; b radius: m; answer in N.s/m. Scalars or arrays, real or complex. Source: Stokes 1851.
    """
    return 6.0 * pi * mu * np.asarray(b)


def sphere_rotational_drag(*, mu, b):
    """Torque per rate of turn of a sphere in unbounded fluid, 8 pi mu b^3.

    mu: Pa.s; b radius: m; answer in N.m.s. Scalars or arrays, real or complex. Source: Lamb, Hydrodynamics.
    """
    return 8.0 * pi * mu * np.asarray(b) ** 3


def plane_wall_parallel(*, x):
    """Factor on the drag of a sphere that moves along one plane wall, x = b/h with h the centre's height.

    Scalars or arrays, real or complex; NaN outside 0 <= x < 1. Within 0.1 % of the exact solution for
    x <= 1/3. Source: Faxen 1922, in Happel & Brenner.
    """
    x = np.asarray(x)
    factor = 1.0 / (1.0 - x * (9.0 / 16.0 - x**2 * (1.0 / 8.0 - x * (45.0 / 256.0 + x / 16.0))))
    return _inside(factor, x, upper_open=1.0)


def plane_wall_perpendicular(*, x):
    """Factor on the drag of a sphere that moves towards one plane wall, x = b/h with h the centre's height.

    Exact series; scalars or arrays, real or complex; NaN outside 0 <= x <= 0.9999 (the series grows long).
    Source: Brenner 1961, Chem. Eng. Sci. 16:242.
    """
    x = np.asarray(x)
    far = x.real < 1e-9  # the series needs a finite separation; here it is 1 + 9x/8 to all digits
    inside = np.where(far | (x.real > 0.9999) | np.isnan(x.real), 0.5, x)
    alpha = np.log((1.0 + np.sqrt(1.0 - inside**2)) / inside)
    last = int(np.ceil(24.0 / np.min(alpha.real, initial=24.0))) + 8
    total = np.zeros_like(alpha)
    for n in range(1, last):
        m = 2 * n + 1
        # every exponential carries exp(-m alpha), so nothing overflows far from the wall
        cross = m * (np.exp((2 - m) * alpha) - np.exp(-(2 + m) * alpha)) / 2.0
        square = m**2 * (np.exp((2 - m) * alpha) - 2.0 * np.exp(-m * alpha) + np.exp(-(2 + m) * alpha)) / 4.0
        excess = 2.0 * np.exp(-m * alpha) * (1.0 - np.exp(-m * alpha)) + cross + square
        total = total + n * (n + 1) / ((2 * n - 1) * (2 * n + 3)) * excess / (
            (1.0 - np.exp(-m * alpha)) ** 2 - square)
    factor = np.where(far, 1.0 + 9.0 / 8.0 * x, 4.0 / 3.0 * np.sinh(alpha) * total)
    return _inside(factor, x, upper_open=np.nextafter(0.9999, 1.0))


def tube_axis(*, kappa):
    """Factor on the drag of a sphere on the axis of a closed tube, kappa = sphere radius/tube radius.

    Scalars or arrays, real or complex; NaN outside 0 <= kappa <= 0.5. Source: Haberman & Sayre 1958.
    """
    kappa = np.asarray(kappa)
    factor = (1.0 - 0.75857 * kappa**5) / (
        1.0 - kappa * (2.1050 - kappa**2 * (2.0865 - kappa**2 * (1.7068 - 0.72603 * kappa))))
    return _inside(factor, kappa, upper_open=np.nextafter(TUBE_KAPPA_LIMIT, 1.0))


def head_factor(*, b, h_wall=None, D_tank=None):
    """Factor on the drag of a head of radius b on the axis of a tube, or else beside one plane wall.

    b, h_wall (centre to wall), D_tank (bore, which counts where both are given): m, scalars or arrays, real
    or complex; None or NaN where there is no such wall; 1 where there is none, NaN where a head of this
    radius does not fit. It is the factor of motion along the wall; across the axis of a tube it is an
    estimate. Checked for h_wall >= 3 b and D_tank >= 5 b. Source: plane_wall_parallel, tube_axis; for other
    bodies than spheres, with the radius of equal drag, Brenner 1962, J. Fluid Mech. 12:35 (far walls).
    """
    factor = np.ones(np.broadcast_shapes(*(np.shape(x) for x in (b, h_wall, D_tank) if x is not None)))
    for wall, ratio, law in ((h_wall, 1.0, lambda x: plane_wall_parallel(x=x)),
                             (D_tank, 2.0, lambda x: tube_axis(kappa=x))):
        if wall is not None:
            absent = np.isnan(wall)
            factor = np.where(absent, factor, law(ratio * b / np.where(absent, np.inf, wall)))
    return factor[()]


def _inside(factor, x, upper_open):
    ok = (x.real >= 0.0) & (x.real < upper_open)
    return np.where(ok, factor, np.nan)[()]
