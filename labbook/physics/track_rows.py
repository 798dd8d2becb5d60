"""A track's model at its frames as rows, made a block at a time so that a long record stays in the cache."""

import numpy as np

BLOCK = 8192  # frames, of which a few dozen rows stay in the cache
LONG = 4 * BLOCK  # frames from which shortcuts pay
SAME_PHASE = 1e-9  # cycles: frames as near to whole steps share one table of phases
THIN, AROUND = 4096, 0.04  # so many values of a long row bracket its median by so large a share


class Rows:
    """Rows 1, (t - origin)/unit, c1, s1, c2, s2, ..., then, if sloped, the second times each of the
    harmonics, then `more`.

    t: s, rising, steps of about dt; origin, unit: s; f: Hz, None without harmonics; more: callables t -> row.
    """

    def __init__(self, *, t, dt, origin, unit, f=None, harmonics=0, sloped=False, more=()):
        self.t, self.origin, self.unit, self.f = t, origin, unit, f
        self.harmonics, self.sloped, self.more = harmonics, sloped, more
        self.own = 2 + 2 * harmonics * (1 + sloped)
        self._table = None
        if harmonics and len(t) > LONG:
            self._step = (t[-1] - t[0]) / np.rint((t[-1] - t[0]) / dt)
            self._table = np.exp(2j * np.pi * f * self._step * np.arange(2 * BLOCK))

    def of(self, part):
        """The rows at a slice or mask of the frames, shape (rows, frames)."""
        t = self.t[part]
        out = np.empty((self.own + len(self.more), len(t)))
        out[0] = 1.0
        np.divide(t - self.origin, self.unit, out=out[1])
        turn = power = self.turn(part) if self.harmonics else None
        for k in range(1, self.harmonics + 1):
            out[2 * k], out[2 * k + 1] = power.real, power.imag
            if k < self.harmonics:
                power = power * turn
        if self.sloped:
            end = 2 + 2 * self.harmonics
            np.multiply(out[1], out[2:end], out=out[end : self.own])
        for k, row in enumerate(self.more, self.own):
            out[k] = row(t)
        return out

    def turn(self, part):
        """exp(2 pi i f (t - origin)) at a slice or mask of the frames; a table's where steps are whole."""
        t = self.t[part]
        if self._table is not None:
            step = np.rint((t - t[0]) / self._step)
            beside = np.abs(t - t[0] - step * self._step).max()
            if beside * self.f < SAME_PHASE and step[-1] < len(self._table):
                first = np.exp(2j * np.pi * self.f * (t[0] - self.origin))
                return first * self._table[step.astype(np.intp)]
        return np.exp(2j * np.pi * self.f * (t - self.origin))

    def combined(self, coefficients):
        """coefficients (k, rows) times the rows, at all frames: shape (k, n)."""
        out = np.empty((len(coefficients), len(self.t)))
        for part in _blocks(len(self.t)):
            out[:, part] = coefficients @ self.of(part)
        return out


def least_squares(*, rows, ys, kept=None):
    """Coefficients (rows, k) of ys (k, n) by plain least squares on the frames of mask `kept`, or on all."""
    gram = right = 0.0
    for part in _blocks(len(rows.t)):
        X, Y = rows.of(part), ys[:, part]
        if kept is not None and not kept[part].all():
            X, Y = X[:, kept[part]], Y[:, kept[part]]
        gram, right = gram + X @ X.T, right + X @ Y.T
    return np.linalg.solve(gram, right)


def residuals(*, rows, ys):
    """ys (k, n) less their `least_squares` on all frames."""
    return ys - rows.combined(least_squares(rows=rows, ys=ys).T)


def squares_and_means(*, rows, ys, starts):
    """(X X', X Y', means) of the own rows X and of ys (k, n).

    The first two are sums over all frames; the means of X, `more` and ys, shape (rows + k, bins), are over
    the bins that begin at the frames `starts`.
    """
    gram, right, sums = 0.0, 0.0, []
    for part, bins in _whole_bins(starts, len(rows.t)):
        X, Y = rows.of(part), ys[:, part]
        own = X[: rows.own]
        gram, right = gram + own @ own.T, right + own @ Y.T
        sums.append(np.concatenate([np.add.reduceat(one, bins, axis=1) for one in (X, Y)]))
    return gram, right, np.concatenate(sums, axis=1) / np.diff(np.append(starts, len(rows.t)))


def phasors(*, rows, y, starts):
    """Sums of y exp(-2 pi i f (t - origin)) over the bins that begin at the frames `starts`."""
    parts = _whole_bins(starts, len(rows.t))
    return np.concatenate([np.add.reduceat(y[part] * rows.turn(part).conj(), bins) for part, bins in parts])


def bin_starts(*, t, width):
    """First frame of each bin of `width` (s) that holds frames, counted from the first frame."""
    bins = np.floor((t - t[0]) / width + 1e-6)
    return np.flatnonzero(np.concatenate([[True], bins[1:] > bins[:-1]]))


def averages(*, t, rows, width):
    """Means over bins of `width` (s): (t, rows (k, m), counts); bins without frames are left out.

    rows: (k, n). Averaging the model's rows as the data keeps a fit exact.
    """
    starts = bin_starts(t=t, width=width)
    counts = np.diff(np.append(starts, len(t))).astype(float)
    if len(starts) == len(t):
        return t, rows, counts
    return np.add.reduceat(t, starts) / counts, np.add.reduceat(rows, starts, axis=1) / counts, counts


def median(values):
    """np.median; of a long row by way of a few thousand values that bracket it, exact and faster."""
    if len(values) < LONG:
        return float(np.median(values))
    thin = np.sort(values[:: len(values) // THIN])
    low, high = (thin[int(share * len(thin))] for share in (0.5 - AROUND, 0.5 + AROUND))
    near = values[(values >= low) & (values <= high)]
    at = len(values) // 2 - np.count_nonzero(values < low)
    even = len(values) % 2 == 0
    if not even <= at < len(near):
        return float(np.median(values))
    near.partition((at - even, at))
    return float(0.5 * (near[at - even] + near[at]))


def _blocks(n):
    return [slice(at, at + BLOCK) for at in range(0, n, BLOCK)]


def _whole_bins(starts, n):
    """[(slice of about a block, first frames of its bins)]."""
    some = max(1, BLOCK * len(starts) // n)
    groups = [starts[at : at + some] for at in range(0, len(starts), some)]
    ends = [*(group[0] for group in groups[1:]), n]
    return [(slice(group[0], end), group - group[0]) for group, end in zip(groups, ends, strict=True)]
