"""A tracker's rows put in order: sorting, repeated and missing rows, gaps, outlying frames."""

from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal
from labbook.physics.track_rows import BLOCK, median

FEWEST_FRAMES = 24
LONGEST_GAP = 1.0 / 3.0  # of the record
MOST_LOST = 0.5  # of the record's frames
MOST_CONFLICTS = 0.1  # of the rows
LONG_STEP = 1.5  # frame intervals: more is a gap
SIDE = 4  # frames to either side that an outlier is seen against
OUTLYING = 5.0  # standard deviations
FAR_OUTLYING = 9.0  # the same, of the whole residual
NORMAL = 1.4826  # standard deviations in a median absolute one
MOST_OUTLYING = 0.3  # of the frames


@dataclass(frozen=True, eq=False)
class Frames:
    """Rows in order of time, each time once, all numbers finite.

    t: s, rising; columns: name -> array of t's length; dt: median frame interval, s; duplicates: rows left
    out because their time was taken; unreadable: rows left out for a missing time or position; gaps:
    intervals longer than 1.5 dt; lost: frames that these gaps would have held; sorted: whether the rows had
    to be sorted.
    """

    t: np.ndarray
    columns: dict[str, np.ndarray]
    dt: float
    duplicates: int
    unreadable: int
    gaps: int
    lost: int
    sorted: bool

    def where(self, keep):
        """The same with only the frames of a mask; gaps and lost are counted again."""
        t = self.t[keep]
        gaps, lost = gaps_and_lost(t=t, dt=self.dt)
        columns = {name: column[keep] for name, column in self.columns.items()}
        return Frames(t, columns, self.dt, self.duplicates, self.unreadable, gaps, lost, self.sorted)


def clean(*, t, may_miss=(), **columns) -> Frames:
    """Frames from a tracker's columns: t in s and any others of the same length, by name.

    may_miss: names of columns that may be NaN in a row that stays. Other rows with a missing number are
    left out, rows are sorted, and of rows at one time the first stays. Refuses columns of unequal length or
    without numbers, fewer than 24 frames, a clock that was set back within the record, more than half of
    the frames lost, and a gap longer than a third of the record.
    """
    t = _numbers("t", t)
    columns = {name: _numbers(name, column) for name, column in columns.items()}
    for name, column in columns.items():
        if len(column) != len(t):
            raise Refusal(name, f"{len(column)} values", f"t has {len(t)}", "give columns of one length")
    rows = len(t)
    good = np.isfinite(t)
    for name in columns.keys() - set(may_miss):
        good &= np.isfinite(columns[name])
    if good.sum() < FEWEST_FRAMES:
        raise Refusal("t", f"{int(good.sum())} frames", f"at least {FEWEST_FRAMES} with numbers are needed")
    if not good.all():
        t, columns = t[good], {name: column[good] for name, column in columns.items()}
    steps = np.diff(t)
    unsorted, back = bool(np.any(steps < 0.0)), np.mean(steps < 0.0)
    if unsorted:
        order = np.argsort(t, kind="stable")
        t, columns = t[order], {name: column[order] for name, column in columns.items()}
        in_order = np.median(steps[steps > 0.0]) if np.any(steps > 0.0) else 0.0
        steps = np.diff(t)
    repeated = np.concatenate([[False], steps <= 0.0])
    duplicates = int(repeated.sum())
    if duplicates:
        _one_clock(repeated, columns)
        t, columns = t[~repeated], {name: column[~repeated] for name, column in columns.items()}
        steps = np.diff(t)
    if len(t) < FEWEST_FRAMES:
        raise Refusal("t", f"{len(t)} frames", f"at least {FEWEST_FRAMES} different times are needed")
    interleaved = unsorted and np.median(steps) < 0.9 * in_order and back < MOST_CONFLICTS
    if interleaved and np.mean(steps < 0.75 * in_order) > MOST_CONFLICTS:
        raise _restarted()
    dt = median(steps)
    gaps, lost = gaps_and_lost(t=t, dt=dt)
    if steps.max() > LONGEST_GAP * (t[-1] - t[0]) or lost > MOST_LOST * (lost + len(t)):
        raise Refusal(
            "t", f"{lost} of {lost + len(t)} frames lost", "too much of the record is missing",
            "cut the record to a part without long gaps",
        )  # fmt: skip
    return Frames(t, columns, dt, duplicates, rows - int(good.sum()), gaps, lost, unsorted)


def gaps_and_lost(*, t, dt):
    """(gaps, lost) of times t (s, rising): intervals over 1.5 dt, and the frames these would have held."""
    steps = np.diff(t) / dt
    long = steps[steps > LONG_STEP]
    return len(long), int(np.sum(np.rint(long) - 1.0))


def outlying(*, residuals, least):
    """(mask of frames that stand out, room): residuals from a smooth motion, shape (k, n), frames in order.

    A frame stands out if in any row it lies more than 5 standard deviations from the median of the 8
    frames around it, or 9 from the median of all; both deviations are 1.4826 times the median absolute one,
    so that outliers do not set their own limit. The running median lets a slow wobble pass. A Gaussian
    frame stands out once in a million, so a clean track keeps its frames and its noise estimate keeps its
    size. least: one value a row, below which nothing stands out (rounding). room: what every residual may
    change by without any frame coming to stand out, or ceasing to: sizes and their median change by twice
    that at most.
    """
    out, room = np.zeros(residuals.shape[1], bool), np.inf
    for row, floor in zip(residuals, least, strict=True):
        for most, size in ((OUTLYING, np.abs(row - around(row=row))), (FAR_OUTLYING, np.abs(row - median(row)))):
            limit = max(most * _deviation(size), floor)
            out |= size > limit
            apart = np.abs(size - limit).min() if limit < np.inf else 0.0
            room = min(room, apart / (2.0 + 2.0 * NORMAL * most))
    if out.mean() > MOST_OUTLYING:
        raise Refusal("x", f"{out.sum()} of {len(out)} frames", "stand far from a steady beat",
                      "look whether the tracker followed one body")  # fmt: skip
    return out, room


def around(*, row):
    """Median of the four frames before and the four after, without the frame itself.

    Of two sorted fours, a and b, the smaller of each a1 b4, a2 b3, ... are the lower half of all eight: the
    greatest of them and the least of the others are the middle two.
    """
    padded = np.pad(row, SIDE, mode="reflect")
    out = np.empty(len(row))
    for at in range(0, len(row), BLOCK):
        fours = _sorted_fours(padded[at : at + BLOCK + 2 * SIDE])
        pairs = [(a[: -SIDE - 1], b[SIDE + 1 :]) for a, b in zip(fours, fours[::-1], strict=True)]
        low, high = np.minimum(*pairs[0]), np.maximum(*pairs[0])
        for a, b in pairs[1:]:
            np.maximum(low, np.minimum(a, b), out=low)
            np.minimum(high, np.maximum(a, b), out=high)
        np.multiply(0.5, low + high, out=out[at : at + BLOCK])
    return out


def _sorted_fours(values):
    """Of each four neighbours the least, the second, the third and the greatest."""
    low, high = np.minimum(values[:-1], values[1:]), np.maximum(values[:-1], values[1:])
    second, third = np.maximum(low[:-2], low[2:]), np.minimum(high[:-2], high[2:])
    return (
        np.minimum(low[:-2], low[2:]), np.minimum(second, third), np.maximum(second, third),
        np.maximum(high[:-2], high[2:]),
    )  # fmt: skip


def _numbers(name, column):
    try:
        column = np.asarray(column, float)
    except (TypeError, ValueError):
        raise Refusal(name, None, "a column of numbers is needed") from None
    if column.ndim != 1:
        raise Refusal(name, f"shape {column.shape}", "one value a frame is needed")
    return column


def _one_clock(repeated, columns):
    """Refuse repeated times whose positions differ in more than a tenth of the rows: two records in one."""
    at = np.flatnonzero(repeated)
    differ = np.zeros(len(at), bool)
    for column in columns.values():
        differ |= (column[at] != column[at - 1]) & np.isfinite(column[at] + column[at - 1])
    if differ.sum() > MOST_CONFLICTS * len(repeated):
        raise _restarted()


def _restarted():
    return Refusal("t", None, "times run back over themselves with other positions, so no order is right",
                   "give one track with one clock")  # fmt: skip


def _deviation(size):
    """Robust standard deviation from absolute values; pixel-rounded ones, mostly 0, get the trimmed one."""
    middle = median(size)
    if middle > 0.0:
        return NORMAL * middle
    inner = size[size <= np.quantile(size, 0.98)]
    spread = float(np.sqrt(np.mean(inner**2)))
    return spread if spread > 0.0 else np.inf
