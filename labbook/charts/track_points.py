"""A track made small enough to be drawn: which frames stay, in which unit, and where the trimmed part ends."""

import numpy as np

from labbook.physics.tracks import Trace

MOST_FRAMES = 2_000  # of a path
MOST_ALONG = 1_000  # of the position against time
MOST_OUTLYING = 200
_GOLDEN = 0.618033988749895


def spread_out(count: int, most: int) -> np.ndarray:
    """Indices of at most `most` of `count` frames, the first and the last among them.

    One frame from each of equal stretches, at a place that differs from stretch to stretch: taking every k-th
    frame of a beat would show a slower beat that is not there.
    """
    if count <= most:
        return np.arange(count)
    edges = np.linspace(0, count, most + 1)
    inside = np.arange(most) * _GOLDEN % 1.0
    chosen = np.floor(edges[:-1] + inside * np.diff(edges)).astype(int)
    chosen[0], chosen[-1] = 0, count - 1
    return np.unique(chosen)


def turning(values: np.ndarray, most: int) -> np.ndarray:
    """Indices of at most `most` frames that keep every stretch's lowest and highest value, in order."""
    count = len(values)
    if count <= most:
        return np.arange(count)
    edges = np.linspace(0, count, max(most // 2 - 1, 1) + 1).astype(int)
    parts = [(a, values[a:b]) for a, b in zip(edges[:-1], edges[1:], strict=True)]
    chosen = [a + place for a, part in parts for place in (int(np.argmin(part)), int(np.argmax(part)))]
    return np.unique([0, *chosen, count - 1])


def length_unit(span: float) -> tuple[float, str]:
    """(factor from m, unit) that a length of this size reads well in."""
    return next((f, unit) for least, f, unit in ((1.0, 1.0, "m"), (5e-4, 1e3, "mm"), (0.0, 1e6, "µm")) if span >= least)


def rounded(values, step: float) -> list[float]:
    """Values to a power of ten below `step`: finer cannot be seen and costs bytes."""
    places = int(-np.floor(np.log10(step))) if step > 0.0 else 6
    return [float(v) for v in np.round(np.asarray(values, float), places) + 0.0]


def trimmed_end(trace: Trace, trimmed: float, f_beat: float | None) -> float | None:
    """When the leading cycles that were dropped end, s; None where none were."""
    return float(trace.t[0] + trimmed / f_beat) if trimmed and f_beat else None


def outlying(trace: Trace, trimmed: float, f_beat: float | None) -> np.ndarray:
    """Mask of the frames that the fit left out, apart from the trimmed ones."""
    end = trimmed_end(trace, trimmed, f_beat)
    return ~trace.used if end is None else ~trace.used & (trace.t >= end)
