"""A track's model and signals averaged to points, and the fit of line and beat to these."""

from dataclasses import dataclass

import numpy as np

from labbook.physics import track_beat
from labbook.physics.track_mixture import Mixture
from labbook.physics.track_noise import WALK_WEIGHT, NoiseFit
from labbook.physics.track_rows import Rows, bin_starts, squares_and_means

HARMONICS = 4
SHORTEST_TAU = 0.5  # points
NO_BEAT = 1e-9  # of a signal's extent: a smaller beat is rounding


@dataclass(frozen=True, eq=False)
class Beat:
    """f: Hz, or None for a track without beat; fitted: whether f was found in the track itself."""

    f: float | None
    fitted: bool
    harmonics: int = HARMONICS


@dataclass(frozen=True, eq=False)
class Swing:
    """What is known of the beat along one direction.

    coefficients: c1 s1 c2 s2 ... of its harmonics, empty without beat; f: Hz, None unless fitted;
    peak_to_peak: m, None without beat.
    """

    coefficients: np.ndarray
    f: Mixture | None
    peak_to_peak: Mixture | None


@dataclass(frozen=True, eq=False)
class LineFit:
    """What is known of the motion along one direction.

    speed: m/s; level: m, at the origin; extra: one Mixture for each further row.
    """

    speed: Mixture
    level: float
    swing: Swing
    extra: tuple[Mixture, ...]


class Points:
    """Means of 1, t, harmonics and signals over bins of `width` (s), and what is fitted to them.

    t: s, rising, steps of about dt, counted from `origin` (s); ys: (k, n), m; more: callables t -> row, each
    of which is added alone to the model for `extra`. A direction e (k,) stands for the signal e . ys.
    """

    def __init__(self, *, t, dt, origin, ys, beat, width, more=()):
        n = len(t)
        count = 0 if beat.f is None else track_beat.harmonics_that_fit(f=beat.f, dt=dt, wanted=beat.harmonics)
        rows = Rows(t=t, dt=dt, origin=origin, unit=0.5 * (t[-1] - t[0]), f=beat.f, harmonics=count,
                    sloped=beat.fitted and count > 0, more=more)  # fmt: skip
        starts = bin_starts(t=t, width=width)
        self._gram, self._right, means = squares_and_means(rows=rows, ys=ys, starts=starts)
        self._X, self._more, self._Y = np.split(means, [rows.own, rows.own + len(more)])
        self._rows, self._beat, self._harmonics = rows, beat, slice(2, 2 + 2 * count)
        self._t = t if len(starts) == n else origin + rows.unit * self._X[1]
        self._counts = np.diff(np.append(starts, n)).astype(float)
        self._width, self._averaged = width, (round(width / dt), dt)

    def plain(self, e):
        """Coefficients c1 s1 c2 s2 ... of the beat by plain least squares on all frames."""
        p = self._harmonics.stop
        return np.linalg.solve(self._gram[:p, :p], self._right[:p] @ e)[2:]

    def joint(self, e, *, slowest, more=False, walk_weight=WALK_WEIGHT) -> LineFit:
        """Line and beat fitted together; slowest, walk_weight: as NoiseFit; more: whether with `extra`."""
        model, sloped = self._model(e)
        noise = self._noise(model @ self._X, e @ self._Y, slowest, more, walk_weight)
        beta, unit = noise.coefficients(), np.eye(len(model))
        coefficients = beta[self._harmonics]
        shape = f = None
        if len(coefficients):
            direction = np.zeros(len(model))
            direction[self._harmonics] = track_beat.waveform(coefficients=coefficients).direction
            shape = noise.figure(direction)
        if sloped:
            change = noise.figure(unit[-1])
            f = Mixture(change.weight, change.centre + self._beat.f, change.scale, change.dof)
        return self._told(noise, beta[0], Swing(coefficients, f, shape), more)

    def first_harmonic(self, *, slowest) -> Mixture:
        """What is known of the size of the first signal's first harmonic, m2."""
        noise = self._noise(self._X, self._Y[0], slowest, False, WALK_WEIGHT)
        direction = np.zeros(len(self._X))
        direction[2:4] = noise.coefficients()[2:4]
        return noise.figure(direction)

    def line(self, e, *, slowest, more=False) -> LineFit:
        """The line alone, the beat being taken off first."""
        model, _ = self._model(e)
        beta = self._least_squares(e, model)
        clean = e @ self._Y - beta[2:] @ (model[2:] @ self._X)
        noise = self._noise(self._X[:2], clean, slowest, more, WALK_WEIGHT)
        return self._told(noise, noise.coefficients()[0], Swing(np.empty(0), None, None), more)

    def beat(self, e, part):
        """(coefficients c1 s1 ..., change of f, what that makes of the signal at a slice of the frames).

        By plain least squares on all frames. The change in Hz; None where f is not fitted or the signal has
        no beat.
        """
        model, sloped = self._model(e)
        beta = self._least_squares(e, model)
        if not sloped:
            return beta[self._harmonics], None, 0.0
        return beta[self._harmonics], beta[-1], beta[-1] * (model[-1] @ self._rows.of(part)[: self._rows.own])

    def _model(self, e):
        """(combinations of the rows that are fitted, whether the last of them is the slope in f)."""
        p, own = self._harmonics.stop, self._rows.own
        model = np.eye(p, own)
        if not self._rows.sloped:
            return model, False
        rough = self.plain(e)
        if np.abs(rough).max() <= NO_BEAT * np.ptp(e @ self._Y):
            return model, False
        slope = np.zeros(own)
        slope[p:] = self._rows.unit * track_beat.slope_in_f(coefficients=rough)
        return np.vstack([model, slope]), True

    def _least_squares(self, e, model):
        return np.linalg.solve(model @ self._gram @ model.T, model @ self._right @ e)

    def _noise(self, X, y, slowest, more, walk_weight):
        return NoiseFit(
            t=self._t, counts=self._counts, averaged=self._averaged, X=X.T, y=y, slowest=slowest,
            more=self._more.T if more and len(self._more) else None, finest=SHORTEST_TAU * self._width,
            walk_weight=walk_weight,
        )  # fmt: skip

    def _told(self, noise, level, swing, more):
        speed = noise.figure(np.eye(len(noise.coefficients()))[1]).times(1.0 / self._rows.unit)
        extra = tuple(noise.extra(k) for k in range(len(self._more))) if more else ()
        return LineFit(speed, float(level), swing, extra)
