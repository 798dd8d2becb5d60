"""Which runs of a frame a chart can draw, why the others cannot be, and how many runs one mark stands for."""

import numpy as np
import pandas as pd

from labbook.charts.palette import MOST_SERIES, OTHER
from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS

MOST_ROWS = 5000  # runs drawn one by one
MOST_MARKS = 1800  # marks left by thinning, so that a million runs weigh little more than a thousand
UNNAMED = "none given"


def split(frame: pd.DataFrame, *, x: str, y: str, log_x: bool, log_y: bool, numbers=NUMBERS):
    """The rows that have a place on the axes, and {reason: runs} for the others.

    A row counts as the runs in its column n (1 without that column). Each run is counted under the first
    reason that holds: void, without x, without y, then zero or negative on a log axis.
    Errors: Refusal where the frame lacks x or y.
    """
    for name, key in (("x", x), ("y", y)):
        if key not in frame.columns:
            raise Refusal(name, key, "the frame has no such column")
    runs = runs_of(frame)
    waiting = np.ones(len(frame), dtype=bool)
    left_out: dict[str, int] = {}

    def leave(which, reason):
        nonlocal waiting
        count = int(runs[waiting & which].sum())
        if count:
            left_out[reason] = left_out.get(reason, 0) + count
        waiting = waiting & ~which

    if "state" in frame.columns:
        leave((frame["state"] == "void").to_numpy(dtype=bool), "void")
    axes = ((x, log_x), (y, log_y))
    values = {key: frame[key].to_numpy(dtype=float) for key, _ in axes}
    for key in dict.fromkeys((x, y)):
        absent = ~np.isfinite(values[key])
        divisor = numbers[key].not_zero if key in numbers else ""
        if divisor and {divisor, f"u_{divisor}"} <= set(frame.columns):
            u = frame[f"u_{divisor}"].to_numpy(dtype=float)
            leave(absent & (np.abs(frame[divisor].to_numpy(dtype=float)) <= 2 * u),
                  f"with {divisor} consistent with 0, so without {key}")
        leave(absent, f"without {key}")
    for key, log in axes:
        if log:
            leave(values[key] <= 0, f"{key} zero or negative on a log axis")
    return frame[waiting], left_out


def runs_of(frame: pd.DataFrame) -> np.ndarray:
    """How many runs each row stands for: its column n, else 1."""
    if "n" in frame.columns:
        return frame["n"].to_numpy(dtype=np.int64)
    return np.ones(len(frame), dtype=np.int64)


def named_groups(values: pd.Series, runs: np.ndarray) -> tuple[pd.Series, list[str]]:
    """Each row's legend name, and the names in legend order.

    Up to seven groups keep their names; of more, the six with most runs do and the rest are 'other'.
    """
    text = values.astype("object").where(values.notna(), UNNAMED).astype(str)
    text = text.where(text.str.strip() != "", UNNAMED)
    counts = pd.Series(runs, index=text.index).groupby(text).sum()
    if len(counts) <= MOST_SERIES:
        return text, sorted(counts.index)
    kept = sorted(counts.sort_index().sort_values(ascending=False, kind="stable").index[: MOST_SERIES - 1])
    return text.where(text.isin(kept), OTHER), [*kept, OTHER]


def thinned(
    frame: pd.DataFrame,
    *,
    x: str,
    y: str,
    group: str | None,
    log_x: bool,
    log_y: bool,
    most: int = MOST_MARKS,
) -> pd.DataFrame:
    """One row per group and occupied cell of a grid over the axes, with n runs each; the sum of n is kept.

    Rows stand at the mean of their runs (of the logarithms on a log axis); a cell of one row keeps that row.
    """
    u = np.log10(frame[x].to_numpy(dtype=float)) if log_x else frame[x].to_numpy(dtype=float)
    v = np.log10(frame[y].to_numpy(dtype=float)) if log_y else frame[y].to_numpy(dtype=float)
    names = frame[group].to_numpy() if group else np.zeros(len(frame))
    labels = pd.factorize(names)[0].astype(np.int64)
    columns, rows = 96, 64
    while True:
        cell = labels * columns * rows + _index(u, columns) * rows + _index(v, rows)
        _, first, inverse, members = np.unique(
            cell, return_index=True, return_inverse=True, return_counts=True
        )
        if len(first) <= most or (columns, rows) == (1, 1):
            break
        columns, rows = max(columns * 4 // 5, 1), max(rows * 4 // 5, 1)
    runs = runs_of(frame)
    total = np.bincount(inverse, weights=runs)
    result = frame.iloc[first].copy()
    result["n"] = np.rint(total).astype(np.int64)
    for key, place, log in ((x, u, log_x), (y, v, log_y)):
        mean = np.bincount(inverse, weights=runs * place) / total
        merged = 10**mean if log else mean
        result[key] = np.where(members > 1, merged, result[key].to_numpy(dtype=float))
    # in cell order the last group would lie on top everywhere
    mixed = np.random.default_rng(0).permutation(len(result))
    return result.iloc[mixed].reset_index(drop=True)


def _index(place: np.ndarray, cells: int) -> np.ndarray:
    span = place.max() - place.min() or 1.0
    return np.minimum(((place - place.min()) / span * cells).astype(np.int64), cells - 1)
