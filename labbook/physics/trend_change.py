"""Change over time of the swimmers of a family, for one swimmer or all of a batch: is something ageing?

The family's curve and a steady change in time are fitted together, so what time has in common with x (the low
Sp first, the high ones last) is not taken for ageing. Shifts that stay (a swimmer's size, a fluid's
reading) are fitted along with their stated size and cancel but for what time has in common with them.
Two readings of the same runs: y changes at equal x, or the whole curve moves along x, as it does when the
modulus in x was measured once and the material ages (x as E^(-1/4) moves by a quarter of the change of E).
"""

from dataclasses import dataclass

import numpy as np
from scipy.stats import chi2
from scipy.stats import t as student

from labbook.errors import Refusal
from labbook.physics.trend_curve import curve
from labbook.physics.trend_fit import fit

YEAR = 365.25  # days
SHORTEST = 1.0  # day
FEWEST = 4  # runs of a swimmer


@dataclass(frozen=True, eq=False)
class Rate:
    """per_year: change of ln y or ln x; low, high: 95 % interval; u: standard; p: two-sided, of no change;
    p_all: the same where all owners and both readings are looked at for one that stands out (Holm, Scand. J.
    Stat. 6:65, 1979); p_differ: of swimmers that differ as much if they changed alike, NaN for one."""

    per_year: float
    u: float
    low: float
    high: float
    p: float
    p_all: float
    p_differ: float


@dataclass(frozen=True, eq=False)
class Change:
    """One owner (a swimmer or a batch): y at equal x, x at equal y, NaN with a verdict that says why;
    likelier: 'y' or 'x', whichever explains more; n, swimmers, days: runs, swimmers and time that it rests
    on."""

    owner: object
    y: Rate
    x: Rate
    likelier: str
    verdict: str
    n: int
    swimmers: int
    days: float


def changes(*, points, days, owner=None) -> tuple[Change, ...]:
    """Change of each owner, in order of first sight. days: as long as the arrays given to
    trend_points.points; owner: likewise, None for each swimmer by itself.

    A swimmer is of one owner. Refuses arrays of other lengths and a swimmer of two owners.
    """
    days = _as_given("days", days, points).astype(float)
    owner = (
        np.array(points.swimmers, object)[points.swimmer]
        if owner is None
        else _as_given("owner", owner, points)
    )
    if not np.all(np.isfinite(days)):
        raise Refusal("days", None, "a run has no date", "leave it out")
    owners = _owner_of_each(points, owner)
    since = (
        days
        - np.array([days[points.swimmer == s].mean() for s in range(len(points.swimmers))])[points.swimmer]
    )
    counts = np.bincount(points.swimmer)
    spans = np.array([np.ptp(days[points.swimmer == s]) for s in range(len(points.swimmers))])
    told = np.flatnonzero((counts >= FEWEST) & (spans >= SHORTEST))
    columns = (points.swimmer[:, None] == told) * (since / YEAR)[:, None]
    first = curve(points=points)
    of_y, fitted = _slopes(points, first.shape, columns)
    of_x, _ = _slopes(points, first.shape, -fitted.slope[:, None] * columns)
    readings = [of_y, of_x]
    groups = [(name, np.flatnonzero([owners[s] == name for s in told])) for name in dict.fromkeys(owners)]
    rates = _holm([_together(*reading, members) for reading in readings for _, members in groups])
    answer = []
    for k, (name, members) in enumerate(groups):
        of = np.isin(points.swimmer, told[members])
        y, x = rates[k], rates[len(groups) + k]
        verdict = (
            ""
            if len(members)
            else (f"no change can be told: no swimmer has {FEWEST} runs over {SHORTEST:g} day or more")
        )
        likelier = "" if verdict else "x" if x.p < y.p else "y"
        answer.append(
            Change(
                name,
                y,
                x,
                likelier,
                verdict,
                int(of.sum()),
                len(members),
                float(np.ptp(days[of])) if of.any() else 0.0,
            )
        )
    return tuple(answer)


def _as_given(field, given, points):
    given = np.asarray(given)
    if given.ndim != 1 or len(given) <= points.index.max(initial=-1):
        raise Refusal(
            field, given.shape, "one a run is needed, as long as x", "give a row of the same length"
        )
    return given[points.index]


def _owner_of_each(points, owner):
    first = {}
    for s, name in zip(points.swimmer, owner, strict=True):
        if first.setdefault(s, name) != name:
            raise Refusal(
                "owner",
                name,
                f"{points.swimmers[s]} has runs of another one, {first[s]}",
                "give each swimmer one owner",
            )
    return [first[s] for s in range(len(points.swimmers))]


def _slopes(points, shape, columns):
    """((slopes, covariance, degrees of freedom) of columns fitted along with the family's curve, the fit)."""
    fitted = fit(points=points, shape=shape, more=columns)
    here = slice(shape.size, shape.size + columns.shape[1])
    covariance = np.linalg.inv(fitted.solved.total)[here, here]
    dof = max(1.0, len(points.x) - fitted.leverage.sum())
    return (fitted.coefficients[here], covariance, dof), fitted


def _together(slopes, covariance, dof, members):
    """The Rate of several swimmers that change alike, by generalised least squares."""
    if not len(members):
        return Rate(*[np.nan] * 7)
    V = np.linalg.inv(covariance[np.ix_(members, members)])
    weight = V.sum(axis=0)
    u = 1.0 / np.sqrt(weight.sum())
    mean = float(weight @ slopes[members] / weight.sum())
    off = slopes[members] - mean
    differ = float(chi2.sf(off @ V @ off, len(members) - 1)) if len(members) > 1 else np.nan
    half = float(student.ppf(0.975, dof) * u)
    p = float(2.0 * student.sf(abs(mean) / u, dof))
    return Rate(mean, float(u), mean - half, mean + half, p, p, differ)


def _holm(rates):
    order = sorted((k for k, r in enumerate(rates) if np.isfinite(r.p)), key=lambda k: rates[k].p)
    highest, answer = 0.0, list(rates)
    for place, k in enumerate(order):
        highest = max(highest, min(1.0, rates[k].p * (len(order) - place)))
        r = rates[k]
        answer[k] = Rate(r.per_year, r.u, r.low, r.high, r.p, highest, r.p_differ)
    return answer
