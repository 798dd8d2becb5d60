"""Which trials to do next: the widest gap in a plane, or the least uncertain top of a curve."""

import numpy as np

from labbook.errors import Refusal

ROUNDS = 20
AT_ONCE = 4_000_000  # distances that are held at a time
LOOSE = 10.0  # of x: a design that leaves the top so loose does not tell it


def maximin(*, candidates, taken, n) -> np.ndarray:
    """Indices of n candidates that lie as far as they can from the points taken and from each other.

    candidates, taken: (m, 2) and (k, 2), each axis in units in which distances compare; k may be 0. The
    criterion is the smallest distance of a chosen point to any other point, to be made largest (maximin
    distance: Johnson, Moore & Ylvisaker, J. Stat. Plann. Inference 26:131, 1990). Chosen one after the other,
    each in the widest gap, which comes within a factor 2 of the best (Gonzalez, Theor. Comput. Sci. 38:293,
    1985), then exchanged one by one while that helps. Fewer than n where candidates run out; no two at one
    place. Refuses n below 1.
    """
    if n < 1:
        raise Refusal("n", n, "is how many runs to propose", "1 or more")
    candidates = np.unique(np.asarray(candidates, float).reshape(-1, 2), axis=0, return_index=True)
    places, first = candidates
    gap = nearest(places, np.asarray(taken, float).reshape(-1, 2))
    if not np.isfinite(gap).any() and len(places):
        start = int(
            np.argmin(nearest(places, places.mean(axis=0, keepdims=True)))
        )  # nothing taken: from the middle
        chosen, near = [start], nearest(places, places[[start]])
    else:
        chosen, near = [], gap.copy()
    while len(chosen) < min(n, len(places)):
        best = int(np.argmax(near))
        if near[best] <= 0.0:
            break
        chosen.append(best)
        near = np.minimum(near, nearest(places, places[[best]]))
    return first[_exchanged(places, gap, chosen)]


def nearest(places, others) -> np.ndarray:
    """Distance of each place to the nearest of the others, inf where there are none."""
    found = np.full(len(places), np.inf)
    step = max(1, AT_ONCE // max(1, len(places)))
    for start in range(0, len(others), step):
        part = others[start : start + step]
        found = np.minimum(found, np.sqrt(((places[:, None, :] - part[None]) ** 2).sum(axis=2)).min(axis=1))
    return found


def _exchanged(places, gap, chosen) -> list[int]:
    """The chosen, each in turn moved to where it is farther from the rest, while that distance grows."""
    for _ in range(ROUNDS):
        moved = False
        for i in range(len(chosen)):
            rest = chosen[:i] + chosen[i + 1 :]
            room = np.minimum(gap, nearest(places, places[rest]))
            best = int(np.argmax(room))
            if room[best] > room[chosen[i]] * (1.0 + 1e-12):
                chosen[i], moved = best, True
        if not moved:
            break
    return chosen


def top_of_parabola(*, x, y, u, window) -> tuple[float, np.ndarray] | None:
    """(place, coefficients) of the top of a parabola through points, None where they have none inside.

    x, y, u: (n,), u the standard uncertainty of y. The parabola 1, x, x^2 is fitted by weighted least squares
    to the points within `window` of the top, which is found again with each fit; at first it is the highest
    point.
    """
    if len(x) < 4:
        return None
    top = float(x[np.argmax(y)])
    for _ in range(ROUNDS):
        near = np.abs(x - top) <= window
        if len(np.unique(x[near])) < 4:
            return None
        rows = np.vander(x[near], 3, increasing=True) / u[near, None]
        found, *_ = np.linalg.lstsq(rows, y[near] / u[near], rcond=None)
        if found[2] >= 0.0:
            return None
        last, top = top, float(-found[1] / (2.0 * found[2]))
        if not x[near].min() < top < x[near].max():
            return None
        if abs(top - last) < 1e-9:
            break
    return top, found


def pin_top(*, top, curvature, known_x, known_u, candidates, u, n) -> tuple[np.ndarray, np.ndarray]:
    """(indices, u_top): the n candidates that leave the least variance of the place of a parabola's top.

    top, curvature: where y = c0 + c2 (x - top)^2 has its top, and c2 < 0, about which the place is
    linearised; known_x, known_u: (k,) runs that are there; candidates, u: (m,) and the expected standard
    uncertainty of y there. u_top: (n + 1,) standard uncertainty of the place before and after each run, inf
    where it cannot be told. One after the other, repeats allowed, then exchanged while that helps. Criterion:
    local c-optimality (Atkinson, Donev & Tobias, Optimum Experimental Designs, with SAS, 2007, ch. 10; for a
    turning point Chaloner, Commun. Stat. A 18:1385, 1989). Refuses a curve that has no top, and n below 1.
    """
    if n < 1:
        raise Refusal("n", n, "is how many runs to propose", "1 or more")
    if not curvature < 0.0:
        raise Refusal("curve", f"{curvature:g}", "has no top", "its curvature must be negative")
    known = _information(np.asarray(known_x, float) - top, np.asarray(known_u, float)).sum(axis=0)
    each = _information(np.asarray(candidates, float) - top, np.asarray(u, float))
    chosen: list[int] = []
    for _ in range(n):
        chosen.append(int(np.argmin(_variance_of_slope(known + each[chosen].sum(axis=0) + each))))
    for _ in range(ROUNDS):
        before = list(chosen)
        for i in range(n):
            rest = known + each[chosen[:i] + chosen[i + 1 :]].sum(axis=0)
            room = _variance_of_slope(rest + each)
            if room.min() < room[chosen[i]] * (1.0 - 1e-9):
                chosen[i] = int(np.argmin(room))
        if chosen == before:
            break
    steps = np.array([known + each[chosen[:k]].sum(axis=0) for k in range(n + 1)])
    u_top = np.sqrt(_variance_of_slope(steps)) / (-2.0 * curvature)
    return np.array(chosen), np.where(u_top < LOOSE, u_top, np.inf)


def _information(x, u) -> np.ndarray:
    rows = np.vander(x, 3, increasing=True) / u[:, None]
    return rows[:, :, None] * rows[:, None, :]


def _variance_of_slope(information) -> np.ndarray:
    """Variance of the slope at the top, which tells the place of the top.

    A trace of the identity keeps designs comparable that cannot tell it yet.
    """
    size = np.maximum(np.trace(information, axis1=1, axis2=2), 1.0)[:, None, None]
    return np.linalg.inv(information + 1e-12 * size * np.eye(3))[:, 1, 1]
