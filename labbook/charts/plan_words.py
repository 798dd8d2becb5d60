"""Where a line's name stands along it on a log-log plane, so that no two names lie upon each other."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from labbook.charts.palette import SMALL_SIZE, text_width
from labbook.charts.trend_layers import short

MARGIN = 6.0  # pixels between a name and the frame
CLEAR = 15.0  # pixels between the middles of two names
STEP = 8.0  # pixels between the places that stand for a name
FINE = 201
SPOTS = (
    0.9,
    0.75,
    0.6,
    0.45,
    0.3,
    0.15,
    0.82,
    0.68,
    0.52,
    0.38,
    0.22,
    0.97,
    0.08,
)  # along what is seen of a line


@dataclass(frozen=True, eq=False)
class Worded:
    """A line that wants its name: f (Hz) of each mu; side: 'above', 'below' (in f), 'on' or 'over' it."""

    text: str
    edge: np.ndarray
    side: str
    of: str


def placed(asked: Sequence[Worded], f: np.ndarray, mu: np.ndarray, size: tuple[float, float]) -> list[dict]:
    """A row for each name that has room: text, of what, place (f, mu), a point along (f2, mu2), and its side.

    size: pixels of the frame, across and up. The first asked is the first served.
    """
    taken: list[np.ndarray] = []
    rows = []
    for one in asked:
        found = _spot(one, f, mu, size, taken)
        if found is None:
            continue
        places, at, ahead, rising = found
        taken.append(places)
        rows.append(
            {
                "text": one.text,
                "of": one.of,
                **_side(one.side, rising),
                **_data(at, f, mu, size, ("f", "mu")),
                **_data(ahead, f, mu, size, ("f2", "mu2")),
            }
        )
    return rows


def _spot(one: Worded, f, mu, size, taken):
    """(places that stand for the name, its middle, a point ahead, whether it rises), or None without room."""
    seen = _seen(one.edge, f, mu, size)
    half = text_width(one.text, SMALL_SIZE) / 2.0
    if seen is None or np.hypot(*(seen[-1] - seen[0])) < half:
        return None
    for share in SPOTS:
        at = seen[0] + share * (seen[-1] - seen[0])
        direction = seen[-1] - seen[0]
        direction = direction / np.hypot(*direction)
        if direction[0] < -1e-6:
            direction = -direction  # names read from left to right
        ends = np.array([at - half * direction, at + half * direction])
        if (ends < MARGIN).any() or (ends > np.array(size) - MARGIN).any():
            continue
        places = ends[0] + np.linspace(0, 1, int(2 * half / STEP) + 2)[:, None] * (ends[1] - ends[0])
        if all(
            np.hypot(*(places[:, None] - other[None]).transpose(2, 0, 1)).min() >= CLEAR for other in taken
        ):
            return places, at, at + 20.0 * direction, bool(direction[1] > 0)
    return None


def _seen(edge, f, mu, size) -> np.ndarray | None:
    """The two ends of what is seen of a line, in pixels from the lower left corner; None where nothing is."""
    there = np.isfinite(edge)
    if there.sum() < 2:
        return None
    ln_mu = np.linspace(np.log(mu[0]), np.log(mu[-1]), FINE)
    ln_f = np.interp(ln_mu, np.log(mu[there]), np.log(edge[there]))
    x = (ln_f - np.log(f[0])) / np.log(f[-1] / f[0]) * size[0]
    inside = np.flatnonzero((x >= 0) & (x <= size[0]))
    if len(inside) < 2:
        return None
    y = np.linspace(0.0, size[1], FINE)
    return np.array([[x[i], y[i]] for i in (inside[0], inside[-1])])


def _data(at, f, mu, size, keys) -> dict:
    """A place in pixels as f and mu."""
    spans = ((f[0], f[-1]), (mu[0], mu[-1]))
    return {
        k: short(low * (high / low) ** (p / n))
        for k, p, n, (low, high) in zip(keys, at, size, spans, strict=True)
    }


def _side(side: str, rising: bool) -> dict:
    """Where a name stands: towards higher f ('above'), lower f ('below'), over its line, or upon it."""
    if side == "on":
        return {"baseline": "middle", "dy": 0}
    # the lower side of letters that rise to the right is the one of higher f
    under = rising if side == "above" else not rising if side == "below" else False
    return {"baseline": "top", "dy": 4} if under else {"baseline": "bottom", "dy": -4}
