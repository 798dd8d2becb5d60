"""The marks of the trend: one per row, with colour and shape in one legend, over their bars."""

import json

import altair as alt
import numpy as np
import pandas as pd

from labbook.charts.palette import OTHER, TITLE_SIZE, Series, other_series, paper, series, text_width
from labbook.charts.trend_layers import HUE, Plane, bar_ends, short
from labbook.registry.written import written


def marks(plane: Plane, shown: pd.DataFrame, *, names, group, u_x, u_y, bars) -> list[alt.Chart]:
    """Bars, then one mark per row: colour and shape by group in one legend, size by its number of runs."""
    data = mark_table(plane, shown, u_x, u_y, bars)
    several = "n" in shown.columns and bool((shown["n"] > 1).any())
    looks = looks_of(names, plane.dark)
    hues = {n: s.colour for n, s in looks.items()}
    plain = series(plane.dark)[0].colour
    layers = []
    if bars:
        hue = f"({json.dumps(hues)})[datum.group]" if hues else json.dumps(plain)
        for key, u, domain in (("x", "u_x", plane.x_domain), ("y", "u_y", plane.y_domain)):
            ends = bar_ends(domain, key, u)
            if key == "x":
                places = dict(x=plane.across("x0"), x2="x1", y=plane.up("y"))
            else:
                places = dict(x=plane.across("x"), y=plane.up("y0"), y2="y1")
            layers.append(
                alt.Chart(data, name=f"bars_{key}")
                .transform_filter(f"isValid(datum.{u})")
                .transform_calculate(hue=hue, **ends)
                .mark_rule(stroke=HUE, opacity=0.6, strokeWidth=1, clip=True, tooltip=None)
                .encode(**places)
            )
    tips = [alt.Tooltip("code:N", title="run"),
            alt.Tooltip("x_text:N", title=plane.x_label), alt.Tooltip("y_text:N", title=plane.y_label)]
    encoding = dict(x=plane.across("x"), y=plane.up("y"))
    if names:
        legend = alt.Legend(columns=legend_columns(names, plane.width), symbolStrokeWidth=0.5)
        # equal field, domain and title: Vega-Lite then draws one legend for both channels
        encoding["fill"] = alt.Fill("group:N", title=group, legend=legend,
                                    scale=alt.Scale(domain=names, range=list(hues.values())))
        encoding["shape"] = alt.Shape("group:N", title=group, legend=legend,
                                      scale=alt.Scale(domain=names, range=[s.shape for s in looks.values()]))
        tips.append(alt.Tooltip("group:N", title=group))
    if several:
        encoding["size"] = alt.Size("n:Q", legend=None, scale=alt.Scale(
            type="log", domain=[1, int(shown["n"].max())], range=[16, 110]))
        tips.append(alt.Tooltip("n:Q", title="runs"))
    size = 64 if len(shown) < 250 else 44 if len(shown) < 1500 else 30
    # a hair of ink around each mark keeps yellow on paper and blue on dark ground legible
    look = dict(stroke=paper(plane.dark).ink, strokeWidth=0.5, strokeOpacity=0.7, fillOpacity=0.85, clip=True)
    if not names:
        look["fill"] = plain
    pick = alt.selection_point(name="pick", fields=["code"], nearest=True, toggle=False)
    layers.append(
        alt.Chart(data, name="runs").mark_point(size=alt.Undefined if several else size, **look)
        .encode(tooltip=tips, **encoding).add_params(pick)
    )
    return layers


def looks_of(names: list[str], dark: bool) -> dict[str, Series]:
    """Colour and shape of each group, in the legend's order."""
    looks = [*series(dark)[: len(names)]]
    if OTHER in names:
        looks[-1] = other_series(dark)
    return dict(zip(names, looks, strict=True))


def legend_columns(names: list[str], width: int) -> int:
    """How many names of a legend stand side by side within a width."""
    widest = max(text_width(n, TITLE_SIZE) for n in names) + 32
    return max(1, min(len(names), int((width - 40) / widest)))


def mark_table(plane: Plane, shown: pd.DataFrame, u_x: str, u_y: str, bars: bool) -> pd.DataFrame:
    """The rows behind the marks, and only the columns they need.

    x, y to five digits and, where known, u_x, u_y (bars), x_text, y_text (as written), code, group, n.
    A frame, because altair walks through lists value by value and Streamlit sends frames in binary.
    """
    counts = shown["n"].tolist() if "n" in shown.columns else [1] * len(shown)

    def column(key):
        return shown[key].tolist() if key in shown.columns else [None] * len(shown)

    table = {"x": [short(v) for v in column(plane.x)], "y": [short(v) for v in column(plane.y)]}
    for name, u in (("u_x", u_x), ("u_y", u_y)):
        if bars and u in shown.columns:
            table[name] = [float(f"{v:.3g}") if n == 1 and v is not None and 0 < v < np.inf else np.nan
                           for v, n in zip(column(u), counts, strict=True)]
    for name, key in (("x_text", plane.x), ("y_text", plane.y)):
        table[name] = [written(v, u if n == 1 else None)
                       for v, u, n in zip(column(key), column(f"u_{key}"), counts, strict=True)]
    for name, key in (("code", "code"), ("group", "_group"), ("n", "n")):
        if key in shown.columns:
            table[name] = column(key)
    return pd.DataFrame(table)
