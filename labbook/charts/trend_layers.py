"""The trend's plane and what lies around its marks: bands, the ring and the run in hand."""

from dataclasses import dataclass

import altair as alt
import numpy as np

from labbook.charts import axes
from labbook.charts.bands import Band
from labbook.charts.palette import (
    BAND_OPACITY,
    SMALL_SIZE,
    TITLE_SIZE,
    paper,
    text_width,
)

NARROWEST = 400  # pixels: what a chart that fills its column has at least
# a row's own colour outside any channel: a second use of a channel tears its legend apart in some versions
HUE = {"expr": "datum.hue"}


@dataclass(frozen=True)
class Plane:
    """The frame that all layers share: keys, domains, kinds of axis, titles, short labels and theme."""

    x: str
    y: str
    x_domain: tuple[float, float]
    y_domain: tuple[float, float]
    log_x: bool
    log_y: bool
    x_title: str
    y_title: str
    x_label: str
    y_label: str
    dark: bool
    width: int
    height: int

    @property
    def x_letters(self) -> int:
        """Letters in a line of the title below, which must not outgrow the frame."""
        return max(20, int((self.width - 60) / text_width("x", TITLE_SIZE)))

    @property
    def y_letters(self) -> int:
        """Letters in a line of the title beside; on a page the axis and the legend come off the height."""
        return max(14, int((self.height - 80) / text_width("x", TITLE_SIZE)))

    def across(self, field: str) -> alt.X:
        return alt.X(
            f"{field}:Q",
            scale=axes.scale(*self.x_domain, self.log_x),
            axis=axes.axis(*self.x_domain, self.log_x, title=axes.title_lines(self.x_title, self.x_letters)),
        )

    def up(self, field: str) -> alt.Y:
        return alt.Y(
            f"{field}:Q",
            scale=axes.scale(*self.y_domain, self.log_y),
            axis=axes.axis(*self.y_domain, self.log_y, title=axes.title_lines(self.y_title, self.y_letters)),
        )


def inline(records: list[dict]) -> alt.InlineData:
    """Rows embedded in the chart as they are: no file, no address, no row limit."""
    return alt.InlineData(values=records)


def short(value: float) -> float | None:
    """A value to five digits, None where absent: more cannot be seen and costs bytes."""
    return float(f"{value:.5g}") if np.isfinite(value) else None


def _band_rows(bands: list[Band]) -> list[dict]:
    return [{"name": b.name, "low": b.low, "high": b.high, "hue": b.hue,
             "need": text_width(b.name, SMALL_SIZE) + 8} for b in bands]


def band_areas(plane: Plane, upright: list[Band], level: list[Band]) -> list[alt.Chart]:
    """Rectangles over the regimes of x (upright) and of y (level), each at 20 % opacity."""
    layers = []
    if upright:
        layers.append(
            alt.Chart(inline(_band_rows(upright)), name="bands_x")
            .mark_rect(fill=HUE, opacity=BAND_OPACITY, clip=True, tooltip=None)
            .encode(x=plane.across("low"), x2="high")
        )
    if level:
        layers.append(
            alt.Chart(inline(_band_rows(level)), name="bands_y")
            .mark_rect(fill=HUE, opacity=BAND_OPACITY, clip=True, tooltip=None)
            .encode(y=plane.up("low"), y2="high")
        )
    return layers


def band_names(plane: Plane, upright: list[Band], level: list[Band]) -> list[alt.Chart]:
    """The names of the bands inside the frame, where they fit: at the top for x, at the right for y."""
    colours, layers = paper(plane.dark), []
    # first a halo of ground, so that a name stays legible over marks
    looks = (("halo", dict(color=colours.ground, stroke=colours.ground, strokeWidth=3, opacity=0.75)),
             ("names", dict(color=colours.muted)))
    shared = dict(fontSize=SMALL_SIZE, tooltip=None, clip=True)
    if upright:
        wide = "abs(scale('x', datum.high) - scale('x', datum.low)) > datum.need"
        middle = "sqrt(datum.low * datum.high)" if plane.log_x else "(datum.low + datum.high) / 2"
        layers += [
            alt.Chart(inline(_band_rows(upright)), name=f"band_{kind}_x")
            .transform_calculate(middle=middle)
            .mark_text(baseline="top", text=alt.expr(f"{wide} ? datum.name : ''"), **look, **shared)
            .encode(x=plane.across("middle"), y=alt.value(6))
            for kind, look in looks
        ]
    if level:
        tall = f"abs(scale('y', datum.high) - scale('y', datum.low)) > {SMALL_SIZE + 8}"
        layers += [
            alt.Chart(inline(_band_rows(level)), name=f"band_{kind}_y")
            .mark_text(align="right", baseline="bottom", dx=-6, dy=-4,
                       text=alt.expr(f"{tall} ? datum.name : ''"), **look, **shared)
            .encode(x=alt.value("width"), y=plane.up("low"))
            for kind, look in looks
        ]
    return layers


def bar_ends(domain: tuple[float, float], key: str, u: str) -> dict[str, str]:
    """Vega expressions for a bar's ends, held inside the frame: a log axis has no place for zero."""
    low, high = domain
    return {
        f"{key}0": f"max(datum.{key} - datum.{u}, {low!r})",
        f"{key}1": f"min(datum.{key} + datum.{u}, {high!r})",
    }


def ring(plane: Plane, row) -> alt.Chart:
    """A rust ring around the open run."""
    return (
        alt.Chart(inline([{"x": float(row[plane.x]), "y": float(row[plane.y])}]), name="picked")
        .mark_point(shape="circle", filled=False, size=260, stroke=paper(plane.dark).rust, strokeWidth=2.6,
                    opacity=1, clip=True, tooltip=None)
        .encode(x=plane.across("x"), y=plane.up("y"))
    )


def in_hand(plane: Plane, point: dict[str, float]) -> list[alt.Chart]:
    """The new run as a rust dot with its bars."""
    data, rust = inline([{k: v for k, v in point.items() if np.isfinite(v)}]), paper(plane.dark).rust
    layers = []
    for key, u, domain in (("x", "u_x", plane.x_domain), ("y", "u_y", plane.y_domain)):
        if point.get(u, 0) > 0:
            along = dict(x=plane.across("x0"), x2="x1", y=plane.up("y"))
            upward = dict(x=plane.across("x"), y=plane.up("y0"), y2="y1")
            layers.append(
                alt.Chart(data, name=f"in_hand_{u}").transform_calculate(**bar_ends(domain, key, u))
                .mark_rule(color=rust, strokeWidth=2, clip=True, tooltip=None)
                .encode(**(along if key == "x" else upward))
            )
    layers.append(
        alt.Chart(data, name="in_hand")
        .mark_point(shape="circle", fill=rust, stroke=paper(plane.dark).ground, strokeWidth=1.2, size=170,
                    opacity=1, clip=True, tooltip=None)
        .encode(x=plane.across("x"), y=plane.up("y"))
    )
    return layers
