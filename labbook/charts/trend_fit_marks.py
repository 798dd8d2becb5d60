"""What statistics draw on the trend: crosses at maxima with their intervals, means of repeat groups."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import altair as alt
import numpy as np
import pandas as pd

from labbook.charts.palette import paper
from labbook.charts.trend import Trend
from labbook.charts.trend_layers import HUE, inline, short
from labbook.charts.trend_published import NO_RUN
from labbook.registry.written import written

CROSS = "Thin cross: maximum, thick part: its 95 % intervals"
MEANS = "Open circles: means of runs repeated alike, bars: their scatter"
RUNS = "runs"  # the layer whose axes are taken
MEAN_SIZE = 170  # square pixels; larger than a run's mark
# an interval may be shorter than a mark is wide: a cross of its own size says where
CROSS_SIZE, CROSS_PATH = 700, "M-1,0L1,0M0,-1L0,1"


@dataclass(frozen=True)
class FitMarks:
    """tops: name ('' the whole group), x, x_low, x_high, y, y_low, y_high; means: x, y, scatter, n, name."""

    tops: Sequence[Mapping]
    means: pd.DataFrame | None = None


def with_marks(drawn: Trend, marks: FitMarks | None, *, dark: bool) -> Trend:
    """The trend with crosses and means over its marks, and words about them in its caption.

    A family's cross has the colour of its runs where the legend names it; others' have none. A mean without
    a place on the axes is left out. A chart without runs stays as it is.
    """
    base = next((part for part in drawn.chart.layer if part.name == RUNS), None)
    if marks is None or base is None:
        return drawn
    layers, said = [], []
    means = _drawable(marks.means, base)
    if len(means):
        layers += _means(base, means, dark)
        said.append(MEANS)
    hues = _hues(base)
    tops = [t for t in marks.tops if np.isfinite(t["x"] + t["y"]) and (not t["name"] or t["name"] in hues)]
    if tops:
        layers += _crosses(base, sorted(tops, key=lambda t: not t["name"]), hues, dark)
        said.append(CROSS + _families_in_words(tops))
    if not layers:
        return drawn
    chart = drawn.chart.copy(deep=False)
    chart.layer = [*drawn.chart.layer, *layers]
    return replace(drawn, chart=chart, caption=f"{drawn.caption} {'. '.join(said)}.")


def _families_in_words(tops) -> str:
    return "; ink: of all runs, in colour: of a family" if any(t["name"] for t in tops) else ""


def _hues(base: alt.Chart) -> dict[str, str]:
    """The families that the legend names, with their colours."""
    fill = base.encoding.fill
    if fill is alt.Undefined:
        return {}
    return dict(zip(fill["scale"]["domain"], fill["scale"]["range"], strict=True))


def _along(base: alt.Chart, x: str = "x", y: str = "y") -> dict:
    """The two channels of the runs' layer with other fields: the same scale and axis, or both are drawn."""
    across, up = base.encoding.x, base.encoding.y
    return {"x": alt.X(f"{x}:Q", scale=across["scale"], axis=across["axis"]),
            "y": alt.Y(f"{y}:Q", scale=up["scale"], axis=up["axis"])}  # fmt: skip


def _drawable(means: pd.DataFrame | None, base: alt.Chart) -> pd.DataFrame:
    if means is None:
        return pd.DataFrame({"x": []})
    kept = np.isfinite(means["x"]) & np.isfinite(means["y"])
    for key, channel in (("x", base.encoding.x), ("y", base.encoding.y)):
        if channel["scale"]["type"] == "log":
            kept &= means[key] > 0
    return means[kept]


def _means(base: alt.Chart, means: pd.DataFrame, dark: bool) -> list[alt.Chart]:
    floor, top = base.encoding.y["scale"]["domain"]
    rows = [
        {"x": short(r.x), "y": short(r.y), "low": short(max(r.y - r.scatter, floor)),
         "high": short(min(r.y + r.scatter, top)), "name": r.name, "n": int(r.n), "code": NO_RUN,
         "mean": written(r.y), "scatter": written(float(f"{r.scatter:.2g}"))}
        for r in means.itertuples(index=False)
    ]  # fmt: skip
    data, ink = inline(rows), paper(dark)
    tips = [alt.Tooltip("name:N", title="repeats of"), alt.Tooltip("n:Q", title="runs"),
            alt.Tooltip("mean:N", title="mean"), alt.Tooltip("scatter:N", title="scatter")]  # fmt: skip
    ring = dict(shape="circle", filled=False, size=MEAN_SIZE, opacity=1, clip=True)
    return [
        alt.Chart(data, name="repeat_bars").mark_rule(color=ink.ink, strokeWidth=1.4, clip=True, tooltip=None)
        .encode(**_along(base, y="low"), y2="high"),
        alt.Chart(data, name="repeat_halo")
        .mark_point(stroke=ink.ground, strokeWidth=3.2, tooltip=None, **ring).encode(**_along(base)),
        alt.Chart(data, name="repeats").mark_point(stroke=ink.ink, strokeWidth=1.5, **ring)
        .encode(tooltip=tips, **_along(base)),
    ]  # fmt: skip


def _crosses(base: alt.Chart, tops, hues: Mapping[str, str], dark: bool) -> list[alt.Chart]:
    """A thin cross over a halo of ground, and on it the two intervals, thick."""
    ink = paper(dark)
    rows = [
        {"x": short(t["x"]), "y": short(t["y"]), "hue": hues.get(t["name"], ink.ink), "code": NO_RUN,
         **{k: short(t[k] if np.isfinite(t[k]) else t[k[0]]) for k in ("x_low", "x_high", "y_low", "y_high")},
         "name": t["name"] or "all runs", "x_text": _interval(t, "x"), "y_text": _interval(t, "y")}
        for t in tops
    ]  # fmt: skip
    data = inline(rows)
    arms = (dict(x2="x_high", **_along(base, x="x_low")), dict(y2="y_high", **_along(base, y="y_low")))
    tips = [alt.Tooltip("name:N", title="maximum of"), alt.Tooltip("x_text:N", title="across, 95 %"),
            alt.Tooltip("y_text:N", title="up, 95 %")]  # fmt: skip
    cross = dict(shape=CROSS_PATH, size=CROSS_SIZE, filled=False, opacity=1, clip=True)
    return [
        alt.Chart(data, name="maximum_halo")
        .mark_point(stroke=ink.ground, strokeWidth=5, tooltip=None, **cross).encode(**_along(base)),
        *(alt.Chart(data, name=f"maximum_{way}")
          .mark_rule(stroke=HUE, strokeWidth=5, opacity=1, clip=True, tooltip=None).encode(**arm)
          for way, arm in zip(("across", "up"), arms, strict=True)),
        alt.Chart(data, name="maximum").mark_point(stroke=HUE, strokeWidth=1.6, **cross)
        .encode(tooltip=tips, **_along(base)),
    ]  # fmt: skip


def _interval(top: Mapping, key: str) -> str:
    low, high = top[f"{key}_low"], top[f"{key}_high"]
    if not np.isfinite(low + high):
        return f"{written(top[key])}, no interval"
    return f"{written(top[key])} ({written(low)} to {written(high)})"
