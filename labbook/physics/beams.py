"""The viscous beam: how an elastic tail with a free tip, moved slowly in Stokes flow, answers its base."""

from dataclasses import dataclass
from math import cos, factorial, pi, sin, sqrt

import numpy as np

_SERIES_BELOW = 2.0  # Sp: the power series is exact to rounding here, the exponential form takes over above
_SERIES_TERMS = 9


@dataclass(frozen=True)
class Phasor:
    """An oscillation as its in-phase and quadrature part, Re[(p + i q) exp(i omega t)].

    The parts are kept apart, not as one complex number, so that both stay accurate at small Sp and both can
    themselves carry a complex step.
    """

    p: np.ndarray
    q: np.ndarray

    def __add__(self, other):
        return Phasor(self.p + other.p, self.q + other.q)

    def __sub__(self, other):
        return Phasor(self.p - other.p, self.q - other.q)

    def __mul__(self, other):
        return Phasor(self.p * other.p - self.q * other.q, self.p * other.q + self.q * other.p)

    def __truediv__(self, other):
        size = other.square()
        return Phasor((self.p * other.p + self.q * other.q) / size,
                      (self.q * other.p - self.p * other.q) / size)

    def scaled(self, factor):
        return Phasor(self.p * factor, self.q * factor)

    def square(self):
        return self.p**2 + self.q**2

    def amplitude(self):
        return np.sqrt(self.square())

    def mean_product(self, other):
        return (self.p * other.p + self.q * other.q) / 2.0


@dataclass(frozen=True)
class Beam:
    """How a tail with a free tip answers its base: lengths in L, slopes as they are, all phasors.

    h''(0) = -i Sp^4 (P h + M h') and h'''(0) = i Sp^4 (Q h + P h') for base position h and slope h';
    the tip stands at tip_h h + tip_slope h'.
    """

    P: Phasor
    M: Phasor
    Q: Phasor
    tip_h: Phasor
    tip_slope: Phasor


def free_tip_beam(*, Sp):
    """Answer of a tail of sperm number Sp to the motion of its base, as a Beam.

    zeta_n h_t = -EI h_xxxx with h'' = h''' = 0 at the tip, solved exactly. Sp: scalar or array, real or
    complex step, from 0 up without overflow. Source: Wiggins & Goldstein 1998, Phys. Rev. Lett. 80:3879.
    """
    Sp = np.asarray(Sp) * 1.0
    small = Sp.real < _SERIES_BELOW
    if np.all(small):
        return _beam_series(Sp)
    if not np.any(small):
        return _beam_exponential(Sp)
    low, high = _beam_series(np.where(small, Sp, 1.0)), _beam_exponential(np.where(small, _SERIES_BELOW, Sp))
    return Beam(**{key: Phasor(np.where(small, getattr(low, key).p, getattr(high, key).p),
                               np.where(small, getattr(low, key).q, getattr(high, key).q))
                   for key in Beam.__dataclass_fields__})


def _beam_series(Sp):
    """Entire functions of k^4 = -i Sp^4, such as cosh k cos k, by their power series."""
    quarter, full = 4.0 * Sp**4, -(Sp**4)
    D = _series(quarter, 0, 0.5) + Phasor(0.5, 0.0)
    parts = (_series(quarter, 2, 1.0), _series(quarter, 3, 2.0), _series(quarter, 1, 1.0),
             _series(full, 0, 1.0), _series(full, 1, 1.0))
    return Beam(*(part / D for part in parts))


def _series(y, first, factor):
    """factor times the sum of (i y)^n/(4n + first)!, as a phasor."""
    even = np.zeros_like(y)
    odd = np.zeros_like(y)
    for n in range(_SERIES_TERMS, -1, -1):  # Horner in y^2, even powers in phase, odd ones in quadrature
        even = even * -(y**2) + 1.0 / factorial(8 * n + first)
        odd = odd * -(y**2) + 1.0 / factorial(8 * n + 4 + first)
    return Phasor(factor * even, factor * y * odd)


def _beam_exponential(Sp):
    """The same functions through decaying exponentials, k = Sp exp(-i pi/8), nothing larger than 1."""
    alpha, beta = cos(pi / 8.0), sin(pi / 8.0)
    X, Y = sqrt(2.0) * alpha * Sp, sqrt(2.0) * beta * Sp
    ch_X, sh_X = _hyperbolic(X, X)
    ch_Y, sh_Y = _hyperbolic(Y, X)
    cos_X, sin_X, cos_Y, sin_Y = np.cos(X), np.sin(X), np.cos(Y), np.sin(Y)
    k = Phasor(alpha * Sp, -beta * Sp)
    cosh_cos = Phasor(cos_X * ch_Y + cos_Y * ch_X, sin_Y * sh_X - sin_X * sh_Y).scaled(0.5)
    sinh_sin = Phasor(sin_Y * sh_X + sin_X * sh_Y, cos_X * ch_Y - cos_Y * ch_X).scaled(0.5)
    near, far = Phasor(sin_X * ch_Y, cos_X * sh_Y), Phasor(sin_Y * ch_X, -cos_Y * sh_X)
    D = (cosh_cos + Phasor(np.exp(-X), 0.0)).scaled(0.5)
    # cosh k sin k and cos k sinh k, by sums of sines of k(1 + i) and k(1 - i)
    cosh_sin = (near + far).scaled(0.5)
    cos_sinh = (Phasor(near.q, -near.p) - Phasor(far.q, -far.p)).scaled(0.5)
    x, y = alpha * Sp, beta * Sp
    ch_x, sh_x = _hyperbolic(x, X)
    ch_y, sh_y = _hyperbolic(y, X)
    cosh_k, sinh_k = Phasor(ch_x * np.cos(y), -sh_x * np.sin(y)), Phasor(sh_x * np.cos(y), -ch_x * np.sin(y))
    cos_k, sin_k = Phasor(np.cos(x) * ch_y, np.sin(x) * sh_y), Phasor(np.sin(x) * ch_y, -np.cos(x) * sh_y)
    double = D.scaled(2.0)
    return Beam(P=sinh_sin / (double * k * k), M=(cosh_sin - cos_sinh) / (double * k * k * k),
                Q=(cosh_sin + cos_sinh) / (double * k), tip_h=(cosh_k + cos_k) / double,
                tip_slope=(sinh_k + sin_k) / (double * k))


def _hyperbolic(y, X):
    """cosh y and sinh y, both times exp(-X) with X the largest exponent in play."""
    rise, fall = np.exp(y - X), np.exp(-y - X)
    return (rise + fall) / 2.0, (rise - fall) / 2.0
