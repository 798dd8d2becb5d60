"""Drift of the whole picture: from a tracer's track or from a stretch in which the swimmer stood still."""

from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal
from labbook.physics import track_fit
from labbook.physics.track_cleaning import clean
from labbook.physics.track_points import Beat
from labbook.physics.track_search import outliers


@dataclass(frozen=True)
class Drift:
    """velocity: (vx, vy), m/s; u: their standard uncertainties, taken as independent of each other, m/s."""

    velocity: tuple[float, float]
    u: tuple[float, float]


NONE = Drift((0.0, 0.0), (0.0, 0.0))


def drift_of(*, t, x, y, f=None) -> Drift:
    """Velocity of a drift track: t in s, x and y in m; f in Hz where it is shaken at the drive frequency.

    Each component by the fit that speeds are made with, serial correlation and outliers included.
    """
    frames = clean(t=t, x=x, y=y)
    beat = Beat(None if f is None else float(f), False)
    ys = np.stack([frames.columns["x"], frames.columns["y"]])
    keep = ~outliers(t=frames.t, dt=frames.dt, ys=ys, beat=beat)
    plane = track_fit.Plane(t=frames.t[keep], dt=frames.dt, ys=ys[:, keep], beat=beat)
    fits = [plane.speed(e) for e in np.eye(2)]
    return Drift((fits[0].mean, fits[1].mean), (fits[0].u, fits[1].u))


def stated(*, drift, u_drift) -> Drift:
    """A Drift from what a caller gives: None, a pair (vx, vy) in m/s with or without its (ux, uy), or a
    Drift."""
    if isinstance(drift, Drift):
        if u_drift is not None:
            raise Refusal("u_drift", u_drift, "the drift brings its own uncertainty", "leave u_drift out")
        return drift
    if drift is None:
        if u_drift is not None:
            return Drift((0.0, 0.0), pair("u_drift", u_drift, least=0.0))
        return NONE
    return Drift(pair("drift", drift), (0.0, 0.0) if u_drift is None else pair("u_drift", u_drift, least=0.0))


def pair(field, given, least=-np.inf):
    """Two finite numbers (x, y), none below `least`, or a Refusal of `field`."""
    try:
        values = np.asarray(given, float)
    except (TypeError, ValueError):
        values = np.empty(0)
    if values.shape != (2,) or not np.all(np.isfinite(values)) or np.any(values < least):
        raise Refusal(field, given, "two finite numbers (x, y) are needed")
    return float(values[0]), float(values[1])


def apart(*, frames, drift, u_drift, still):
    """(frames to reduce, their Drift): as stated, or from the still stretch, whose frames are then left
    out."""
    moved = stated(drift=drift, u_drift=u_drift)
    if still is None:
        return frames, moved
    if moved is not NONE:
        raise Refusal("still", still, "the drift is given too", "give one of them")
    rest, frames = split_still(frames=frames, still=still)
    return frames, drift_of(t=rest.t, x=rest.columns["x"], y=rest.columns["y"])


def split_still(*, frames, still):
    """(frames of the still stretch, frames of the rest): still is (t0, t1) in the track's s, at either
    end."""
    low, high = pair("still", still)
    inside = (frames.t >= low) & (frames.t <= high)
    rest = np.flatnonzero(~inside)
    if inside.sum() < 2 or (len(rest) and inside[rest[0] : rest[-1]].any()):
        raise Refusal(
            "still", (low, high), "a stretch of frames at the start or the end of the track is needed"
        )
    return frames.where(inside), frames.where(~inside)
