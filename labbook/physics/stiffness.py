"""Bench tests of stiffness: sag and ring-down of a clamped tail, and the modulus each one gives."""

from math import pi

import numpy as np

from labbook.errors import Refusal

G_N = 9.80665  # m/s^2, standard acceleration, exact by definition (CGPM 1901)
CLAMPED_FREE_BETA = (1.875104069, 4.694091133, 7.854757438)  # roots of cos(x) cosh(x) = -1 (Blevins)
SAG_LIMIT = 0.1  # delta/L above which the linear sag is more than about 1 % too large


def sag(*, rho_s, area, L, E, I_area):
    """Tip deflection under its own weight of a horizontal rod clamped at one end, rho_s A g L^4/(8 E I).

    rho_s: kg/m^3; area: m^2; L: m; E: Pa; I_area: m^4; answer in m. Scalars or arrays, real or complex.
    Linear: see sag_is_small. Source: Roark's Formulas.
    """
    return rho_s * area * G_N * np.asarray(L) ** 4 / (8.0 * E * np.asarray(I_area))


def modulus_from_sag(*, delta, rho_s, area, L, I_area):
    """Young's modulus from the self-weight sag delta (m) of a clamped rod, Pa.

    The other arguments as in sag; trust it where sag_is_small(delta=, L=) is true. Source: Roark's Formulas.
    """
    return rho_s * area * G_N * np.asarray(L) ** 4 / (8.0 * np.asarray(delta) * I_area)


def sag_is_small(*, delta, L):
    """Whether delta/L is at most 0.1, where the linear sag formula is good to about 1 %.

    delta, L: m, scalars or arrays; boolean answer. Source: comparison with the large-deflection elastica.
    """
    return np.real(np.asarray(delta) / L) <= SAG_LIMIT


def natural_frequency(*, n, rho_s, area, L, E, I_area):
    """Frequency of mode n (1, 2, 3) of an undamped clamped rod, beta_n^2/(2 pi) sqrt(E I/(rho_s A L^4)), Hz.

    Units as in sag; refuses other modes. Source: Blevins, Formulas for Natural Frequency and Mode Shape.
    """
    return _beta(n) ** 2 / (2.0 * pi) * np.sqrt(E * np.asarray(I_area) / (rho_s * area)) / np.asarray(L) ** 2


def modulus_from_ringdown(*, f1, rho_s, area, L, I_area):
    """Young's modulus from the first ring-down frequency f1 (Hz) of a clamped rod in air, Pa.

    Units as in sag; damping is taken as small. Source: Blevins.
    """
    return (2.0 * pi * np.asarray(f1) / _beta(1) ** 2) ** 2 * rho_s * area * np.asarray(L) ** 4 / I_area


def _beta(n):
    if n not in (1, 2, 3):
        raise Refusal("n", n, "is not a mode in the table", "1, 2 or 3")
    return CLAMPED_FREE_BETA[n - 1]
