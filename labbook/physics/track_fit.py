"""Joint fit of uniform motion and beat along one direction of a track, and the points it is made on."""

from dataclasses import dataclass

import numpy as np

from labbook.physics import track_beat
from labbook.physics.track_mixture import Mixture
from labbook.physics.track_noise import WALK_WEIGHT, NoiseFit

POINTS_PER_BEAT = 14  # at least, where the frames allow it
LONG_RECORD = 60.0  # cycles: beyond, the beat is taken off first and the line is fitted to averages
LONG_POINTS = 1000  # of such a record, and of one without beat
PIECE = 40.0  # cycles of a long record that its beat's uncertainties come from
HARMONICS = 4
SHORTEST_TAU = 0.5  # points
SLOWEST_SHARE = 1.0 / 30.0  # of the record, or one beat if that is longer
SLOWEST_WITHOUT_BEAT = 0.1  # of the record
WALK_WITHOUT_BEAT = 10.0  # what drifts about without a beat most likely diffuses
SEARCH_HARMONICS = 10
MANY_FRAMES = 200_000  # from here on four do


@dataclass(frozen=True, eq=False)
class Beat:
    """f: Hz, or None for a track without beat; fitted: whether f was found in the track itself."""

    f: float | None
    fitted: bool
    harmonics: int = HARMONICS


@dataclass(frozen=True, eq=False)
class LineFit:
    """What is known of the motion along one direction.

    speed: m/s; f: Hz, None unless fitted; beat: coefficients c1 s1 c2 s2 ... of the harmonics about
    `middle` (s), empty without beat; peak_to_peak: of the beat, m, None without; extra: one Mixture for
    each further column.
    """

    speed: Mixture
    level: float
    middle: float
    beat: np.ndarray
    f: Mixture | None
    peak_to_peak: Mixture | None
    extra: tuple[Mixture, ...]

    def at(self, *, t, f):
        """The fitted position at t (s), f in Hz."""
        t = t - self.middle
        line = self.level + self.speed.mean * t
        if not len(self.beat):
            return line
        return line + track_beat.columns(t=t, f=f, harmonics=len(self.beat) // 2) @ self.beat


def averages(*, t, columns, width):
    """Means over bins of `width` frames' time: (t, columns (m, k), counts); bins without frames are left out.

    width: s; columns: (n, k). Averaging the model's columns as the data keeps the fit exact.
    """
    bins = np.floor((t - t[0]) / width + 1e-6).astype(np.int64)
    starts = np.flatnonzero(np.concatenate([[True], np.diff(bins) > 0]))
    counts = np.diff(np.append(starts, len(t))).astype(float)
    if len(starts) == len(t):
        return t, columns, counts
    means = np.add.reduceat(columns, starts, axis=0) / counts[:, None]
    return np.add.reduceat(t, starts) / counts, means, counts


def plain_columns(*, t, dt, beat):
    """Line and as many harmonics as the frames carry, ten at most: columns for `plain_residual`."""
    t = t - t[len(t) // 2]
    most = min(SEARCH_HARMONICS if len(t) < MANY_FRAMES else HARMONICS, len(t) // 12)
    count = 0 if beat.f is None else track_beat.harmonics_that_fit(f=beat.f, dt=dt, wanted=most)
    X = np.empty((len(t), 2 + 2 * count), order="F")
    X[:, 0], X[:, 1] = 1.0, t / t[-1]
    if count:
        X[:, 2:] = track_beat.columns(t=t, f=beat.f, harmonics=count)
    return X


def plain_residual(*, X, ys, kept=None):
    """Residuals, shape (n, k), of columns ys from X by plain least squares on the frames of mask `kept`, or
    all.

    Used to see outliers and directions, not for uncertainties.
    """
    ys = np.column_stack(ys)
    gram, right = X.T @ X, X.T @ ys
    if kept is not None and not kept.all():
        gram, right = gram - X[~kept].T @ X[~kept], X[kept].T @ ys[kept]
    return ys - X @ np.linalg.solve(gram, right)


def plain_beat(*, t, dt, y, beat, middle):
    """Coefficients c1 s1 c2 s2 ... of the beat of y about `middle` (s), by plain least squares on all
    frames."""
    X, _ = _design(t=t - middle, beat=Beat(beat.f, False, beat.harmonics), y=y, dt=dt)
    return np.linalg.solve(X.T @ X, X.T @ y)[2:]


def beat_at(*, t, dt, y, beat, middle):
    """The beat of `plain_beat` at each t (s), m."""
    coefficients = plain_beat(t=t, dt=dt, y=y, beat=beat, middle=middle)
    return track_beat.columns(t=t - middle, f=beat.f, harmonics=len(coefficients) // 2) @ coefficients


def fit(*, t, dt, y, beat, more=()) -> LineFit:
    """Speed, level and beat along one direction: y (m) at t (s, rising), frame interval dt.

    more: callables t -> column, each added alone to the model for `extra`. A record of up to 60 cycles is
    fitted jointly on averages of 14 or more a beat; from a longer one, where a fractional cycle weighs
    nothing, the beat is taken off by least squares on all frames and the line fitted to 1,000 averages.
    """
    t0, T = t[0], t[-1] - t[0] + dt
    if beat.f is None:
        return _joint(t=t, dt=dt, y=y, beat=beat, more=more, width=max(1, len(t) // LONG_POINTS) * dt,
                      slowest=SLOWEST_WITHOUT_BEAT * T, walk_weight=WALK_WITHOUT_BEAT)  # fmt: skip
    slowest = max(1.0 / beat.f, SLOWEST_SHARE * T)
    if T * beat.f <= LONG_RECORD:
        width = point_width(f=beat.f, dt=dt)
        return _joint(t=t, dt=dt, y=y, beat=beat, more=more, width=width, slowest=slowest)
    middle = t0 + 0.5 * T
    X, sloped = _design(t=t - middle, beat=beat, y=y, dt=dt)
    beta = np.linalg.solve(X.T @ X, X.T @ y)
    still = Beat(None, False)
    clean = y - X[:, 2:] @ beta[2:]
    line = _joint(
        t=t, dt=dt, y=clean, beat=still, more=more, width=max(1, len(t) // LONG_POINTS) * dt, slowest=slowest
    )
    count = 2 * track_beat.harmonics_that_fit(f=beat.f, dt=dt, wanted=beat.harmonics)
    coefficients = beta[2 : 2 + count]
    half = 0.5 * PIECE / beat.f
    near = slice(*np.searchsorted(t, [middle - half, middle + half]))
    width = point_width(f=beat.f, dt=dt)
    again = clean[near] + X[near, 2 : 2 + count] @ coefficients
    piece = _joint(t=t[near], dt=dt, y=again, beat=beat, more=(), width=width, slowest=1.0 / beat.f)
    share = PIECE / (T * beat.f)  # of the frames: its root scales u of an amplitude, its 3/2 power that of f
    f = _narrowed(piece.f, beat.f + beta[-1], share**1.5) if sloped and piece.f else None
    size = track_beat.waveform(coefficients=coefficients).peak_to_peak
    return LineFit(line.speed, line.level + line.speed.mean * (middle - line.middle), middle, coefficients, f,
                   _narrowed(piece.peak_to_peak, size, share**0.5), line.extra)  # fmt: skip


def beat_score(*, t, dt, y, f):
    """How many standard uncertainties the first harmonic of f (Hz) stands out of the noise of y (m) at t (s).

    Three harmonics are fitted; of a long record the middle 40 cycles are looked at.
    """
    half, middle = 0.5 * PIECE / f, 0.5 * (t[0] + t[-1])
    near = slice(*np.searchsorted(t, [middle - half, middle + half], side="left"))
    t, y = (t[near], y[near]) if (t[-1] - t[0]) * f > LONG_RECORD else (t, y)
    X, _ = _design(t=t - middle, beat=Beat(f, False, harmonics=3), y=y, dt=dt)
    width = point_width(f=f, dt=dt)
    at, means, counts = averages(t=t, columns=np.column_stack([X, y]), width=width)
    noise = NoiseFit(
        t=at, counts=counts, averaged=(round(width / dt), dt), X=means[:, :-1], y=means[:, -1],
        slowest=max(1.0 / f, SLOWEST_SHARE * (t[-1] - t[0])), finest=SHORTEST_TAU * width,
    )  # fmt: skip
    direction = np.zeros(X.shape[1])
    direction[2:4] = noise.coefficients()[2:4]
    first = noise.figure(direction)
    return first.mean / first.u


def point_width(*, f, dt):
    """Time in s of whole frames (dt) of which 14 or more make a beat of f (Hz)."""
    return max(1, int(1.0 / (f * dt * POINTS_PER_BEAT) + 1e-6)) * dt


def _narrowed(mixture, centre, factor):
    narrow = mixture.times(factor)
    return Mixture(narrow.weight, narrow.centre + (centre - narrow.mean), narrow.scale, narrow.dof)


def _design(*, t, beat, y, dt):
    """(columns 1, t, harmonics and, for a fitted f that y has a beat of, the slope in f; whether that is
    there).

    t counts from the middle, s.
    """
    count = 0 if beat.f is None else track_beat.harmonics_that_fit(f=beat.f, dt=dt, wanted=beat.harmonics)
    X = np.empty((len(t), 2 + 2 * count), order="F")
    X[:, 0], X[:, 1] = 1.0, t
    if not count:
        return X, False
    X[:, 2:] = track_beat.columns(t=t, f=beat.f, harmonics=count)
    if not beat.fitted:
        return X, False
    rough = np.linalg.solve(X.T @ X, X.T @ y)
    if np.abs(rough[2:]).max() <= 1e-9 * np.ptp(y):
        return X, False
    return np.column_stack([X, track_beat.slope_in_f(t=t, f=beat.f, coefficients=rough[2:])]), True


def _joint(*, t, dt, y, beat, more, width, slowest, walk_weight=WALK_WEIGHT):
    middle = 0.5 * (t[0] + t[-1])
    X, sloped = _design(t=t - middle, beat=beat, y=y, dt=dt)
    extra = np.column_stack([column(t) for column in more]) if more else np.empty((len(t), 0))
    at, means, counts = averages(t=t, columns=np.column_stack([X, extra, y]), width=width)
    p = X.shape[1]
    noise = NoiseFit(
        t=at, counts=counts, averaged=(round(width / dt), dt), X=means[:, :p], y=means[:, -1],
        more=means[:, p:-1] if more else None, slowest=slowest, finest=SHORTEST_TAU * width,
        walk_weight=walk_weight,
    )  # fmt: skip
    beta, unit = noise.coefficients(), np.eye(p)
    harmonics = slice(2, p - sloped)
    coefficients = beta[harmonics]
    shape = f = None
    if len(coefficients):
        direction = np.zeros(p)
        direction[harmonics] = track_beat.waveform(coefficients=coefficients).direction
        shape = noise.figure(direction)
    if sloped:
        change = noise.figure(unit[-1])
        f = Mixture(change.weight, change.centre + beat.f, change.scale, change.dof)
    return LineFit(noise.figure(unit[1]), float(beta[0]), middle, coefficients, f, shape,
                   tuple(noise.extra(k) for k in range(len(more))))  # fmt: skip
