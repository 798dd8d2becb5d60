"""Shared bands of the trend: how far the runs of a family may move together, behind its marks."""

import altair as alt
import numpy as np
import pandas as pd

from labbook.charts.trend_layers import HUE, Plane, inline, short

SHARED = "shared band"  # the kind of bars
STRETCHES = 12  # places along x that a family's band goes through at most
FEW = 3  # with fewer places along x a family has a bar at each instead of a band
LINE = "Bands: what runs of one swimmer share at most (fluid, material, swimmer, rig), 2 u; more runs do not shrink it"
ELSEWHERE = "Shared bands need the colour 'swimmer': runs of several swimmers share less than each one's shared part"
FAR = 3.0  # times the usual step along x: across a wider gap no band is drawn
AREA_OPACITY, EDGE_OPACITY = 0.30, 0.55
BAR_WIDTH = 9  # pixels


def family_bands(shown: pd.DataFrame, x: str, y: str, family: pd.Series | None) -> pd.DataFrame:
    """Columns family, x, low, high, alone, piece: y -+ 2 u_shared(y) along the runs of each family, sorted by x.

    A family of up to STRETCHES runs has each of them; of more, it is cut into so many stretches of equal
    count and has each one's middle x and y and root mean square u: the band follows the family, not the
    scatter of its runs. alone: fewer than FEW places in this piece along x. A run whose y shares nothing takes no part;
    family: None makes all one.
    """
    u = shown.get(f"u_shared_{y}", pd.Series(np.nan, index=shown.index)).to_numpy(dtype=float)
    table = pd.DataFrame({"family": "" if family is None else family, "x": shown[x], "y": shown[y]})
    table = table.assign(uu=u * u)[np.isfinite(u) & (u > 0)].sort_values(["family", "x"], kind="stable")
    runs = table.groupby("family")["x"]
    place, count = runs.cumcount(), runs.transform("size")
    stretch = (place * np.minimum(count, STRETCHES)) // np.maximum(count, 1)
    middle = table.groupby(["family", stretch]).agg(x=("x", "median"), y=("y", "median"), uu=("uu", "mean"))
    # one x twice would make an edge upright
    middle = middle.reset_index().groupby(["family", "x"])[["y", "uu"]].mean().reset_index()
    half = 2.0 * np.sqrt(middle["uu"])
    piece = _pieces(middle)
    alone = middle.groupby([middle["family"], piece])["x"].transform("size") < FEW
    return pd.DataFrame({"family": middle["family"], "x": middle["x"], "low": middle["y"] - half,
                         "high": middle["y"] + half, "alone": alone, "piece": piece})  # fmt: skip


def _pieces(middle: pd.DataFrame) -> pd.Series:
    """Which piece of its family's band a place is in: a band that crossed a wide gap would read as a fit."""
    along = np.log(middle["x"]) if (middle["x"] > 0).all() else middle["x"]
    step = along.groupby(middle["family"]).diff()
    usual = step.groupby(middle["family"]).transform("median")
    return (step > FAR * usual).groupby(middle["family"]).cumsum()


def shared_layers(plane: Plane, bands: pd.DataFrame, hues: dict[str, str], plain: str) -> list[alt.Chart]:
    """An area for each family with enough places along x, a broad bar at each place of the others."""
    # on a log axis a lower limit at or below zero lies under the frame
    floor = plane.y_domain[0] / 10 if plane.log_y else -np.inf
    layers = []
    for alone, part in bands.groupby("alone"):
        rows = [
            {"x": short(r.x), "low": short(max(r.low, floor)), "high": short(max(r.high, floor)),
             "family": r.family, "piece": int(r.piece), "hue": hues.get(r.family, plain)}
            for r in part.itertuples()
        ]  # fmt: skip
        chart = alt.Chart(inline(rows), name="shared_bars" if alone else "shared_bands")
        if alone:
            mark = chart.mark_rule(stroke=HUE, strokeWidth=BAR_WIDTH, opacity=EDGE_OPACITY, clip=True,
                                   tooltip=None)  # fmt: skip
        else:
            mark = chart.mark_area(fill=HUE, fillOpacity=AREA_OPACITY, stroke=HUE, strokeOpacity=EDGE_OPACITY,
                                   strokeWidth=1, clip=True, tooltip=None)  # fmt: skip
        layers.append(mark.encode(x=plane.across("x"), y=plane.up("low"), y2="high", detail=["family:N", "piece:O"]))
    return layers


def shared_words(shown: pd.DataFrame, bands: pd.DataFrame, plane: Plane) -> list[str]:
    """The sentences under the chart: what the bands are, how wide, and how far a family may move along x."""
    if bands.empty:
        return [f"No shared bands: nothing of {plane.y_label} is shared among the runs drawn"]
    along = _span(shown, plane.x)
    said = f"{LINE}. Here 2 u is {_span(shown, plane.y)} of {plane.y_label}"
    return [f"{said}; along x a family may move by {along} of {plane.x_label}" if along else said]


def _span(shown: pd.DataFrame, key: str) -> str:
    """2 u of the shared part in per cent of the value, for nine runs in ten; '' where nothing is shared."""
    if f"u_shared_{key}" not in shown.columns:
        return ""
    u, value = (shown[k].to_numpy(dtype=float) for k in (f"u_shared_{key}", key))
    share = 200.0 * np.abs(u[u > 0] / value[u > 0])
    if not share.size:
        return ""
    low, high = (f"{v:.2g}" for v in np.percentile(share, [5, 95]))
    return f"{low} %" if low == high else f"{low} to {high} %"
