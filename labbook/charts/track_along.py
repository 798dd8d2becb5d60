"""A reduced track against time: the position along the swimming axis with its fit, and below it what is left."""

import altair as alt
import numpy as np
import pandas as pd

from labbook.charts import axes
from labbook.charts.palette import paper, theme
from labbook.charts.track_points import (
    MOST_ALONG,
    MOST_OUTLYING,
    length_unit,
    outlying,
    rounded,
    spread_out,
    trimmed_end,
    turning,
)
from labbook.charts.trend_layers import inline, short
from labbook.physics.tracks import Reduction

HEIGHT, RESIDUAL_HEIGHT = 200, 150  # of the chart with its axis, where it fills a page
EXTENT = 46  # pixels of the letters at the left: two panels stand straight below each other
FINEST = 1.0 / 1500.0  # of a span: less than a pixel of the largest chart
CROSS = "M-1,-0.6L-0.6,-1L0,-0.4L0.6,-1L1,-0.6L0.4,0L1,0.6L0.6,1L0,0.4L-0.6,1L-1,0.6L-0.4,0Z"


def along_chart(
    reduction: Reduction, dark: bool = False, *, width: int | str = "container", height: int = HEIGHT
) -> alt.LayerChart:  # fmt: skip
    """Position along the axis against time with the fit.

    Outlying frames are crosses, the trimmed part is shaded. At most 1,000 frames are drawn; the fit keeps its
    turning points.
    """
    trace = reduction.trace
    along, fit = (one - trace.along[0] for one in (trace.along, trace.fit))
    panel = _Panel(reduction, [fit, along], "along the axis", dark)
    layers = [*panel.shade(), *panel.points(along), panel.line(fit)]
    return alt.layer(*layers).properties(width=width, height=height).configure(**theme(dark))


def residual_chart(
    reduction: Reduction, dark: bool = False, *, width: int | str = "container", height: int = RESIDUAL_HEIGHT
) -> alt.LayerChart:
    """What the fit leaves of the same frames; its time axis lies straight below that of `along_chart`."""
    trace = reduction.trace
    panel = _Panel(reduction, [np.zeros(1), trace.along - trace.fit], "residual", dark)
    layers = [*panel.shade(), panel.zero(), *panel.points(trace.along - trace.fit)]
    return alt.layer(*layers).properties(width=width, height=height).configure(**theme(dark))


class _Panel:
    """One frame over time; what lies outside its span is drawn at its edge, so that no wild frame presses it flat."""

    def __init__(self, reduction, shown, title, dark):
        trace = self.trace = reduction.trace
        out = outlying(trace, reduction.trimmed, reduction.f_beat)
        crosses, kept = np.flatnonzero(out), np.flatnonzero(~out)
        self.crosses = crosses[spread_out(len(crosses), MOST_OUTLYING)]
        self.kept = kept[spread_out(len(kept), MOST_ALONG)]
        span = axes.linear_domain(np.concatenate([one[~out] if len(one) == len(out) else one for one in shown]))
        self.end = trimmed_end(trace, reduction.trimmed, reduction.f_beat)
        self.colours, self.times, self.name = paper(dark), axes.linear_domain(trace.t), title.split()[0]
        self.factor, unit = length_unit(span[1] - span[0])
        self.low, self.high = (self.factor * v for v in span)
        self.x = alt.X("t:Q", scale=axes.scale(*self.times, False), axis=axes.axis(*self.times, False, title="t (s)"))
        self.axis = axes.axis(self.low, self.high, False, title=f"{title} ({unit})", minExtent=EXTENT, maxExtent=EXTENT)

    def y(self, field):
        return alt.Y(f"{field}:Q", scale=axes.scale(self.low, self.high, False), axis=self.axis)

    def rows(self, values, chosen):
        inside = np.clip(self.factor * values[chosen], self.low, self.high)
        times = rounded(self.trace.t[chosen], FINEST * (self.times[1] - self.times[0]))
        heights = rounded(inside, FINEST * (self.high - self.low))
        return pd.DataFrame({"t": times, "v": heights})  # altair looks at every row of any other kind of data

    def points(self, values):
        looks = [("outlying", self.crosses, dict(shape=CROSS, size=34, fill=self.colours.ink, opacity=1))]
        looks += [("frames", self.kept, dict(shape="circle", size=9, fill=self.colours.grey, opacity=0.8))]
        return [
            alt.Chart(self.rows(values, chosen), name=f"{self.name}_{what}")
            .mark_point(filled=True, tooltip=None, **look).encode(x=self.x, y=self.y("v"))
            for what, chosen, look in looks if len(chosen)
        ]  # fmt: skip

    def line(self, values):
        rows = self.rows(values, turning(values, MOST_ALONG))
        mark = alt.Chart(rows, name=f"{self.name}_fit").mark_line(
            stroke=self.colours.accent, strokeWidth=1.6, clip=True, tooltip=None
        )
        return mark.encode(x=self.x, y=self.y("v"))

    def zero(self):
        rows = inline([{"t": short(self.times[0]), "to": short(self.times[1]), "v": 0}])
        mark = alt.Chart(rows, name=f"{self.name}_zero").mark_rule(stroke=self.colours.ink, tooltip=None)
        return mark.encode(x=self.x, x2="to:Q", y=self.y("v"))

    def shade(self):
        """The trimmed part."""
        if self.end is None:
            return []
        rows = inline([{"t": short(self.times[0]), "to": short(self.end), "v": self.low, "top": self.high}])
        mark = alt.Chart(rows, name=f"{self.name}_trimmed").mark_rect(
            fill=self.colours.grey, fillOpacity=0.28, tooltip=None
        )
        return [mark.encode(x=self.x, x2="to:Q", y=self.y("v"), y2="top:Q")]
