"""One track's motion on the frames that are used: axis, fit along it, tail tip, frequency."""

from dataclasses import dataclass, replace

import numpy as np

from labbook.physics import track_axis, track_fit, track_steadiness
from labbook.physics.track_cleaning import FEWEST_FRAMES
from labbook.physics.track_points import LineFit
from labbook.physics.track_rows import residuals
from labbook.physics.track_search import outliers


@dataclass(frozen=True, eq=False)
class Motion:
    """used: mask; plane: fits on its frames; p_zero: of the velocity vector, where that gave the axis; along,
    lateral: m, all frames; line: fit along the axis."""

    used: np.ndarray
    plane: track_fit.Plane
    axis: track_axis.Axis
    p_zero: float | None
    along: np.ndarray
    lateral: np.ndarray
    line: LineFit

    @property
    def across(self):
        """The direction to the left of the axis."""
        return -self.axis.direction[1], self.axis.direction[0]


@dataclass(frozen=True, eq=False)
class Tail:
    """Tail tip less body, m, NaN where the tip was not seen."""

    x: np.ndarray
    y: np.ndarray

    def filled(self, t):
        """[x, y] with gaps bridged, for the search of the beat; empty where too few frames show the tip."""
        good = np.isfinite(self.x + self.y)
        return (
            [np.interp(t, t[good], one[good]) for one in (self.x, self.y)]
            if good.sum() >= FEWEST_FRAMES
            else []
        )

    def fit(self, track, motion, fitted):
        """The Swing of the tip across the axis, or None where too few frames show the tip."""
        e = motion.axis.direction
        across = e[0] * self.y - e[1] * self.x
        good = motion.used & np.isfinite(across)
        if good.sum() < FEWEST_FRAMES or track.beat.f is None:
            return None
        t, across = track.t[good], across[good]
        kept = ~outliers(t=t, dt=track.dt, ys=across[None], beat=track.beat)
        beat = replace(track.beat, fitted=fitted)
        return track_fit.Plane(t=t[kept], dt=track.dt, ys=across[None, kept], beat=beat).swing(track_fit.ONE)


@dataclass(frozen=True, eq=False)
class Track:
    """places: x and y with drift taken off, (2, n), m; axis, body: what the axis is to come from."""

    t: np.ndarray
    dt: float
    places: np.ndarray
    beat: track_fit.Beat
    axis: object
    body: dict
    u_drift: tuple[float, float]

    def after(self, cycles):
        """Mask of the frames that are left when so many leading cycles are dropped."""
        return self.t >= self.t[0] + (cycles / self.beat.f if cycles else 0.0) - 1e-6 * self.dt

    def motion(self, used) -> Motion:
        """Axis and fit along it, on the frames of a mask."""
        part = slice(None) if used.all() else used
        t, places, p_zero, more = self.t[part], self.places[:, part], None, ()
        if self.beat.f is not None:
            more = track_steadiness.rows(start=t[0], end=t[-1] + self.dt, f=self.beat.f)
        plane = track_fit.Plane(t=t, dt=self.dt, ys=places, beat=self.beat, more=more)
        if self.axis is not None:
            axis = track_axis.given(axis=self.axis)
        elif self.body:
            axis = track_axis.from_body(**{k: column[used] for k, column in self.body.items()})
        else:
            residual = residuals(rows=track_fit.plain_rows(t=t, dt=self.dt, beat=self.beat), ys=places)
            test = track_axis.along_velocity(plane=plane, residual=residual, u_drift=self.u_drift)
            axis, p_zero = test.axis, test.p_zero
        line = plane.along(axis.direction)
        if p_zero is not None and line.speed.mean < 0.0:  # within rounding of rest: turn the axis round
            axis = track_axis.turned(axis=axis)
            line = plane.along(axis.direction)
        (ex, ey), (x, y) = axis.direction, self.places
        return Motion(used, plane, axis, p_zero, ex * x + ey * y, ex * y - ey * x, line)


def frequency(*, track, motion, tip):
    """(f, u_f) in Hz: the given one, or the surest of the fits along, across and of the tip; u 0 without
    noise."""
    if not track.beat.fitted:
        return track.beat.f, 0.0
    swings = motion.line.swing, motion.plane.swing(motion.across), tip
    known = [one.f for one in swings if one is not None and one.f is not None]
    if not known:
        return track.beat.f, 0.0
    best = min(known, key=lambda one: one.u)
    return best.mean, best.u
