"""Runs that lie farther from a curve than their own uncertainty and the group's scatter allow.

Rule. z = r/(sigma sqrt(1 - h)), r the residual of ln y less its weighted mean, h its leverage, sigma^2 the
run's own variance plus an excess scatter of the group. The run with the largest |z| is taken out, the scatter
found anew without it (Paule & Mandel 1982), and again, up to a tenth of the runs (60 at most); the outliers
are those up to the last one whose two-sided Student probability is below 1 - (1 - alpha)^(1/n): a sequence as
Rosner's (Technometrics 25:165, 1983), so that two do not hide each other, with Sidak's limit. False alarms
at alpha = 5 %, simulated: 4 to 8 % of groups without outliers of 8 to 200 runs where the scatter is the
group's, 0 to 4 % where the own uncertainties explain it.
"""

from dataclasses import dataclass

import numpy as np
from scipy.stats import t as student

from labbook.errors import Refusal
from labbook.physics.trend_fit import excess

ALPHA = 0.05  # of a group
MOST, MOST_RUNS = 0.1, 60  # of the runs
FEWEST = 6


@dataclass(frozen=True, eq=False)
class Far:
    """index: places of the outliers in the arrays given, worst first; z, p: (n,) of all runs, against the
    scatter without outliers; scatter: that, of ln y; limit: probability of one run that is still no outlier;
    alpha, n: of the test."""

    index: np.ndarray
    z: np.ndarray
    p: np.ndarray
    scatter: float
    limit: float
    alpha: float
    n: int


def far(*, residual, u, leverage=0.0, alpha=ALPHA) -> Far:
    """Which of n runs are outliers: residual of ln y, u own standard uncertainty, leverage (n,) or a number.

    Refuses fewer than 6 runs, arrays that are not finite, u not above zero and alpha not within 0 and 1.
    """
    residual = np.asarray(residual, float)
    if residual.ndim != 1 or len(residual) < FEWEST:
        raise Refusal(
            "residual", residual.shape, f"{FEWEST} runs are the fewest that show an outlier", "log more"
        )
    if not 0.0 < alpha < 1.0:
        raise Refusal("alpha", alpha, "is the share of false alarms", "a number between 0 and 1, as 0.05")
    n = len(residual)
    u, free = np.broadcast_to(np.asarray(u, float), n), 1.0 - np.broadcast_to(np.asarray(leverage, float), n)
    if not np.all(np.isfinite(residual) & np.isfinite(u) & (u > 0.0) & np.isfinite(free)):
        raise Refusal("u", None, "a run has no residual or no positive uncertainty", "leave it out")
    free = np.maximum(free, 1e-3)
    kept, taken, last = np.ones(n, bool), [], 0
    limit = 1.0 - (1.0 - alpha) ** (1.0 / n)
    z, p, scatter = _scores(residual, u, free, kept)
    for _ in range(min(max(1, int(MOST * n)), MOST_RUNS)):
        worst = int(np.argmax(np.where(kept, np.abs(z), -1.0)))
        kept[worst] = False
        taken.append(worst)
        z, p, scatter = _scores(residual, u, free, kept)
        if p[worst] < limit:
            last = len(taken)
    kept[:] = True
    kept[taken[:last]] = False
    z, p, scatter = _scores(residual, u, free, kept)
    index = np.array(sorted(taken[:last], key=lambda k: p[k]), np.intp)
    return Far(index, z, p, scatter, limit, alpha, n)


def _scores(residual, u, free, kept):
    """(z, p, scatter): of all runs, against mean and scatter of those kept."""
    dof = float(free[kept].sum())
    scatter = excess(residual=residual[kept], variance=u[kept] ** 2, dof=dof)
    sigma = np.hypot(u, scatter)
    residual = residual - np.average(residual[kept], weights=sigma[kept] ** -2)
    z = residual / (sigma * np.sqrt(free))
    # the excess is known as the variances together are, which is 2/dof of their harmonic mean, squared
    typical = 1.0 / np.mean(sigma[kept] ** -2)
    return z, 2.0 * student.sf(np.abs(z), np.maximum(dof * (sigma**2 / typical) ** 2, 1.0)), scatter
