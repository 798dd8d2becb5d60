"""One track's motion on the frames that are used: axis, fit along it, tail tip, frequency."""

from dataclasses import dataclass, replace

import numpy as np

from labbook.physics import track_axis, track_fit, track_steadiness
from labbook.physics.track_cleaning import FEWEST_FRAMES
from labbook.physics.track_search import outliers


@dataclass(frozen=True, eq=False)
class Motion:
    """used: mask; p_zero: of the velocity vector, where that gave the axis; along, lateral: m, all frames."""

    used: np.ndarray
    axis: track_axis.Axis
    p_zero: float | None
    along: np.ndarray
    lateral: np.ndarray
    line: track_fit.LineFit


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
        """The tip's beat across the axis, or None where too few frames show the tip."""
        e = motion.axis.direction
        across = e[0] * self.y - e[1] * self.x
        good = motion.used & np.isfinite(across)
        if good.sum() < FEWEST_FRAMES or track.beat.f is None:
            return None
        t, across = track.t[good], across[good]
        kept = ~outliers(t=t, dt=track.dt, ys=(across,), beat=track.beat)
        beat = replace(track.beat, fitted=fitted)
        return track_fit.fit(t=t[kept], dt=track.dt, y=across[kept], beat=beat)


@dataclass(frozen=True, eq=False)
class Track:
    """Positions with drift taken off, and what the axis is to come from."""

    t: np.ndarray
    dt: float
    x: np.ndarray
    y: np.ndarray
    beat: track_fit.Beat
    axis: object
    body: dict
    u_drift: tuple[float, float]

    def after(self, cycles):
        """Mask of the frames that are left when so many leading cycles are dropped."""
        return self.t >= self.t[0] + (cycles / self.beat.f if cycles else 0.0) - 1e-6 * self.dt

    def motion(self, used) -> Motion:
        """Axis and fit along it, on the frames of a mask."""
        t, beat, p_zero = self.t[used], self.beat, None
        if self.axis is not None:
            axis = track_axis.given(axis=self.axis)
        elif self.body:
            axis = track_axis.from_body(**{k: column[used] for k, column in self.body.items()})
        else:
            test = track_axis.along_velocity(t=t, dt=self.dt, x=self.x[used], y=self.y[used], beat=beat,
                                             u_drift=self.u_drift)  # fmt: skip
            axis, p_zero = test.axis, test.p_zero
        motion = self._along(axis, p_zero, used)
        if p_zero is not None and motion.line.speed.mean < 0.0:  # within rounding of rest: turn the axis round
            motion = self._along(track_axis.turned(axis=axis), p_zero, used)
        return motion

    def _along(self, axis, p_zero, used):
        e, t, beat = axis.direction, self.t[used], self.beat
        along, lateral = e[0] * self.x + e[1] * self.y, e[0] * self.y - e[1] * self.x
        more = ()
        if beat.f is not None:
            more = track_steadiness.columns(start=t[0], end=t[-1] + self.dt, f=beat.f)
        line = track_fit.fit(t=t, dt=self.dt, y=along[used], beat=beat, more=more)
        return Motion(used, axis, p_zero, along, lateral, line)


def frequency(*, track, motion, tip):
    """(f, u_f) in Hz: the given one, or the surest of the fits along, across and of the tip; u 0 without noise."""
    if not track.beat.fitted:
        return track.beat.f, 0.0
    used = motion.used
    across = track_fit.fit(t=track.t[used], dt=track.dt, y=motion.lateral[used], beat=track.beat)
    known = [one.f for one in (motion.line, across, tip) if one is not None and one.f is not None]
    if not known:
        return track.beat.f, 0.0
    best = min(known, key=lambda one: one.u)
    return best.mean, best.u
