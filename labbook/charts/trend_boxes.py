"""Regimes on the two numbers of a trend's axes: a box each, with its name, behind the marks."""

from collections.abc import Iterable

import altair as alt

from labbook.charts.palette import BAND_OPACITY, SMALL_SIZE, band_hue, paper
from labbook.charts.trend_layers import HUE, Plane, inline, short
from labbook.registry.regimes import Regime


def boxes_of(plane: Plane, regimes: Iterable[Regime] | None) -> list[dict]:
    """A row for each regime that stands on x and y both and reaches into the frame, cut to it."""
    rows = []
    for place, regime in enumerate(r for r in regimes or () if set(r.numbers) == {plane.x, plane.y}):
        sides = {band.number: band for band in regime.bands}
        ends = [
            (max(sides[key].low, low), min(sides[key].high, high))
            for key, (low, high) in ((plane.x, plane.x_domain), (plane.y, plane.y_domain))
        ]
        if all(low < high for low, high in ends):
            (left, right), (bottom, top) = ends
            rows.append({"name": regime.name, "hue": band_hue(regime, place), "left": short(left),
                         "right": short(right), "bottom": short(bottom), "top": short(top)})  # fmt: skip
    return rows


def box_layers(plane: Plane, regimes: Iterable[Regime] | None) -> list[alt.Chart]:
    """Boxes at the bands' opacity with an edge, each named at its top left corner inside the frame."""
    rows = boxes_of(plane, regimes)
    if not rows:
        return []
    return [
        alt.Chart(inline(rows), name="regime_boxes")
        .mark_rect(fill=HUE, stroke=HUE, fillOpacity=BAND_OPACITY, strokeOpacity=0.6, clip=True, tooltip=None)
        .encode(x=plane.across("left"), x2="right", y=plane.up("bottom"), y2="top"),
        alt.Chart(inline(rows), name="regime_box_names")
        .mark_text(align="left", baseline="top", dx=6, dy=18, fontSize=SMALL_SIZE, clip=True, tooltip=None,
                   color=paper(plane.dark).muted)
        .encode(x=plane.across("left"), y=plane.up("top"), text="name:N"),
    ]
