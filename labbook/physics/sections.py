"""Cross-sections of tails (rod, strip, tube, ellipse): second moment, area, drag radius, flatness."""

from math import pi

import numpy as np


def rod_second_moment(*, d):
    """Second moment of area of a round rod, pi d^4/64.

    d diameter in m; answer in m^4. Scalars or arrays, real or complex. Source: Roark's Formulas.
    """
    return pi / 64.0 * np.asarray(d) ** 4


def strip_second_moment(*, w, t):
    """Second moment of area of a rectangular strip that bends in its thickness, w t^3/12.

    w width, t thickness in the bending direction, m; answer in m^4. Source: Roark's Formulas.
    """
    return np.asarray(w) * np.asarray(t) ** 3 / 12.0


def tube_second_moment(*, D, d_in):
    """Second moment of area of a round tube, pi (D^4 - d_in^4)/64.

    D outer and d_in inner diameter, m; answer in m^4. Source: Roark's Formulas.
    """
    return pi / 64.0 * (np.asarray(D) ** 4 - np.asarray(d_in) ** 4)


def ellipse_second_moment(*, semi_w, semi_t):
    """Second moment of area of an ellipse that bends along semi_t, pi semi_w semi_t^3/4.

    semi_w, semi_t semi-axes across and along the bending direction, m; answer in m^4.
    Source: Roark's Formulas.
    """
    return pi / 4.0 * np.asarray(semi_w) * np.asarray(semi_t) ** 3


def rod_area(*, d):
    """Area of a round rod: d diameter in m, answer in m^2."""
    return pi / 4.0 * np.asarray(d) ** 2


def strip_area(*, w, t):
    """Area of a rectangular strip: w width, t thickness in m, answer in m^2."""
    return np.asarray(w) * np.asarray(t)


def tube_area(*, D, d_in):
    """Area of the wall of a round tube: D outer, d_in inner diameter in m, answer in m^2."""
    return pi / 4.0 * (np.asarray(D) ** 2 - np.asarray(d_in) ** 2)


def ellipse_area(*, semi_w, semi_t):
    """Area of an ellipse: semi_w, semi_t semi-axes in m, answer in m^2."""
    return pi * np.asarray(semi_w) * np.asarray(semi_t)


def rod_radius(*, d):
    """Equivalent radius of a round rod for drag, d/2, in m."""
    return np.asarray(d) / 2.0


def strip_radius(*, w, t):
    """Equivalent radius of a strip for drag, (w + t)/4: mean semi-axis of its ellipse.

    w width, t thickness, m; answer in m. Source: Batchelor 1970, J. Fluid Mech. 44:419.
    """
    return (np.asarray(w) + np.asarray(t)) / 4.0


def tube_radius(*, D):
    """Equivalent radius of a tube for drag, D/2 (the bore does not see the flow), in m."""
    return np.asarray(D) / 2.0


def ellipse_radius(*, semi_w, semi_t):
    """Equivalent radius of an ellipse for drag, the mean of its semi-axes, in m (Batchelor 1970)."""
    return (np.asarray(semi_w) + np.asarray(semi_t)) / 2.0


def strip_flatness(*, w, t):
    """Share t/(w + t) of a strip that bends in t: 0.5 for a square or round section, 0 for a flat ribbon.

    w width, t thickness, m; answer without unit, taken by rods.resistive_coefficients.
    Source: Batchelor 1970, J. Fluid Mech. 44:419.
    """
    return np.asarray(t) / (np.asarray(w) + np.asarray(t))
