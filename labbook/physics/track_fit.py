"""Fits of uniform motion and beat along any direction of a track, short or long."""

from dataclasses import replace

import numpy as np

from labbook.physics import track_beat
from labbook.physics.track_mixture import Mixture
from labbook.physics.track_points import HARMONICS, Beat, LineFit, Points, Swing
from labbook.physics.track_rows import Rows, least_squares

POINTS_PER_BEAT = 14  # at least, where the frames allow it
LONG_RECORD = 60.0  # cycles: beyond, the beat is taken off first and the line is fitted to averages
LONG_POINTS = 1000  # of such a record, and of one without beat
PIECE = 40.0  # cycles of a long record that its beat's uncertainties come from
SLOWEST_SHARE = 1.0 / 30.0  # of the record, or one beat if that is longer
SLOWEST_WITHOUT_BEAT = 0.1  # of the record
WALK_WITHOUT_BEAT = 10.0  # what drifts about without a beat most likely diffuses
SEARCH_HARMONICS = 10
MANY_FRAMES = 200_000  # from here on four do
ONE = np.ones(1)  # the direction of a track's only signal


class Plane:
    """What is known of a track's motion along any direction e (k,) of its signals, e . ys.

    t: s, rising, steps of about dt; ys: (k, n), m; more: callables t -> row, each added alone to the model
    for `extra`. A record of up to 60 cycles is fitted jointly on averages of 14 or more a beat; from a
    longer one, where a fractional cycle weighs nothing, the beat is taken off by least squares on all frames
    and the line fitted to 1,000 averages. The frames are gone through once, for all directions. origin: s,
    where levels and phases count from.
    """

    def __init__(self, *, t, dt, ys, beat, more=()):
        T = t[-1] - t[0] + dt
        self._t, self._dt, self._ys, self._beat, self._T = t, dt, ys, beat, T
        self._long = beat.f is not None and T * beat.f > LONG_RECORD
        self.origin = t[0] + 0.5 * (T if self._long else t[-1] - t[0])
        width = max(1, len(t) // LONG_POINTS) * dt
        self._prior = {"slowest": SLOWEST_WITHOUT_BEAT * T, "walk_weight": WALK_WITHOUT_BEAT}
        if beat.f is not None:
            self._prior = {"slowest": max(1.0 / beat.f, SLOWEST_SHARE * T)}
            width = width if self._long else point_width(f=beat.f, dt=dt)
        points = Points(t=t, dt=dt, origin=self.origin, ys=ys, beat=beat, width=width, more=more)
        self._points, self._fit = points, points.line if self._long else points.joint

    def along(self, e) -> LineFit:
        """All that is known along e."""
        e = np.asarray(e, float)
        fit = self._fit(e, more=True, **self._prior)
        return replace(fit, swing=self._long_swing(e)) if self._long else fit

    def speed(self, e) -> Mixture:
        """The speed along e, m/s."""
        return self._fit(np.asarray(e, float), **self._prior).speed

    def swing(self, e) -> Swing:
        """The beat along e."""
        e = np.asarray(e, float)
        return self._long_swing(e) if self._long else self._fit(e, **self._prior).swing

    def plain_beat(self, e):
        """Coefficients c1 s1 c2 s2 ... of the beat along e by plain least squares on all frames."""
        return self._points.plain(np.asarray(e, float))

    def at(self, *, t, line):
        """The position of a LineFit at t (s), m."""
        beat = line.swing.coefficients
        rows = Rows(t=t, dt=self._dt, origin=self.origin, unit=1.0, f=self._beat.f, harmonics=len(beat) // 2)
        return rows.combined(np.array([[line.level, line.speed.mean, *beat]]))[0]

    def _long_swing(self, e):
        """The beat by least squares, the uncertainties of its middle 40 cycles narrowed to all."""
        t, f = self._t, self._beat.f
        near = slice(*np.searchsorted(t, self.origin + np.array([-0.5, 0.5]) * PIECE / f))
        coefficients, change, made = self._points.beat(e, near)
        middle = _few_cycles(t=t[near], dt=self._dt, y=e @ self._ys[:, near] - made, beat=self._beat)
        piece = middle.joint(ONE, slowest=1.0 / f).swing
        share = PIECE / (self._T * f)  # of the frames: its root scales u of a size, its 3/2 power that of f
        size = track_beat.waveform(coefficients=coefficients).peak_to_peak
        known = change is not None and piece.f is not None
        return Swing(
            coefficients, _narrowed(piece.f, f + change, share**1.5) if known else None,
            _narrowed(piece.peak_to_peak, size, share**0.5),
        )  # fmt: skip


def beat_score(*, t, dt, y, f):
    """How many standard uncertainties the first harmonic of f (Hz) stands out of the noise of y (m) at t (s).

    Three harmonics are fitted; of a long record the middle 40 cycles are looked at.
    """
    if (t[-1] - t[0]) * f > LONG_RECORD:
        near = slice(*np.searchsorted(t, 0.5 * (t[0] + t[-1]) + np.array([-0.5, 0.5]) * PIECE / f))
        t, y = t[near], y[near]
    points = _few_cycles(t=t, dt=dt, y=y, beat=Beat(f, False, harmonics=3))
    first = points.first_harmonic(slowest=max(1.0 / f, SLOWEST_SHARE * (t[-1] - t[0])))
    return first.mean / first.u if first.u > 0.0 else 0.0


def plain_rows(*, t, dt, beat) -> Rows:
    """Line and as many harmonics as the frames carry, ten at most, to see outliers and directions by."""
    most = min(SEARCH_HARMONICS if len(t) < MANY_FRAMES else HARMONICS, len(t) // 12)
    count = 0 if beat.f is None else track_beat.harmonics_that_fit(f=beat.f, dt=dt, wanted=most)
    middle = t[len(t) // 2]
    return Rows(t=t, dt=dt, origin=middle, unit=t[-1] - middle, f=beat.f, harmonics=count)


def without_beat(*, t, dt, ys, f):
    """ys (k, n) less their beat of f (Hz), found by plain least squares with the line."""
    count = track_beat.harmonics_that_fit(f=f, dt=dt, wanted=HARMONICS)
    rows = Rows(t=t, dt=dt, origin=t[0], unit=t[-1] - t[0], f=f, harmonics=count)
    beta = least_squares(rows=rows, ys=ys)
    beta[:2] = 0.0
    return ys - rows.combined(beta.T)


def point_width(*, f, dt):
    """Time in s of whole frames (dt) of which 14 or more make a beat of f (Hz)."""
    return max(1, int(1.0 / (f * dt * POINTS_PER_BEAT) + 1e-6)) * dt


def _few_cycles(*, t, dt, y, beat):
    return Points(
        t=t, dt=dt, origin=0.5 * (t[0] + t[-1]), ys=y[None], beat=beat, width=point_width(f=beat.f, dt=dt)
    )


def _narrowed(mixture, centre, factor):
    narrow = mixture.times(factor)
    return Mixture(narrow.weight, narrow.centre + (centre - narrow.mean), narrow.scale, narrow.dof)
