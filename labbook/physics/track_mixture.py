"""What is known of one figure, as a mixture of Student's t distributions: mean, interval, test."""

from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq
from scipy.special import ndtri, stdtr

TINY = 1e-290  # a width that is as good as none


@dataclass(frozen=True, eq=False)
class Mixture:
    """A weighted mixture of Student's t distributions: what is known of one figure.

    weight, centre, scale, dof: arrays, one entry a lattice point.
    """

    weight: np.ndarray
    centre: np.ndarray
    scale: np.ndarray
    dof: np.ndarray

    @property
    def mean(self):
        return float(self.weight @ self.centre)

    @property
    def u(self):
        """Standard deviation of the mixture."""
        spread = self.scale**2 * self.dof / (self.dof - 2.0) + (self.centre - self.mean) ** 2
        return float(np.sqrt(self.weight @ spread))

    def below(self, value):
        """Probability of a figure below value."""
        return float(self.weight @ stdtr(self.dof, (value - self.centre) / self.scale))

    def p_zero(self):
        """Two-sided probability of zero: twice the smaller tail."""
        tails = stdtr(self.dof, -self.centre / self.scale), stdtr(self.dof, self.centre / self.scale)
        return float(min(1.0, 2.0 * min(self.weight @ tails[0], self.weight @ tails[1])))

    def quantile(self, p):
        """The value that the figure lies below with probability p, to 1e-6 of its width."""
        reach = 60.0 * self.scale.max() + np.ptp(self.centre)
        width = brentq(lambda z: self.below(self.mean + z * reach) - p, -1.0, 1.0, xtol=1e-8)
        return self.mean + reach * width

    def joined(self, u):
        """With an independent normal uncertainty u added; degrees of freedom by Welch-Satterthwaite."""
        if not u:
            return self
        scale = np.hypot(self.scale, u)
        return Mixture(self.weight, self.centre, scale, self.dof * (scale / self.scale) ** 4)

    def times(self, factor):
        return Mixture(
            self.weight, factor * self.centre, np.maximum(abs(factor) * self.scale, TINY), self.dof
        )


def normal_score(p):
    """How many standard deviations a two-sided probability p stands for."""
    return float(-ndtri(0.5 * np.maximum(p, 1e-300)))
