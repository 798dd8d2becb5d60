"""Oscillations as complex amplitudes, each with its slopes along the inputs it depends on."""

from collections.abc import Callable
from dataclasses import dataclass
from itertools import zip_longest

import numpy as np


@dataclass(frozen=True)
class Phasor:
    """A complex amplitude z, or a real mean of such, with its slopes d along some directions.

    z: array or scalar; the oscillation is Re[z exp(i omega t)]. d: one entry a direction, None where z does
    not depend on it; missing entries count as None. Real and imaginary part of z are rounded apart from each
    other, which is what keeps the small quadrature part of a stiff tail accurate.
    """

    z: np.ndarray
    d: tuple = ()

    def __add__(self, other):
        return Phasor(self.z + other.z, _paired(self.d, other.d, lambda a: a, lambda b: b))

    def __sub__(self, other):
        return Phasor(self.z - other.z, _paired(self.d, other.d, lambda a: a, lambda b: -b))

    def __mul__(self, other):
        return Phasor(self.z * other.z, _paired(self.d, other.d, lambda a: a * other.z, lambda b: self.z * b))

    def __truediv__(self, other):
        inverse = 1.0 / other.z
        ratio = self.z * inverse
        back = -ratio * inverse
        return Phasor(ratio, _paired(self.d, other.d, lambda a: a * inverse, lambda b: b * back))

    def linear(self, function: Callable):
        """The phasor after a linear function, such as a factor or the real part."""
        return Phasor(function(self.z), tuple(None if a is None else function(a) for a in self.d))

    def mean_product(self, other):
        """Mean over a period of the product of two oscillations."""
        return Phasor(_half(self.z, other.z),
                      _paired(self.d, other.d, lambda a: _half(a, other.z), lambda b: _half(self.z, b)))

    def square(self):
        """Squared amplitude, twice the mean square."""
        return Phasor(2.0 * _half(self.z, self.z),
                      tuple(None if a is None else 4.0 * _half(self.z, a) for a in self.d))

    def amplitude(self):
        size = np.sqrt(2.0 * _half(self.z, self.z))
        return Phasor(size, tuple(None if a is None else 2.0 * _half(self.z, a) / size for a in self.d))


def _half(a, b):
    return (a.real * b.real + a.imag * b.imag) * 0.5


def _paired(first, second, of_first, of_second):
    if not first and not second:
        return ()
    joined = []
    for a, b in zip_longest(first, second):
        left = None if a is None else of_first(a)
        right = None if b is None else of_second(b)
        joined.append(right if left is None else left if right is None else left + right)
    return tuple(joined)
