"""A small histogram over one number, with the chosen range marked."""

import math

import altair as alt
import numpy as np

from labbook.charts import axes
from labbook.charts.palette import paper, theme
from labbook.charts.trend_layers import inline

BINS = 40


def histogram(
    values,
    low: float = -math.inf,
    high: float = math.inf,
    dark: bool = False,
    *,
    log: bool = True,
    title: str = "",
    width: int | str = "container",
    height: int = 90,
) -> alt.LayerChart:
    """How many values fall in each of 40 bins; those inside low to high (inclusive) in the accent colour.

    values, low, high: in the unit of the axis, NaN left out. log: a log axis, which has no place for values
    at or below zero. An empty array gives an empty frame.
    """
    values = np.asarray(values, dtype=float)
    values = values[np.isfinite(values) & ((values > 0) | (not log))]
    limits = (low, high)
    span = (axes.log_domain if log else axes.linear_domain)(values)
    # a limit between two bins cuts one: the bins are laid so that it never does
    edges = np.geomspace(*span, BINS + 1) if log else np.linspace(*span, BINS + 1)
    edges = np.unique([*edges, *(v for v in limits if span[0] < v < span[1])])
    counts, _ = np.histogram(values, edges)
    bars = [
        {
            "from": float(a),
            "to": float(b),
            "n": int(n),
            "none": 0,
            "inside": bool(limits[0] <= a and b <= limits[1]),
        }
        for a, b, n in zip(edges[:-1], edges[1:], counts, strict=True)
        if n
    ]
    colours = paper(dark)
    x = alt.X(
        "from:Q", scale=axes.scale(*span, log), axis=axes.axis(*span, log, title=title or None, grid=False)
    )
    layers = [
        alt.Chart(inline(bars), name="bars")
        .mark_bar(clip=True, tooltip=None)
        .encode(
            x=x,
            x2="to:Q",
            y=alt.Y(
                "n:Q", axis=None, scale=alt.Scale(zero=True, domain=[0, max([1, *(b["n"] for b in bars)])])
            ),
            y2="none:Q",
            color=alt.condition("datum.inside", alt.value(colours.accent), alt.value(colours.grey)),
        )
    ]
    shown = [{"at": v} for v in limits if math.isfinite(v) and span[0] <= v <= span[1]]
    if shown:
        layers.append(
            alt.Chart(inline(shown), name="limits")
            .mark_rule(color=colours.ink, strokeWidth=1.2, tooltip=None)
            .encode(x=alt.X("at:Q", scale=axes.scale(*span, log)))
        )
    return alt.layer(*layers).properties(width=width, height=height).configure(**theme(dark))
