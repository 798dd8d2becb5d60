"""Random draws of a fit's coefficients: over swimmers by the multiplier bootstrap, over shared errors by JCGM
101."""

from dataclasses import dataclass

import numpy as np

DRAWS, SEED = 10_000, 20_612
SWIMMERS = 3  # fewer say nothing of what swimmers differ by
TAILS = (0.025, 0.975)
MOST_DOF = 1e6  # normal


@dataclass(frozen=True, eq=False)
class Draws:
    """changes: (p, draws) of the coefficients; u_swimmers, u_shared: standard uncertainties of the direction
    asked for; dof: degrees of freedom of the two together."""

    changes: np.ndarray
    u_swimmers: float
    u_shared: float
    dof: float


def drawn(*, fit, direction, draws, rng) -> Draws:
    """Draws of the coefficients of a GroupFit, with the spread that direction . coefficients should have.

    Each swimmer's leave-one-out change gets a random normal weight; each shared statement is off by a random
    normal number of its standard uncertainties; all of a draw has one Student's factor.
    """
    over, shared = fit.over_swimmers(direction=direction), fit.over_shared(direction=direction)
    dof = min(over.dof_with(shared=shared), MOST_DOF)
    swimmers = over.factor * (fit.changes.T @ rng.normal(size=(len(fit.changes), draws)))
    statements = fit.by_shift @ rng.normal(size=(fit.by_shift.shape[1], draws))
    student = np.sqrt(dof / rng.chisquare(dof, draws))
    return Draws(student * (swimmers + statements), over.u, shared, float(dof))


def few(*, swimmers, where):
    """Why fewer swimmers than SWIMMERS have no interval."""
    count = {0: "no swimmer", 1: "one swimmer"}.get(swimmers, f"{swimmers} swimmers")
    return f"no interval: {count} {where}, and it takes {SWIMMERS} to see how much swimmers differ"
