"""Shapes that a trend in ln x is fitted with: polynomials about a centre, natural cubic splines."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.interpolate import CubicSpline


@dataclass(frozen=True, eq=False)
class Polynomial:
    """Powers 0 to order of ln x - centre."""

    centre: float
    order: int

    @property
    def size(self):
        return self.order + 1

    def columns(self, *, x, derivative=0):
        """(n, size): the powers, or their derivative, at ln x."""
        u, k = np.asarray(x, float)[..., None] - self.centre, np.arange(self.order + 1)
        factor = np.ones(len(k))
        for step in range(derivative):
            factor = factor * (k - step)
        return factor * u ** np.maximum(k - derivative, 0)


@dataclass(frozen=True, eq=False)
class NaturalSpline:
    """Natural cubic spline with the given knots in ln x; a coefficient is the value at its knot."""

    knots: np.ndarray

    @property
    def size(self):
        return len(self.knots)

    @cached_property
    def _spline(self):
        return CubicSpline(self.knots, np.eye(len(self.knots)), bc_type="natural")

    def columns(self, *, x, derivative=0):
        """(n, size): the cardinal splines, or their derivative, at ln x."""
        return self._spline(np.asarray(x, float), derivative)
