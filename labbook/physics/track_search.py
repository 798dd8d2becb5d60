"""The beat and the outlying frames of a track, found together: each is seen only with the other known."""

from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal
from labbook.physics import track_beat, track_fit
from labbook.physics.track_cleaning import outlying
from labbook.physics.track_points import Beat
from labbook.physics.track_rows import averages, least_squares

SURE = 6.0  # standard uncertainties by which a beat must stand out: chance does that once in 1e6
PASSES = 4
ROUNDING = 1e-6  # of a signal's extent: what is smaller is no outlier, whatever the noise
FEWEST_OF_PHASE, MOST_FOLDED = 5, 200_000  # frames
LOOKED_AT = 32_768  # frames or averages that are enough to see a beat in
CLEAR = 12.0  # times the power around, that a beat which is 6 standard uncertainties in 40 cycles has there
SLOW = 20.0  # cycles in so many frames, that the middle of a record may be too short for
SHORT_BY = 0.02  # cycles: a fitted f may make three cycles look like 2.98


@dataclass(frozen=True, eq=False)
class Found:
    """beat; kept: mask of frames that do not stand out; signal: index of that which f was fitted to, or
    None."""

    beat: Beat
    kept: np.ndarray
    signal: int | None


def beat_and_outliers(*, t, dt, signals, f) -> Found:
    """The beat of signals (m, the body's x and y first) and the frames that stand out of x, y.

    t: s; dt: frame interval; signals: (k, n); f: Hz, or None to be fitted. Refuses an f too fast for the
    frame rate, fewer than three cycles, and an f that is no positive number.
    """
    seen = _search(t, dt, signals) if f is None else (Beat(_stated(f, dt), False), None)

    def refit(kept, seen):
        return seen if f is not None else _again(t, dt, signals, kept, *seen)

    kept, (beat, signal) = _passes(t, dt, signals[:2], seen, refit)
    if beat.f is not None:
        cycles = (t[-1] - t[0] + dt) * beat.f
        if cycles < track_beat.FEWEST_CYCLES - SHORT_BY:
            raise Refusal("t", f"{cycles:.3g} cycles", "at least three cycles are needed", "film for longer")
    return Found(beat, kept, signal)


def _stated(f, dt):
    try:
        value = float(f)
    except (TypeError, ValueError):
        value = np.nan
    if not (np.isfinite(value) and value > 0.0):
        raise Refusal("f", f, "a positive frequency in Hz is needed")
    if not track_beat.harmonics_that_fit(f=value, dt=dt, wanted=1):
        raise Refusal("f", f"{value:.4g} Hz", f"{1.0 / dt:.4g} frames a second are too few for this beat",
                      f"a beat up to {track_beat.NYQUIST_SHARE / dt:.3g} Hz can be seen")  # fmt: skip
    return value


def outliers(*, t, dt, ys, beat):
    """Mask of frames that stand out of line plus beat in any of ys (k, n), m, at t (s)."""
    kept, _ = _passes(t, dt, ys, (beat, None), lambda kept, seen: seen)
    return ~kept


def _passes(t, dt, ys, seen, refit):
    """(mask of frames that do not stand out, (Beat, signal) fitted to these), until neither changes."""
    kept = np.ones(len(t), bool)
    model = _Smooth(t, dt, seen[0], ys, kept)
    for _ in range(PASSES):
        out, room = model.outlying()
        if np.array_equal(out, ~kept):
            break
        before, kept = model, ~out
        model = _Smooth(t, dt, seen[0], ys, kept)
        if model.moved_from(before) < room:
            break  # another look would find the same frames, and the same beat but for a hundredth of its u
        again = refit(kept, seen)
        if again is not seen:
            seen, model = again, _Smooth(t, dt, again[0], ys, kept)
    return kept, seen


class _Smooth:
    """Line and beat by least squares on the frames of a mask, and the frames that stand out of them."""

    def __init__(self, t, dt, beat, ys, kept):
        self._rows, self._dt, self._ys = track_fit.plain_rows(t=t, dt=dt, beat=beat), dt, ys
        self._beta = least_squares(rows=self._rows, ys=ys, kept=kept)
        self._folded = beat.f is not None and len(t) <= MOST_FOLDED

    def outlying(self):
        """As track_cleaning.outlying; no room where frames of one phase are compared: f says which."""
        off = self._ys - self._rows.combined(self._beta.T)
        if self._folded:
            off -= _same_phase(self._rows.t, self._dt, off, self._rows.f)
        out, room = outlying(residuals=off, least=ROUNDING * np.ptp(self._ys, axis=1))
        return out, 0.0 if self._folded else room

    def moved_from(self, other):
        """The most that any frame's place can have moved by, where the beat's f is the same."""
        reach = np.abs(self._rows.t[[0, -1]] - self._rows.origin).max()
        return max(1.0, reach / self._rows.unit) * np.abs(self._beta - other._beta).sum(axis=0).max()


def _same_phase(t, dt, off, f):
    """Median of each row over the frames of one phase, where five or more share it: a jerk of every beat.

    Nothing is taken off where the frames of a phase are fewer, since a median of few follows each of them.
    """
    bins = max(1, int(1.0 / (f * dt)))
    phase = np.floor(np.mod((t - t[0]) * f + 1e-6, 1.0) * bins).astype(np.int64)
    counts = np.bincount(phase, minlength=bins)
    starts, last, jerk = np.cumsum(counts) - counts, len(t) - 1, np.empty_like(off)
    low, high = (np.minimum(starts + (counts - k) // 2, last) for k in (1, 0))
    for row, values in zip(jerk, off, strict=True):
        ranked = values[np.lexsort((values, phase))]
        row[:] = np.where(counts >= FEWEST_OF_PHASE, 0.5 * (ranked[low] + ranked[high]), 0.0)[phase]
    return jerk


@dataclass(frozen=True, eq=False)
class _Look:
    """Frames that a beat is looked for in; least, highest: as track_beat.candidates."""

    t: np.ndarray
    dt: float
    signals: np.ndarray
    least: float
    highest: float

    def candidates(self):
        return track_beat.candidates(
            t=self.t, dt=self.dt, signals=self.signals, least=self.least, highest=self.highest
        )

    def sure(self, which, f):
        """(standard uncertainties that the beat stands out by, f refined)."""
        f = _refined(self.t, self.dt, self.signals[which], f)
        return track_fit.beat_score(t=self.t, dt=self.dt, y=self.signals[which], f=f), f

    def explained(self, f, seen):
        """Whether f is a harmonic of one of the beats already seen, within half a cycle over these frames."""
        harmonics = np.multiply.outer(seen, np.arange(1, track_fit.SEARCH_HARMONICS + 1))
        return bool(np.any(np.abs(harmonics - f) * (self.t[-1] - self.t[0]) < 0.5))


def _looks(t, dt, signals):
    """The record; of a very long one its middle, and averages over all of it for beats too slow for that."""
    n = len(t)
    if n <= 2 * LOOKED_AT:
        return [_Look(t, dt, signals, track_beat.CANDIDATE, np.inf)]
    middle = slice((n - LOOKED_AT) // 2, (n + LOOKED_AT) // 2)
    width = -(-n // LOOKED_AT) * dt
    at, means, _ = averages(t=t, rows=signals, width=width)
    return [
        _Look(t[middle], dt, signals[:, middle], CLEAR, np.inf),
        _Look(at, width, means, CLEAR, SLOW / (LOOKED_AT * dt)),
    ]  # fmt: skip


def _search(t, dt, signals):
    """(the surest beat, index of the signal it was seen in), or (none, None)."""
    best, seen = (0.0, None, None, None), []
    for look in _looks(t, dt, signals):
        for start, which in look.candidates():
            if look.t is not t and look.explained(start, seen):
                continue
            score, f = look.sure(which, start)
            best = max(best, (score, f, which, look), key=lambda one: one[0])
            seen += [f] if score > SURE else []
    score, f, which, look = best
    if score < SURE:
        return Beat(None, False), None
    for part in (3, 2):  # the strongest peak may be a harmonic
        if (t[-1] - t[0]) * f / part > track_beat.SEARCHED_FROM:
            score, slower = look.sure(which, f / part)
            if score > SURE:
                f = slower
                break
    if look.t is not t:
        f = _refined(t, dt, signals[which], f, reach=0.5 / (look.t[-1] - look.t[0]))
    return Beat(f, True), which


def _again(t, dt, signals, kept, beat, signal):
    """The same beat fitted without the outliers, or a search if they had hidden it."""
    t = t[kept]
    if signal is None:
        return _search(t, dt, signals[:, kept])
    return Beat(_refined(t, dt, signals[signal, kept], beat.f), True), signal


def _refined(t, dt, signal, f, reach=0.0):
    """f refined on averages of 14 or more a beat, which a fast camera's frames are too many for."""
    harmonics = track_beat.harmonics_that_fit(f=f, dt=dt, wanted=3)
    width = track_fit.point_width(f=f, dt=dt)
    at, means, _ = averages(t=t, rows=signal[None], width=width)
    return track_beat.refine(t=at, dt=width, y=means[0], f=f, harmonics=max(1, harmonics), reach=reach)
