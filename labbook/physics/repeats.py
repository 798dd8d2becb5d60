"""Repeat groups: runs that were set up alike, and whether they scatter more than their bars say.

Alike: the same identities (swimmer, fluid), and each setting (f, theta0, B) equal to within a relative
tolerance of 0.5 %, that is the last digit of a setting written with three ("0.50" and "0.502" are one
setting). Settings are taken in ascending order, and one joins while it is within the tolerance of the first
of its group: groups do not creep. A setting that was not written (NaN) equals only others not written. Shared
errors move a group as one and cancel in it, so only what a run has alone is compared with the scatter.
"""

from dataclasses import dataclass

import numpy as np
from scipy.stats import chi2

from labbook.errors import Refusal

TOLERANCE = 0.005  # relative
ROUNDING = 1e-12  # of a setting, so that a tolerance of 0 still means equal


@dataclass(frozen=True, eq=False)
class Repeats:
    """Groups of two runs or more, in order of their first run; G groups.

    group: (n,) of each run, -1 for a run by itself; n: (G,); mean: weighted by own u; u_mean: from own u;
    plain mean: plain_mean; scatter: standard deviation about the plain mean; over_stated: scatter over the
    root mean square of own u; birge: root of chi-square over n - 1; p: probability of as much scatter if the
    bars are right; pooled_*: of all groups together. NaN where a u is zero or missing.
    """

    group: np.ndarray
    n: np.ndarray
    mean: np.ndarray
    u_mean: np.ndarray
    plain_mean: np.ndarray
    scatter: np.ndarray
    over_stated: np.ndarray
    chi_square: np.ndarray
    birge: np.ndarray
    p: np.ndarray
    pooled_chi_square: float
    pooled_dof: int
    pooled_birge: float
    pooled_p: float


def alike(*, identities, settings, tolerance=TOLERANCE):
    """(n,) number of the set of like runs that each run belongs to, by order of first sight.

    identities: arrays (n,) that must be equal, as swimmer and fluid; settings: arrays (n,) of numbers, as f,
    theta0 and B, equal within tolerance: one number, or one a setting. Refuses unequal lengths and a
    tolerance below 0.
    """
    columns = [np.asarray(c, object) for c in identities] + [np.asarray(c, float) for c in settings]
    if not columns or any(c.shape != (len(columns[0]),) for c in columns):
        raise Refusal(
            "settings", [c.shape for c in columns], "the columns differ in length", "give one row a key"
        )
    tolerances = np.broadcast_to(np.asarray(tolerance, float), len(settings))
    if not np.all(tolerances >= 0.0):
        raise Refusal("tolerance", tolerance, "is a relative difference", "a number from 0 up, as 0.005")
    sets = np.zeros(len(columns[0]), np.intp)
    for column in identities:
        names = np.asarray(column, object)
        place: dict = {}
        codes = np.array([place.setdefault(name, len(place)) for name in names], np.intp)
        sets = _joined(sets, codes)
    for column, allowed in zip(settings, tolerances, strict=True):
        sets = _joined(sets, _levels(np.asarray(column, float), sets, allowed + ROUNDING))
    _, first, sets = np.unique(sets, return_index=True, return_inverse=True)
    return np.argsort(np.argsort(first))[sets]


def repeats(*, y, u_own, sets) -> Repeats:
    """Repeat groups of y (n,) with own standard uncertainties u_own (n,) or a number; sets: as from `alike`.

    Runs whose y is not a number belong to no group. Refuses arrays of other lengths and negative u.
    """
    y, sets = np.asarray(y, float), np.asarray(sets)
    try:
        u = np.broadcast_to(np.asarray(u_own, float), y.shape)
    except ValueError:
        raise Refusal("u_own", np.shape(u_own), f"{len(y)} numbers are needed, one a run") from None
    if y.ndim != 1 or sets.shape != y.shape:
        raise Refusal("sets", sets.shape, f"y has the shape {y.shape}", "give one set a run")
    if np.any(u < 0.0):
        raise Refusal("u_own", u[u < 0.0][0], "a standard uncertainty is not negative")
    known = np.isfinite(y)
    names, first, code, counts = np.unique(
        sets[known], return_index=True, return_inverse=True, return_counts=True
    )
    several = np.flatnonzero(counts > 1)
    several = several[np.argsort(first[several])]
    place = np.full(len(names), -1)
    place[several] = np.arange(len(several))
    group = np.full(len(y), -1)
    group[known] = place[code]
    inside = group >= 0
    g, values, G = group[inside], y[inside], len(several)
    n = np.bincount(g, minlength=G)

    def total(of):
        return np.bincount(g, weights=of, minlength=G)

    plain = total(values) / n
    scatter = np.sqrt(total((values - plain[g]) ** 2) / (n - 1))
    with np.errstate(divide="ignore", invalid="ignore"):
        w = np.where(u[inside] > 0.0, u[inside] ** -2.0, np.nan)
        mean = total(w * values) / total(w)
        chi_square = total(w * (values - mean[g]) ** 2)
        over = scatter / np.sqrt(total(np.where(w > 0.0, u[inside] ** 2, np.nan)) / n)
        stated = np.isfinite(chi_square)
        pooled, dof = float(chi_square[stated].sum()), int((n - 1)[stated].sum())
        birge = float(np.sqrt(np.divide(pooled, dof))) if dof else np.nan
        return Repeats(
            group,
            n,
            mean,
            total(w) ** -0.5,
            plain,
            scatter,
            over,
            chi_square,
            np.sqrt(chi_square / (n - 1)),
            chi2.sf(chi_square, n - 1),
            pooled,
            dof,
            birge,
            float(chi2.sf(pooled, dof)) if dof else np.nan,
        )


def _joined(sets, codes):
    return np.unique(sets * (codes.max(initial=0) + 1) + codes, return_inverse=True)[1]


def _levels(column, sets, allowed):
    """Codes of a setting's levels within each set: a level takes all within `allowed` of its lowest."""
    codes = np.zeros(len(column), np.intp)
    order = np.lexsort((column, sets))  # not written come last
    level, start, of = 0, np.nan, None
    for k, value, here in zip(order.tolist(), column[order].tolist(), sets[order].tolist(), strict=True):
        same = (
            value == start
            or abs(value - start) <= allowed * abs(start)
            or (value != value and start != start)
        )
        if here != of or not same:
            level, start, of = level + 1, value, here
        codes[k] = level
    return codes
