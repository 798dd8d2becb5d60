"""The plane of drive frequency against viscosity: zones, lines of equal number, fluids, runs, proposals."""

from collections.abc import Mapping, Sequence

import numpy as np
import pandas as pd

from labbook.charts.plan_layers import map_layers
from labbook.charts.plan_marks import apart, joined, thinned
from labbook.charts.plan_plane import spanned
from labbook.charts.plan_words import Worded, placed
from labbook.charts.plan_zones import hatch, tint, union
from labbook.charts.trend_layers import short

DOUBTFUL, FORBIDDEN = "doubtful", "forbidden"
NOMINAL = (600.0, 320.0)  # pixels of the frame on a small screen: what lettering must fit
SAME = 1e-3  # of a target: a level as near as that is the target
TITLES = {"x": "f drive frequency (Hz)", "y": "μ dynamic viscosity (Pa s)"}
RUN_COLUMNS = ("code", "fluid", "f", "mu")


def ground(
    *, f: np.ndarray, mu: np.ndarray, zones: Sequence, fluids: pd.DataFrame, runs: pd.DataFrame
) -> dict[str, list[dict]]:
    """What lies on the plane whatever is aimed at or proposed, as rows for `plan_map`.

    f (F,) in Hz, mu (M,) in Pa.s: the frame, ascending; zones: with name, verdict, side and edge (M,) in Hz;
    fluids: code, mu; runs: RUN_COLUMNS.
    """
    forbidden = union([z for z in zones if z.verdict == FORBIDDEN], f, mu)
    doubtful = union([z for z in zones if z.verdict == DOUBTFUL], f, mu)
    edges = [(z.verdict, row) for i, z in enumerate(zones) for row in _points(f"zone {i}", z.edge, mu)]
    lines = zip(fluids["code"].tolist(), fluids["mu"].tolist(), strict=True)
    return {
        "doubtful": tint(doubtful, but=forbidden),
        "forbidden": tint(forbidden),
        "hatch": hatch(forbidden, aspect=NOMINAL[0] / NOMINAL[1]),
        "edges": [row | {"verdict": verdict} for verdict, row in edges],
        "fluids": [{"code": code, "mu": short(at)} for code, at in lines],
        "fluid_names": apart(fluids, mu, NOMINAL[1]),
        "runs": _rows(thinned(runs, f, mu)),
    }


def plan_map(
    *,
    f: np.ndarray,
    mu: np.ndarray,
    below: Mapping[str, list[dict]],
    surface: np.ndarray,
    zones: Sequence,
    levels: Sequence[float],
    target: float | None,
    proposed: pd.DataFrame,
    waiting: pd.DataFrame,
    done: pd.DataFrame,
    symbol: str = "Sp",
    dark: bool = False,
) -> dict:
    """The specification of the map, its rows in one data set: what moves is the data alone.

    f, mu, zones: as for `ground`, which makes `below`; surface (M, F): the number whose lines are drawn, a
    power of f along every row, NaN where absent; levels, target: values of that number; proposed, waiting,
    done: RUN_COLUMNS, those proposed with `place`, their number in the list.
    """
    apart_from = levels if target is None else [x for x in levels if abs(x / target - 1.0) > SAME]
    lines = {level: along(surface, f, level) for level in apart_from}
    aim = None if target is None else along(surface, f, target)
    rows = {
        **below,
        "levels": [row for level, edge in lines.items() for row in _points(f"{level:g}", edge, mu)],
        "target": [] if aim is None else _points("target", aim, mu),
        "waiting": _rows(waiting),
        "done": _rows(done),
        "proposed": joined(proposed),
        "words": _words(zones, lines, aim, target, symbol, f, mu),
    }
    spans = [((float(values[0]), float(values[-1])), TITLES[axis]) for axis, values in (("x", f), ("y", mu))]
    return spanned(map_layers(dark), *spans, rows)


def along(surface: np.ndarray, f: np.ndarray, level: float) -> np.ndarray:
    """f at which a number that is a power of f passes a level, row by row of its surface; NaN without it."""
    ln_f = np.log(f)
    with np.errstate(all="ignore"):
        ln_s = np.log(surface)
        slope = (ln_s[:, -1] - ln_s[:, 0]) / (ln_f[-1] - ln_f[0])
        return np.exp(ln_f[0] + (np.log(level) - ln_s[:, 0]) / slope)


def _points(name: str, edge, mu) -> list[dict]:
    """The corners of a line: the ends alone where it is straight in the logarithms."""
    there = np.isfinite(edge)
    x, y = np.log(edge[there]), np.log(mu[there])
    if len(x) < 2:
        return []
    kept = [0, *(i for i in range(1, len(x) - 1) if not _straight(x, y, i)), len(x) - 1]
    return [{"line": name, "f": short(np.exp(x[i])), "mu": short(np.exp(y[i]))} for i in kept]


def _straight(x, y, i) -> bool:
    return abs((x[i + 1] - x[i]) * (y[i] - y[i - 1]) - (x[i] - x[i - 1]) * (y[i + 1] - y[i])) < 1e-9


def _rows(runs: pd.DataFrame) -> list[dict]:
    columns = [runs[c].tolist() for c in RUN_COLUMNS]
    return [
        {"code": code, "fluid": fluid, "f": short(f), "mu": short(mu)}
        for code, fluid, f, mu in zip(*columns, strict=True)
    ]


def _words(zones, lines, aim, target, symbol, f, mu) -> list[dict]:
    """Names along the lines that they belong to, the target's first, none upon another."""
    asked = [] if aim is None else [Worded(f"{symbol} {target:.3g}, target", aim, "over", "target")]
    asked += [Worded(f"{z.name}: {z.verdict}", z.edge, z.side, "zone") for z in zones]
    asked += [Worded(f"{symbol} {level:g}", edge, "on", "level") for level, edge in lines.items()]
    return placed(asked, f, mu, NOMINAL)
