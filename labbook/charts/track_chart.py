"""Pictures of a reduced track: the path in the plane, and what each cycle brought."""

import math

import altair as alt
import numpy as np
import pandas as pd

from labbook.charts import axes
from labbook.charts.palette import SMALL_SIZE, paper, text_width, theme
from labbook.charts.track_points import MOST_FRAMES, length_unit, outlying, rounded, spread_out
from labbook.charts.trend_layers import inline, short
from labbook.physics.tracks import Reduction

PATH_WIDTH, PATH_HEIGHT = 220, 220
ARROW = 0.3  # of the frame's shorter side
MOST_BARS = 60
STEPS_HEIGHT = 282  # of the chart with its axis, where it fills a page: as high as the path beside it


def path_chart(
    reduction: Reduction, dark: bool = False, *, width: int = PATH_WIDTH, height: int = PATH_HEIGHT
) -> alt.LayerChart:
    """The path from its start, drift taken off, with equal scales; the swimming axis is an arrow towards the head.

    At most 2,000 frames are drawn, none of the outlying ones.
    """
    trace = reduction.trace
    there = np.flatnonzero(~outlying(trace, reduction.trimmed, reduction.f_beat))
    there = there[spread_out(len(there), MOST_FRAMES)]
    x, y = trace.x[there] - trace.x[there[0]], trace.y[there] - trace.y[there[0]]
    factor, unit = length_unit(max(np.ptp(x), np.ptp(y)))
    x, y = factor * x, factor * y
    span_x, span_y, per_pixel = _equal(x, y, width, height)
    rows = pd.DataFrame({"i": range(len(x)), "x": rounded(x, per_pixel), "y": rounded(y, per_pixel)})
    colours = paper(dark)
    across = alt.X("x:Q", scale=axes.scale(*span_x, False), axis=axes.axis(*span_x, False, title=f"x from the start ({unit})"))
    up = alt.Y("y:Q", scale=axes.scale(*span_y, False), axis=axes.axis(*span_y, False, title=f"y ({unit})"))
    ends = [{"x": float(rows["x"].iloc[i]), "y": float(rows["y"].iloc[i]), "what": what, "shape": shape}
            for i, what, shape in ((0, "start", "circle"), (-1, "end", "square"))]  # fmt: skip
    look = dict(clip=True, tooltip=None)
    layers = [
        alt.Chart(rows, name="path").mark_line(stroke=colours.accent, strokeWidth=1.1, **look)
        .encode(x=across, y=up, order="i:Q"),
        *_arrow(reduction.axis, x, y, span_x, span_y, per_pixel, min(width, height), colours, across, up),
        alt.Chart(inline(ends), name="ends")
        .mark_point(size=85, fill=colours.ground, stroke=colours.ink, strokeWidth=1.8, opacity=1, **look)
        .encode(x=across, y=up, shape=alt.Shape("shape:N", scale=None)),
        *(alt.Chart(inline([end]), name=f"{end['what']}_word")
          .mark_text(text=end["what"], dy=-12, align=align, dx=dx, fontSize=SMALL_SIZE, color=colours.ink, tooltip=None)
          .encode(x=across, y=up)
          for end, (align, dx) in zip(ends, _sides(ends, span_x, width), strict=True)),
    ]  # fmt: skip
    # the frame itself has this size, or the scales would not be equal
    framed = alt.layer(*layers).properties(width=width, height=height, autosize=alt.AutoSizeParams(type="pad"))
    return framed.configure(**theme(dark))


def _equal(x, y, width, height):
    """The spans of both axes with as much length a pixel on one as on the other, and that length."""
    room = 34  # pixels: marks and words at the ends stay inside
    per_pixel = max(float(np.ptp(x)) / (width - 2 * room), float(np.ptp(y)) / (height - 2 * room)) or 1.0 / width
    spans = []
    for values, pixels in ((x, width), (y, height)):
        middle = 0.5 * float(values.min() + values.max())
        spans.append((middle - 0.5 * pixels * per_pixel, middle + 0.5 * pixels * per_pixel))
    return *spans, per_pixel


def _sides(ends, span_x, width):
    """Where each word stands beside its mark, so that it stays inside and the two never meet."""
    first_is_left = ends[0]["x"] <= ends[1]["x"]
    left, right = ("right", -6), ("left", 6)
    sides = []
    for end, outward in zip(ends, (left, right) if first_is_left else (right, left), strict=True):
        at = (end["x"] - span_x[0]) / (span_x[1] - span_x[0]) * width
        need = text_width(end["what"], SMALL_SIZE) + 8
        fits = at > need if outward is left else width - at > need
        sides.append(outward if fits else (right if outward is left else left))
    return sides


def _arrow(axis, x, y, span_x, span_y, per_pixel, side, colours, across, up):
    """The swimming axis as an arrow in the corner where the path is least."""
    half = 0.5 * ARROW * side * per_pixel
    reach = half + 12 * per_pixel
    corners = [(a, b) for b in (span_y[1] - reach, span_y[0] + reach) for a in (span_x[0] + reach, span_x[1] - reach)]
    at = min(corners, key=lambda one: np.count_nonzero((np.abs(x - one[0]) < reach) & (np.abs(y - one[1]) < reach)))
    tail, head = ([at[i] + sign * half * axis[i] for i in (0, 1)] for sign in (-1, 1))
    line = [{"x": short(tail[0]), "y": short(tail[1]), "x2": short(head[0]), "y2": short(head[1])}]
    # Vega turns a wedge clockwise, from pointing up
    angle = 90.0 - math.degrees(math.atan2(axis[1], axis[0]))
    return [
        alt.Chart(inline(line), name="axis").mark_rule(stroke=colours.muted, strokeWidth=1.8, tooltip=None)
        .encode(x=across, y=up, x2="x2:Q", y2="y2:Q"),
        alt.Chart(inline([{"x": line[0]["x2"], "y": line[0]["y2"]}]), name="axis_head")
        .mark_point(shape="wedge", size=160, fill=colours.muted, stroke=colours.muted, opacity=1, tooltip=None)
        .encode(x=across, y=up, angle=alt.AngleValue(angle % 360.0)),
    ]  # fmt: skip


def steps_chart(
    reduction: Reduction, dark: bool = False, *, width: int | str = "container", height: int = STEPS_HEIGHT
) -> alt.LayerChart | None:
    """What each cycle brought along the axis as bars, with the mean, its 95 % band and zero; None without a beat.

    Where there are more than 60 cycles a bar is the mean of several, and the axis says of how many.
    """
    f, steady = reduction.f_beat, reduction.steadiness
    if f is None or steady is None or not np.isfinite(steady.per_cycle).any():
        return None
    each, together = _grouped(steady.per_cycle / f)
    mean, low, high = (float(U) / f for U in (reduction.U, reduction.U_low, reduction.U_high))
    reached = np.array([0.0, low, high, *each[np.isfinite(each)]])
    factor, unit = length_unit(2.0 * np.abs(reached).max())
    bars = [{"from": i * together + 0.12 * together, "to": (i + 1) * together - 0.12 * together, "none": 0,
             "step": short(factor * step)} for i, step in enumerate(each) if np.isfinite(step)]  # fmt: skip
    span_x, span_y = (0.0, float(len(each) * together)), axes.linear_domain(factor * reached)
    of = "a cycle" if together == 1 else f"a cycle, mean of {together}"
    x = alt.X("from:Q", scale=axes.scale(*span_x, False), axis=axes.axis(*span_x, False, title="cycle", grid=False))
    y = alt.Y("step:Q", scale=axes.scale(*span_y, False),
              axis=axes.axis(*span_y, False, title=[f"step {of} ({unit})"]))  # fmt: skip
    colours = paper(dark)
    whole = [{"from": 0.0, "to": span_x[1], "step": short(factor * mean), "low": short(factor * low),
              "high": short(factor * high), "zero": 0}]  # fmt: skip
    plain = dict(clip=True, tooltip=None)
    layers = [
        alt.Chart(inline(bars), name="steps").mark_rect(fill=colours.accent, fillOpacity=0.55, **plain)
        .encode(x=x, x2="to:Q", y=y, y2="none:Q"),
        alt.Chart(inline(whole), name="band").mark_rect(fill=colours.rust, fillOpacity=0.25, **plain)
        .encode(x=x, x2="to:Q", y=alt.Y("low:Q"), y2="high:Q"),
        alt.Chart(inline(whole), name="mean").mark_rule(stroke=colours.rust, strokeWidth=2, **plain)
        .encode(x=x, x2="to:Q", y=y),
        alt.Chart(inline(whole), name="zero").mark_rule(stroke=colours.ink, strokeWidth=1.2, **plain)
        .encode(x=x, x2="to:Q", y=alt.Y("zero:Q")),
    ]  # fmt: skip
    return alt.layer(*layers).properties(width=width, height=height).configure(**theme(dark))


def _grouped(steps):
    """(mean step of each group of cycles, cycles a group)."""
    together = -(-len(steps) // MOST_BARS)
    groups = [steps[i : i + together] for i in range(0, len(steps), together)]
    return np.array([np.nanmean(g) if np.isfinite(g).any() else np.nan for g in groups]), together
