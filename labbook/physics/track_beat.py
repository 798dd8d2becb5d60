"""The beat in a track: its frequency where it is not given, its harmonics as columns and as a waveform."""

from dataclasses import dataclass
from math import pi

import numpy as np
from scipy.fft import fft, fftfreq, next_fast_len, rfft
from scipy.ndimage import median_filter
from scipy.optimize import minimize_scalar

from labbook.physics.track_rows import Rows, bin_starts, phasors, residuals

FEWEST_CYCLES = 3.0
NYQUIST_SHARE = 0.45  # of the frame rate: a harmonic above it is not fitted
CANDIDATE = 3.0  # times the power around: a peak below it is not looked at
SEARCHED_FROM = 2.0  # cycles in the record
MANY_CYCLES = 200.0
PHASES = np.linspace(0.0, 2.0 * pi, 240, endpoint=False)


def harmonics_that_fit(*, f, dt, wanted):
    """How many harmonics of f (Hz) lie below 0.45 of the frame rate 1/dt, at most `wanted`; may be 0."""
    return int(min(wanted, np.floor(NYQUIST_SHARE / (f * dt) + 1e-9)))


def columns(*, t, f, harmonics):
    """cos and sin of 2 pi k f t for k = 1..harmonics: shape (n, 2 harmonics), order c1 s1 c2 s2 ..."""
    turn = np.exp(2j * pi * f * t)
    out, power = np.empty((len(t), 2 * harmonics), order="F"), np.ones_like(turn)
    for k in range(harmonics):
        power *= turn
        out[:, 2 * k], out[:, 2 * k + 1] = power.real, power.imag
    return out


def slope_in_f(*, coefficients):
    """Over t times the harmonics, what makes d/df of the beat: it lets a linear fit know u(f)."""
    turned = np.empty(len(coefficients))
    turned[0::2], turned[1::2] = coefficients[1::2], -coefficients[0::2]
    return 2.0 * pi * np.repeat(np.arange(1, len(coefficients) // 2 + 1), 2) * turned


@dataclass(frozen=True, eq=False)
class Waveform:
    """One beat's extremes: peak_to_peak, and the direction with peak_to_peak = direction . coefficients."""

    peak_to_peak: float
    direction: np.ndarray


def waveform(*, coefficients) -> Waveform:
    """Peak to peak of the beat with coefficients c1 s1 c2 s2 ..., on 240 phases (to 1e-4 of a single
    harmonic)."""
    rows = columns(t=PHASES, f=1.0 / (2.0 * pi), harmonics=len(coefficients) // 2)
    shape = rows @ coefficients
    direction = rows[np.argmax(shape)] - rows[np.argmin(shape)]
    return Waveform(float(direction @ coefficients), direction)


def widest(*, x, y):
    """Greatest distance between two points of the closed path with coefficients x and y (each c1 s1 ...),
    m."""
    rows = columns(t=PHASES[::4], f=1.0 / (2.0 * pi), harmonics=len(x) // 2)
    path = rows @ x + 1j * (rows @ y)
    return float(np.abs(path[:, None] - path[None, :]).max())


def candidates(*, t, dt, signals, least=CANDIDATE, highest=np.inf, most=3):
    """[(f, which)] of the peaks that stand out of the signals' periodograms, the most outstanding first.

    t: s, nearly even, step dt; signals: list of arrays. Each signal, less its straight line, is put on an
    even grid and tapered; its periodogram is compared with the median of its own neighbourhood, half an
    octave to either side, so that a slow wobble is hardly a beat. f is good to a tenth of a cycle over the
    record, a start for `refine`; whether it is a beat at all is for track_fit to say, which knows the
    noise. least: times the power around that a peak must have; highest: Hz.
    """
    grid = np.arange(t[0], t[-1] + 0.5 * dt, dt)
    n = len(grid)
    pad = next_fast_len(4 * n, real=True)
    low, high = int(np.ceil(SEARCHED_FROM * pad / n)), int(min(NYQUIST_SHARE, highest * dt) * pad)
    found = []
    for which, signal in enumerate(signals):
        power = _periodogram(np.interp(grid, t, median_filter(signal, size=3, mode="nearest")), pad)
        score = _against_neighbours(power, pad / n)
        tops = low + np.flatnonzero(
            (power[low:high] >= power[low - 1 : high - 1]) & (power[low:high] > power[low + 1 : high + 1])
        )
        tops = tops[score[tops] > least]
        best = tops[np.argsort(power[tops])[::-1][:most]]
        found += [(score[k], k / (pad * dt), which) for k in best]
    return [(f, which) for _, f, which in sorted(found, reverse=True)[:most]]


def refine(*, t, dt, y, f, harmonics=3, reach=0.0):
    """f (Hz) by least squares of line plus harmonics, within 0.7 cycles over the record of the start f.

    t: s, steps of about dt; y: m, n points; the sum of squares is minimised over f alone, the linear part
    being solved for. In a record of over 200 cycles it is the power at f of sums over two cycles each, which
    the line no longer reaches; there the start may be off by `reach` (Hz).
    """
    T = t[-1] - t[0]
    line = Rows(t=t, dt=dt, origin=t[0] + 0.5 * T, unit=T)
    y = residuals(rows=line, ys=y[None])[0]
    if T * f > MANY_CYCLES:
        starts = bin_starts(t=t, width=2.0 / f)
        beat = Rows(t=t, dt=dt, origin=line.origin, unit=T, f=f, harmonics=1)
        sums = phasors(rows=beat, y=y, starts=starts)
        middle = np.add.reduceat(t, starts) / np.diff(np.append(starts, len(t))) - line.origin
        start, f0 = _strongest(sums, np.floor((t[starts] - t[0]) * 0.5 * f + 1e-6), f, reach), f

        def squares(trial):
            return -np.abs(sums @ np.exp(-2j * pi * (trial - f0) * middle))
    else:
        X, start = line.of(slice(None)).T, f
        t = t - line.origin

        def squares(trial):
            Z = np.hstack([X, columns(t=t, f=trial, harmonics=harmonics)])
            gram, b = Z.T @ Z, Z.T @ y
            return -b @ np.linalg.solve(gram, b)

    start = min(start + np.array([-0.35, 0.0, 0.35]) / T, key=squares)
    found = minimize_scalar(squares, bounds=(start - 0.35 / T, start + 0.35 / T), method="bounded",
                            options={"xatol": 1e-7 / T})  # fmt: skip
    return float(found.x)


def _strongest(sums, bins, f, reach):
    """The frequency (Hz) within reach of f at which sums over two cycles of f, numbered `bins`, agree."""
    row = np.zeros(int(bins[-1]) + 1, complex)
    row[bins.astype(np.intp)] = sums
    pad = next_fast_len(4 * len(row))
    offset = fftfreq(pad, 2.0 / f)
    power = np.where(np.abs(offset) <= reach, np.abs(fft(row, pad)), 0.0)
    return f + offset[np.argmax(power)]


def _periodogram(signal, pad):
    n = len(signal)
    ramp = np.linspace(-1.0, 1.0, n)
    signal = signal - signal.mean()
    signal = signal - ramp * (ramp @ signal) / (ramp @ ramp)
    return np.abs(rfft(signal * np.hanning(n), pad)) ** 2


def _against_neighbours(power, oversampling):
    """power over that of noise in its neighbourhood: exponential with mean 1 where there is noise alone."""
    index = np.arange(len(power))
    natural = power[:: max(1, int(oversampling))]
    marks = np.unique(np.rint(np.geomspace(1, len(natural) - 1, 60)).astype(int))
    level = np.empty(len(marks))
    for at, k in enumerate(marks):
        low, high = max(1, min(int(k / 1.5), k - 3)), max(int(1.5 * k), k + 3)
        level[at] = np.median(natural[low : high + 1]) / np.log(2.0)
    level = np.maximum(level, 1e-30 * power.max() + 1e-300)
    where = np.log(np.maximum(index, 1) / max(1, int(oversampling)) + 1e-9)
    return power / np.exp(np.interp(where, np.log(marks), np.log(level)))
