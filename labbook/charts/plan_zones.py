"""Zones on the plane of frequency and viscosity as shapes: what several edges leave, tinted or hatched."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from labbook.charts.trend_layers import short

FINE = 129  # rows in which an area is drawn
APART = 0.034  # of the frame's height between two lines of a hatch
ALONG = 401  # places on a line of a hatch


@dataclass(frozen=True, eq=False)
class Union:
    """All that lies above the lowest or below the highest of some edges; f0, f1: the frame along f.

    mu (N,); above, below (N,): f in Hz, held inside the frame, or None where no edge is of that side.
    """

    mu: np.ndarray
    f0: float
    f1: float
    above: np.ndarray | None
    below: np.ndarray | None

    def holds(self, f, mu) -> np.ndarray:
        """Where points of the frame lie in it."""
        inside = np.zeros(np.broadcast(f, mu).shape, bool)
        if self.above is not None:
            inside |= np.log(f) > np.interp(np.log(mu), np.log(self.mu), np.log(self.above))
        if self.below is not None:
            inside |= np.log(f) < np.interp(np.log(mu), np.log(self.mu), np.log(self.below))
        return inside


def union(zones: Sequence, f: np.ndarray, mu: np.ndarray) -> Union:
    """The union of zones, each with side ('above' or 'below') and edge (Hz, one a row of mu)."""
    fine = np.geomspace(mu[0], mu[-1], FINE)
    edges = {
        side: [
            np.exp(np.interp(np.log(fine), np.log(mu), np.log(z.edge)))
            for z in zones
            if z.side == side and np.isfinite(z.edge).all()
        ]
        for side in ("above", "below")
    }
    above = np.clip(np.min(edges["above"], axis=0), f[0], f[-1]) if edges["above"] else None
    below = np.clip(np.max(edges["below"], axis=0), f[0], f[-1]) if edges["below"] else None
    return Union(fine, float(f[0]), float(f[-1]), above, below)


def tint(area: Union, but: Union | None = None) -> list[dict]:
    """Rows of an area: from low to high in f at each mu, without what lies in `but`."""
    start, end = np.full(FINE, area.f0), np.full(FINE, area.f1)
    if but is not None:
        start = start if but.below is None else but.below
        end = end if but.above is None else but.above
    parts = []
    if area.below is not None:
        parts.append(("below", start, np.minimum(area.below, end)))
        start = np.maximum(start, area.below)
    if area.above is not None:
        parts.append(("above", np.maximum(area.above, start), end))
    rows = []
    for part, low, high in parts:
        low = np.minimum(low, high)
        for i in _corners(np.log(area.mu), np.log(low), np.log(high)):
            rows.append({"part": part, "mu": short(area.mu[i]), "low": short(low[i]), "high": short(high[i])})
    return rows


def _corners(y: np.ndarray, *sides: np.ndarray) -> list[int]:
    """The places at which any of some lines has a corner, with both ends; y: evenly spaced."""
    bend = np.max([np.abs(np.diff(x, 2)) for x in sides], axis=0)
    return [0, *(np.flatnonzero(bend > 1e-9) + 1).tolist(), len(y) - 1]


def hatch(area: Union, aspect: float) -> list[dict]:
    """Slanted lines over an area, from (f, mu) to (f2, mu2); aspect: width over height of the frame."""
    if area.above is None and area.below is None:
        return []
    v = np.linspace(0.0, 1.0, ALONG)[None, :]
    u = (np.arange(-1.0, aspect, APART)[:, None] + v) / aspect
    ln_mu = np.log(area.mu[0]) + v * np.log(area.mu[-1] / area.mu[0]) + 0.0 * u
    ln_f = np.log(area.f0) + u * np.log(area.f1 / area.f0)
    inside = (u >= 0.0) & (u <= 1.0) & area.holds(np.exp(ln_f), np.exp(ln_mu))
    steps = np.diff(np.pad(inside.astype(np.int8), ((0, 0), (1, 1))), axis=1)
    line, first = np.nonzero(steps == 1)
    _, past = np.nonzero(steps == -1)
    last = past - 1
    ends = [np.exp(a[line, i]) for i in (first, last) for a in (ln_f, ln_mu)]
    return [
        {"f": short(a), "mu": short(b), "f2": short(c), "mu2": short(d)}
        for a, b, c, d in zip(*ends, strict=True)
        if (a, b) != (c, d)
    ]
