"""Undulating swimmers: inertial scalings of speed, and the classical waving sheet and filament."""

import numpy as np

from labbook.errors import Refusal

# Fits of Gazzola, Argentina & Mahadevan 2014; the prefactors and powers are quoted from memory.
SWIMMING_FITS = {"laminar": (0.03, 1.31), "turbulent": (0.4, 1.02)}


def swimming_reynolds(*, Sw, branch=None):
    """Reynolds number of an undulating swimmer from its swimming number Sw = omega A_tip L_body/nu.

    branch "laminar" (0.03 Sw^1.31) or "turbulent" (0.4 Sw^1.02); None takes the lower of the two, which
    changes over near Re = 3.6e3. Scalars or arrays, real or complex. Refuses an unknown branch.
    Source: Gazzola, Argentina & Mahadevan 2014, Nature Phys. 10:758.
    """
    Sw = np.asarray(Sw)
    if branch is None:
        laminar, turbulent = (swimming_reynolds(Sw=Sw, branch=key) for key in SWIMMING_FITS)
        return np.where(laminar.real <= turbulent.real, laminar, turbulent)[()]
    if branch not in SWIMMING_FITS:
        raise Refusal("branch", branch, "is not a branch of the scaling", "laminar, turbulent or None")
    factor, power = SWIMMING_FITS[branch]
    return factor * Sw**power


def swimming_speed(*, omega, A_tip, L_body, nu, branch=None):
    """Speed of an undulating swimmer by the swimming-number scaling, m/s.

    omega: rad/s; A_tip peak-to-peak tip excursion and L_body: m; nu: m^2/s; branch as in swimming_reynolds.
    Source: Gazzola, Argentina & Mahadevan 2014.
    """
    Sw = omega * np.asarray(A_tip) * L_body / nu
    return swimming_reynolds(Sw=Sw, branch=branch) * nu / L_body


def bainbridge_speed(*, L_body, f):
    """Cruising speed of a fish from its length and beat frequency, L (3 f - 4)/4, m/s.

    L_body: m; f: Hz, above about 5 Hz. Source: Bainbridge 1958, J. Exp. Biol. 35:109 (from memory).
    """
    return np.asarray(L_body) * (3.0 * np.asarray(f) - 4.0) / 4.0


def sheet_speed(*, omega, wavenumber, amplitude, order=2):
    """Speed of a waving sheet in Stokes flow, omega k b^2/2, to second or fourth order in k b, m/s.

    omega: rad/s; wavenumber: 1/m; amplitude of the wave: m. Fourth order multiplies by 1 - (19/16) k^2 b^2.
    Refuses another order. Source: Taylor 1951, Proc. R. Soc. A 209:447.
    """
    if order not in (2, 4):
        raise Refusal("order", order, "is not available", "2 or 4")
    speed = omega * wavenumber * np.asarray(amplitude) ** 2 / 2.0
    return speed if order == 2 else speed * (1.0 - 19.0 / 16.0 * (wavenumber * np.asarray(amplitude)) ** 2)


def filament_speed(*, omega, wavenumber, amplitude, zeta_ratio):
    """Speed of a waving filament of small amplitude, (zeta_n/zeta_t - 1) omega k b^2/2, m/s.

    Units as in sheet_speed; zeta_ratio = zeta_n/zeta_t (1 gives no motion). Source: Gray & Hancock 1955.
    """
    return (zeta_ratio - 1.0) * sheet_speed(omega=omega, wavenumber=wavenumber, amplitude=amplitude)


def penetration_depth(*, nu, omega):
    """Depth to which an oscillating wall drags a viscous fluid, sqrt(2 nu/omega), m.

    nu: m^2/s; omega: rad/s. Source: Stokes' second problem.
    """
    return np.sqrt(2.0 * np.asarray(nu) / omega)
