"""A family's own curve over all of its runs: a natural spline of ln y in ln x, for residuals and a first
look."""

from dataclasses import dataclass

import numpy as np

from labbook.physics.trend_basis import NaturalSpline
from labbook.physics.trend_fit import GroupFit, fit

SPACING = 0.2  # of ln x between knots, where the runs are dense
RUNS_A_KNOT = 4
FEWEST, MOST = 3, 14


@dataclass(frozen=True, eq=False)
class FamilyCurve:
    """shape and fit of a family; low, high: ln x of the first and last run."""

    shape: NaturalSpline
    fit: GroupFit
    low: float
    high: float

    def at(self, *, x):
        """y of the curve at x, NaN beyond the runs."""
        ln_x = np.log(np.asarray(x, float))
        inside = (ln_x >= self.low) & (ln_x <= self.high)
        return np.where(inside, np.exp(self.shape.columns(x=ln_x) @ self.fit.coefficients), np.nan)


def curve(*, points) -> FamilyCurve:
    """The curve of a family: knots 0.2 apart in ln x, fewer where runs are few; refuses as trend_fit.fit."""
    knots = _knots(points.x)
    shape = NaturalSpline(knots)
    return FamilyCurve(shape, fit(points=points, shape=shape), float(points.x.min()), float(points.x.max()))


def _knots(x):
    levels = np.unique(np.round(x, 3))
    if len(levels) < FEWEST:
        return np.linspace(x.min(), max(x.max(), x.min() + 1e-3), 2)
    spread = np.ptp(x)
    count = int(np.clip(min(spread / SPACING + 1.0, len(x) / RUNS_A_KNOT, len(levels) - 1), FEWEST, MOST))
    # half even in ln x, half by the number of runs: dense where the runs are, without empty stretches
    even, runs = np.linspace(0.0, 1.0, count), np.quantile(x, np.linspace(0.0, 1.0, count))
    return 0.5 * (x.min() + spread * even) + 0.5 * runs
