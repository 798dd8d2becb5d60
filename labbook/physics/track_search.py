"""The beat and the outlying frames of a track, found together: each is seen only with the other known."""

from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal
from labbook.physics import track_beat, track_fit
from labbook.physics.track_cleaning import outlying
from labbook.physics.track_fit import Beat

SURE = 6.0  # standard uncertainties by which a beat must stand out: chance does that once in 1e6
PASSES = 4
ROUNDING = 1e-6  # of a signal's extent: what is smaller is no outlier, whatever the noise
FEWEST_OF_PHASE, MOST_FOLDED = 5, 200_000  # frames
SHORT_BY = 0.02  # cycles: a fitted f may make three cycles look like 2.98


@dataclass(frozen=True, eq=False)
class Found:
    """beat; kept: mask of frames that do not stand out; signal: index of that which f was fitted to, or
    None."""

    beat: Beat
    kept: np.ndarray
    signal: int | None


def beat_and_outliers(*, t, dt, signals, f) -> Found:
    """The beat of signals (list of arrays in m, the body's x and y first) and the frames that stand out of
    x, y.

    t: s; dt: frame interval; f: Hz, or None to be fitted. Refuses an f too fast for the frame rate, fewer
    than three cycles, and an f that is no positive number.
    """
    beat, signal = (
        (Beat(_stated(f, dt), False), None) if f is not None else _search(t, dt, signals, np.isfinite(t))
    )
    kept, X = np.ones(len(t), bool), track_fit.plain_columns(t=t, dt=dt, beat=beat)
    for _ in range(PASSES):
        again = ~_outliers(t, dt, signals[:2], beat, X, kept)
        if np.array_equal(again, kept):
            break
        kept = again
        if f is None:
            beat, signal = _again(t, dt, signals, kept, beat, signal)
            X = track_fit.plain_columns(t=t, dt=dt, beat=beat)
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
    """Mask of frames that stand out of line plus beat in any of ys (arrays in m) at t (s)."""
    kept, X = np.ones(len(t), bool), track_fit.plain_columns(t=t, dt=dt, beat=beat)
    for _ in range(PASSES):
        again = ~_outliers(t, dt, ys, beat, X, kept)
        if np.array_equal(again, kept):
            break
        kept = again
    return ~kept


def _outliers(t, dt, ys, beat, X, kept):
    residuals = track_fit.plain_residual(X=X, ys=ys, kept=kept)
    if beat.f is not None and len(t) <= MOST_FOLDED:
        residuals = residuals - _same_phase(t, dt, residuals, beat.f)
    return outlying(residuals=residuals, least=[ROUNDING * np.ptp(y) for y in ys])


def _same_phase(t, dt, residuals, f):
    """Median of each column over the frames of one phase, where five or more share it: a jerk of every beat.

    Nothing is taken off where the frames of a phase are fewer, since a median of few follows each of them.
    """
    bins = max(1, int(1.0 / (f * dt)))
    phase = np.floor(np.mod((t - t[0]) * f + 1e-6, 1.0) * bins).astype(np.int64)
    off, counts = np.zeros_like(residuals), np.bincount(phase, minlength=bins)
    starts = np.cumsum(counts) - counts
    for column in range(residuals.shape[1]):
        ranked = residuals[np.lexsort((residuals[:, column], phase)), column]
        last = len(ranked) - 1
        low, high = (np.minimum(starts + (counts - k) // 2, last) for k in (1, 0))
        middle = np.where(counts >= FEWEST_OF_PHASE, 0.5 * (ranked[low] + ranked[high]), 0.0)
        off[:, column] = middle[phase]
    return off


def _search(t, dt, signals, kept):
    t, signals = t[kept], [signal[kept] for signal in signals]
    best = 0.0, None, None
    for f, which in track_beat.candidates(t=t, dt=dt, signals=signals):
        best = max(best, (*_sure(t, dt, signals[which], f), which), key=lambda one: one[0])
    score, f, which = best
    if score < SURE:
        return Beat(None, False), None
    for part in (3, 2):  # the strongest peak may be a harmonic
        if (t[-1] - t[0]) * f / part > track_beat.SEARCHED_FROM:
            score, slower = _sure(t, dt, signals[which], f / part)
            if score > SURE:
                f = slower
                break
    return Beat(f, True), which


def _again(t, dt, signals, kept, beat, signal):
    """The same beat fitted without the outliers, or a search if they had hidden it."""
    if signal is None:
        return _search(t, dt, signals, kept)
    return Beat(_refined(t[kept], dt, signals[signal][kept], beat.f), True), signal


def _sure(t, dt, signal, f):
    f = _refined(t, dt, signal, f)
    return track_fit.beat_score(t=t, dt=dt, y=signal, f=f), f


def _refined(t, dt, signal, f):
    """f refined on averages of 14 or more a beat, which a fast camera's frames are too many for."""
    harmonics = track_beat.harmonics_that_fit(f=f, dt=dt, wanted=3)
    at, means, _ = track_fit.averages(t=t, columns=signal[:, None], width=track_fit.point_width(f=f, dt=dt))
    return track_beat.refine(t=at, y=means[:, 0], f=f, harmonics=max(1, harmonics))
