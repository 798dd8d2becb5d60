"""Heads of swimmers: drag of a sphere and of a spheroid, along, across and turning, alone and near walls."""

from dataclasses import dataclass
from math import pi

import numpy as np

from labbook.physics import walls

_SERIES_BELOW = 0.1  # of |e^2|: below, the closed forms lose digits, and 18 terms of the series lose none
_SERIES_TERMS = 18


@dataclass(frozen=True)
class HeadDrag:
    """Resistances of a head and where its tail begins.

    axial, lateral: force per speed along and across the axis, N.s/m; turning, spinning: torque per rate of
    turn about a diameter and about the axis, N.m.s; back: distance from the centre back to the tail, m.
    """

    axial: np.ndarray
    lateral: np.ndarray
    turning: np.ndarray
    spinning: np.ndarray
    back: np.ndarray


def head_drag(*, mu, b, b_long=None, h_wall=None, D_tank=None):
    """Resistances of a head: a sphere of radius b, or a spheroid with axial semi-axis b_long, as a HeadDrag.

    mu: Pa.s; b, b_long: m; h_wall, D_tank: distance of the axis to one plane wall and bore of a tube, m,
    which raise the drag along and across (walls.head_factor) but not that of turning, whose change is third
    order. None or NaN leaves b_long, h_wall or D_tank out. Scalars or arrays, real or complex; NaN where the
    head touches a wall. Source: Stokes 1851; spheroid_factors.
    """
    b = np.asarray(b)
    axial, turning = walls.sphere_drag(mu=mu, b=b), walls.sphere_rotational_drag(mu=mu, b=b)
    lateral, spinning, back = axial, turning, b
    if _given(b_long):
        back = _else(b_long, b)
        factors = spheroid_factors(b=b, b_long=back)
        # per 6 pi mu b_long and 8 pi mu b_long^3
        force, torque = 6.0 * pi * mu * back, 8.0 * pi * mu * back**3
        axial, lateral, turning, spinning = (
            unit * factor for unit, factor in zip((force, force, torque, torque), factors, strict=True))
    if _given(h_wall) or _given(D_tank):
        unit = 6.0 * pi * mu  # the radius of the sphere with the same drag is what a far wall sees
        near = [walls.head_factor(b=drag / unit, h_wall=h_wall, D_tank=D_tank) for drag in
                ((axial,) if lateral is axial else (axial, lateral))]
        axial, lateral = axial * near[0], lateral * near[-1]
    return HeadDrag(axial, lateral, turning, spinning, back)


def spheroid_factors(*, b, b_long):
    """Drag of a spheroid over that of a sphere of radius b_long, its semi-axis along the axis of revolution.

    Answers (along, across, turning about a diameter, turning about the axis); b is the other semi-axis: m,
    scalars or arrays, real or complex, longer or shorter than b_long. At b = b_long all are 1, without loss
    of digits near it. Source: Perrin 1934, J. Phys. Radium 5:497; Chwang & Wu 1974 and 1975, J. Fluid Mech.
    63:607 and 67:787 (prolate, in the eccentricity e); oblate by analytic continuation in e^2.
    """
    z = 1.0 - (np.asarray(b) / b_long) ** 2  # e^2, negative for an oblate head
    atanh, rest = _eccentric(z)
    along_both = atanh + rest
    return (4.0 / 3.0 / along_both, 8.0 / 3.0 / (3.0 * atanh - rest), 2.0 / 3.0 * (2.0 - z) / along_both,
            2.0 / 3.0 * (1.0 - z) / (atanh - rest))


def _eccentric(z):
    """atanh(e)/e and (atanh(e)/e - 1)/e^2 as functions of z = e^2, also for z < 0."""
    near = np.abs(z.real) < _SERIES_BELOW
    close = np.where(near, z, 0.0)
    series = [np.zeros_like(close), np.zeros_like(close)]
    for n in range(_SERIES_TERMS, -1, -1):
        for i in (0, 1):
            series[i] = series[i] * close + 1.0 / (2 * n + 1 + 2 * i)
    if np.all(near):
        return series
    prolate = ~near & (z.real > 0.0)
    e, m = np.sqrt(np.where(prolate, z, 0.25)), np.sqrt(np.where(near | prolate, 0.25, -z))
    far = np.where(prolate, np.log((1.0 + e) / (1.0 - e)) / (2.0 * e), np.arctan(m) / m)
    return np.where(near, series[0], far), np.where(near, series[1], (far - 1.0) / np.where(near, 1.0, z))


def _given(length):
    return length is not None and not np.all(np.isnan(length))


def _else(length, other):
    """The length, or the other one where it is not given."""
    return np.where(np.isnan(length), other, length)
