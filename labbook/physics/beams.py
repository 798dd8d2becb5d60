"""The viscous beam: how an elastic tail with a free tip, moved slowly in Stokes flow, answers its base."""

from dataclasses import dataclass, fields
from math import cos, factorial, pi, sin

import numpy as np

SERIES_BELOW = 2.0  # Sp: the power series is exact to rounding here, the exponential form takes over above
_SERIES_TERMS = 4  # pairs: the next one is below 1e-20 at Sp = 2
ALPHA, BETA = cos(pi / 8.0), sin(pi / 8.0)  # the wavenumber is k = (ALPHA - i BETA) Sp


@dataclass(frozen=True)
class Beam:
    """How a tail with a free tip answers its base: lengths in L, slopes as they are, all complex amplitudes.

    h''(0) = -i Sp^4 (P h + M h') and h'''(0) = i Sp^4 (Q h + P h') for base position h and slope h';
    the tip stands at tip_h h + tip_slope h' and slopes by turn_h h + tip_h h'.
    """

    P: np.ndarray
    M: np.ndarray
    Q: np.ndarray
    tip_h: np.ndarray
    tip_slope: np.ndarray
    turn_h: np.ndarray


def free_tip_beam(*, Sp):
    """Answer of a tail of sperm number Sp to the motion of its base, as a Beam.

    zeta_n h_t = -EI h_xxxx with h'' = h''' = 0 at the tip, solved exactly. Sp: real scalar or array, from 0
    up without overflow. Source: Wiggins & Goldstein 1998, Phys. Rev. Lett. 80:3879.
    """
    Sp = np.asarray(Sp, dtype=float)
    small = Sp < SERIES_BELOW
    if np.all(small):
        return _beam_series(Sp)
    if not np.any(small):
        return _beam_exponential(Sp)
    answer = np.empty((len(fields(Beam)), *Sp.shape), complex)
    for rows, form in ((np.nonzero(small), _beam_series), (np.nonzero(~small), _beam_exponential)):
        part = form(Sp[rows])
        for whole, field in zip(answer, fields(Beam), strict=True):
            whole[rows] = getattr(part, field.name)
    return Beam(*answer)


def beam_slopes(*, Sp, beam):
    """d/dSp of P, M, Q, tip_h and tip_slope of a Beam, as a tuple; no function has to be evaluated again.

    A longer tail is the same tail with a short piece put before its base, which gives a Riccati equation for
    what the base feels (invariant imbedding: Bellman & Wing 1975, from memory). Sp as in free_tip_beam.
    """
    over = 1.0 / np.where(Sp == 0.0, np.inf, Sp)  # what it multiplies vanishes with Sp
    turn = -1j * (Sp * Sp * Sp)
    M_turn, P_turn = beam.M * turn, beam.P * turn
    return ((beam.Q - 2.0 * beam.P) * over + M_turn * beam.P,
            (2.0 * beam.P - 3.0 * beam.M) * over + M_turn * beam.M,
            (1.0 - beam.Q) * over + P_turn * beam.P,
            P_turn * beam.tip_slope,
            (beam.tip_h - beam.tip_slope) * over + M_turn * beam.tip_slope)


def _beam_series(Sp):
    """Entire functions of k^4 = -i Sp^4, such as cosh k cos k, by their power series."""
    full = -((Sp * Sp) ** 2)
    quarter = -4.0 * full
    over = 1.0 / (series(quarter, 0) * 0.5 + 0.5)
    tip_turn = series(full, 3) * (1j * full)
    parts = (series(quarter, 2), 2.0 * series(quarter, 3), series(quarter, 1), series(full, 0),
             series(full, 1), tip_turn)
    return Beam(*(part * over for part in parts))


def series(y, first):
    """Sum of (i y)^n/(4n + first)! for real y, to rounding for y up to 64: even powers real, odd ones
    imaginary."""
    square = -(y * y)
    total = np.empty(np.shape(y), complex)
    for offset, part in ((0, total.real), (4, total.imag)):
        part[...] = 1.0 / factorial(8 * (_SERIES_TERMS - 1) + offset + first)
        for n in range(_SERIES_TERMS - 2, -1, -1):
            part *= square
            part += 1.0 / factorial(8 * n + offset + first)
    total.imag *= y
    return total


def _beam_exponential(Sp):
    """The same functions through decaying exponentials, nothing larger than 1."""
    x, y = ALPHA * Sp, BETA * Sp
    cos_x, sin_x, cos_y, sin_y = np.cos(x), np.sin(x), np.cos(y), np.sin(y)
    fall_x, fall_y = np.exp(-x), np.exp(-y)
    ch_x, sh_x = 0.5 + 0.5 * fall_x * fall_x, 0.5 - 0.5 * fall_x * fall_x  # both times exp(-x)
    ch_y, sh_y = 0.5 + 0.5 * fall_y * fall_y, 0.5 - 0.5 * fall_y * fall_y  # both times exp(-y)
    cosh_k, sinh_k = _complex(ch_x * cos_y, -sh_x * sin_y), _complex(sh_x * cos_y, -ch_x * sin_y)
    cos_k, sin_k = _complex(cos_x * ch_y, sin_x * sh_y), _complex(sin_x * ch_y, -cos_x * sh_y)
    over_k = np.reciprocal(Sp) * complex(ALPHA, BETA)
    over = 1.0 / (cosh_k * cos_k + fall_x * fall_y)
    once = over * over_k
    twice = once * over_k
    cosh_sin, cos_sinh = cosh_k * sin_k, cos_k * sinh_k
    return Beam(P=sinh_k * sin_k * twice, M=(cosh_sin - cos_sinh) * (twice * over_k),
                Q=(cosh_sin + cos_sinh) * once, tip_h=(cosh_k * fall_y + cos_k * fall_x) * over,
                tip_slope=(sinh_k * fall_y + sin_k * fall_x) * once,
                turn_h=(sinh_k * fall_y - sin_k * fall_x) * over * (Sp * complex(ALPHA, -BETA)))


def _complex(real, imag):
    both = np.empty(np.shape(real), complex)
    both.real, both.imag = real, imag
    return both
