"""The likeliest cause of an outlier among readings that may have been off: the least improbable shift.

A source explains a residual r when its reading was off by k = r/a of its standard uncertainties, a being what
one of them does to the residual. A source that other runs share must have been off for them too: with their
residuals r_j the improbability is k^2 + sum_j [(r_j - a_j k)^2 - r_j^2]/sigma_j^2, and its root, `cost`, is
compared in standard uncertainties. House rules (common practice, no source): a flag (a calibration out of
date, a temperature beyond the readings) says that the stated uncertainty may be too small, which counts
double then; a flag without a size, as a wall nearby, counts as 3; a cost above 6 explains nothing.
"""

from dataclasses import dataclass

import numpy as np

from labbook.physics.trend_fit import GroupFit
from labbook.physics.trend_outliers import ALPHA, Far, far

DOUBT = 2.0  # by how much a flag widens a stated uncertainty
FLAG_ALONE = 3.0  # standard uncertainties
EXPLAINS = 6.0


@dataclass(frozen=True, eq=False)
class Cause:
    """One possible cause: name ('temperature', 'E', 'amplitude', 'wall', 'fluid reading').

    x, y: (n,) signed change of x and y by one standard uncertainty, in their units, zero where it does not
    reach; owner: (n,) whose reading it is, None for each run its own; flag: (n,) bool, None for never; note:
    what the flag says; sign: of the residual that a flag without parts explains, 0 for either.
    """

    name: str
    x: object = 0.0
    y: object = 0.0
    owner: object = None
    flag: object = None
    note: str = ""
    sign: int = 0


@dataclass(frozen=True, eq=False)
class Outlier:
    """One run: index in the arrays given to trend_points.points; off: y over the curve, less one; z, p: as in
    Far; cause: name of the likeliest, empty where none explains it; shift: in its standard uncertainties, NaN
    for a flag; cost; others: (name, shift, cost) of the rest, likeliest first; sentence: with numbers."""

    index: int
    off: float
    z: float
    p: float
    cause: str
    shift: float
    cost: float
    others: tuple
    sentence: str


@dataclass(frozen=True, eq=False)
class Outliers:
    """rows: worst first; far: the test."""

    rows: tuple[Outlier, ...]
    far: Far


def outliers(*, fit, causes=(), names=None, alpha=ALPHA) -> Outliers:
    """Outliers of a GroupFit, as that of a family's curve, with the likeliest cause of each.

    causes: Causes with arrays as long as those given to trend_points.points; names: of the runs, likewise,
    for the sentences. Refuses as trend_outliers.far.
    """
    test = far(residual=fit.residual, u=fit.u, leverage=fit.leverage, alpha=alpha)
    at, sigma = fit.points.index, np.hypot(fit.u, test.scatter)
    sources = [_along(cause, fit) for cause in causes]
    rows = []
    for k in test.index:
        # the fit followed the run by its leverage: undo that
        residual = fit.residual.copy()
        residual[k] /= max(1.0 - fit.leverage[k], 0.1)
        found = [c for s in sources if (c := _cost(s, k, residual, sigma, test.index)) is not None]
        found.sort(key=lambda c: c[2])
        rows.append(
            _told(
                int(at[k]),
                k,
                residual[k],
                test,
                found,
                str(names[at[k]]) if names is not None else f"run {at[k]}",
            )
        )
    return Outliers(tuple(rows), test)


def _along(cause, fit: GroupFit):
    """(cause, part of the residual, owner or None, flag), for the usable runs."""
    p, n = fit.points, len(fit.points.index)

    def usable(given):
        given = np.asarray(given)
        return np.broadcast_to(given, n) if given.ndim == 0 else given[p.index]

    part = usable(cause.y) / np.exp(p.y) - fit.slope * usable(cause.x) / np.exp(p.x)
    flag = np.zeros(n, bool) if cause.flag is None else usable(cause.flag).astype(bool)
    return cause, part, None if cause.owner is None else usable(np.asarray(cause.owner, object)), flag


def _cost(source, k, residual, sigma, outlying):
    """(name, shift, cost, note), or None where the source does not reach run k."""
    cause, part, owner, flag = source
    flagged, note = bool(flag[k]), cause.note if flag[k] else ""
    if not part[k] or not np.isfinite(part[k]):
        agrees = flagged and cause.sign * residual[k] >= 0.0
        return (cause.name, np.nan, FLAG_ALONE, note) if agrees else None
    shift = residual[k] / part[k]
    own = (shift / DOUBT if flagged else shift) ** 2
    if owner is None:
        return cause.name, float(shift), float(np.sqrt(own)), note
    rest = np.flatnonzero((owner == owner[k]) & (np.arange(len(part)) != k))
    change = ((residual[rest] - part[rest] * shift) ** 2 - residual[rest] ** 2) / sigma[rest] ** 2
    return cause.name, float(shift), float(np.sqrt(max(own + change.sum(), 0.0))), note


def _told(index, k, residual, test, found, name):
    off = float(np.expm1(residual))
    side = "above" if off > 0.0 else "below"
    start = (
        f"{name}: {100 * abs(off):.0f} % {side} the curve, {abs(test.z[k]):.1f} times what its own "
        f"uncertainty and the group's scatter allow"
    )
    if not found:
        end = "no source with a stated uncertainty reaches it: look for a slip"
    elif found[0][2] > EXPLAINS:
        end = (
            f"no stated source explains it (least improbable: {found[0][0]}, at {found[0][2]:.1f} standard "
            "uncertainties): look for a slip"
        )
    elif np.isnan(found[0][1]):
        end = f"likeliest cause: {found[0][0]}{_bracket(found[0][3])}"
    else:
        cause, shift, _, note = found[0]
        end = (
            f"likeliest cause: {cause}, if it was {abs(shift):.1f} standard uncertainties too "
            f"{'high' if shift > 0.0 else 'low'}{_bracket(note)}"
        )
        if len(found) > 1:
            end += f"; next: {found[1][0]}, at {found[1][2]:.1f}"
    best = found[0] if found and found[0][2] <= EXPLAINS else ("", np.nan, np.nan, "")
    return Outlier(
        index,
        off,
        float(test.z[k]),
        float(test.p[k]),
        *best[:3],
        tuple(c[:3] for c in (found[1:] if best[0] else found)),
        f"{start}; {end}.",
    )


def _bracket(note):
    return f" ({note})" if note else ""
