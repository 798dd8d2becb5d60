"""Theory on the trend: bands behind the marks, lines over them, in the colour of their group or in ink."""

import json
from collections.abc import Mapping

import altair as alt
import numpy as np
import pandas as pd

from labbook.charts.palette import TITLE_SIZE, paper, text_width
from labbook.charts.trend_layers import HUE, Plane, inline, short

MOST_POINTS = 240  # of one curve
WIDTH, EDGE = 1.5, 2.5  # pixels: a line, and the thin ink around a coloured one
BAND_OPACITY = 0.22


def theory_bands(plane: Plane, curve: pd.DataFrame, hues: Mapping[str, str]) -> list[alt.Chart]:
    """An area from low to high for each curve that has them; hues: colours of the groups in column family."""
    if not {"low", "high"} <= set(curve.columns):
        return []
    rows = _rows(plane, curve[np.isfinite(curve["low"]) & np.isfinite(curve["high"])], hues)
    if not rows:
        return []
    # on a log axis a lower limit at or below zero lies under the frame
    floor = plane.y_domain[0] / 10 if plane.log_y else -np.inf
    for row in rows:
        row |= {end: short(max(row[end], floor)) for end in ("low", "high")}
    return [
        alt.Chart(inline(rows), name="curve_band")
        .mark_area(fill=HUE, opacity=BAND_OPACITY, clip=True, tooltip=None)
        .encode(x=plane.across("x"), y=plane.up("low"), y2="high", detail="part:N")
    ]


def theory_lines(plane: Plane, curve: pd.DataFrame, hues: Mapping[str, str]) -> list[alt.Chart]:
    """A line for each curve, dashed by its label, with the labels in a legend below."""
    rows = _rows(plane, curve, hues)
    if not rows:
        return []
    colours, data, layers = paper(plane.dark), inline(rows), []
    at = dict(x=plane.across("x"), y=plane.up("y"), detail="part:N")
    # a coloured line keeps its shape among marks of its colour, one in ink stays legible over any
    for coloured, edge, opacity in ((True, colours.ink, 0.6), (False, colours.ground, 0.75)):
        if any(row["coloured"] == coloured for row in rows):
            layers.append(
                alt.Chart(data, name="curve_edge" if coloured else "curve_halo")
                .transform_filter(f"datum.coloured == {json.dumps(coloured)}")
                .mark_line(
                    stroke=edge, strokeWidth=EDGE + (not coloured), opacity=opacity, clip=True, tooltip=None
                )
                .encode(**at)
            )
    labels = _labels(curve)
    dash = alt.Undefined
    if any(labels):
        told = {str(i): _lines(label, plane.width) for i, label in enumerate(labels)}
        legend = alt.Legend(
            orient="bottom",
            columns=1,
            symbolSize=400,
            symbolStrokeColor=colours.muted,
            labelLimit=0,
            labelExpr=f"({json.dumps(told, ensure_ascii=False)})[datum.value]",
        )
        dash = alt.StrokeDash("curve:N", sort=list(told), title=None, legend=legend)
    layers.append(
        alt.Chart(data, name="curve")
        .mark_line(stroke=HUE, strokeWidth=WIDTH, clip=True, tooltip=None)
        .encode(strokeDash=dash, **at)
    )
    return layers


def _labels(curve: pd.DataFrame) -> list[str]:
    return list(dict.fromkeys(curve["label"].astype(str))) if "label" in curve.columns else [""]


def _lines(label: str, width: int) -> list[str]:
    """A label in as many lines as the frame needs: a longer one would push the axes aside."""
    lines = [""]
    for word in label.split():
        wider = f"{lines[-1]} {word}".strip()
        if lines[-1] and text_width(wider, TITLE_SIZE) > width - 80:
            lines.append(word)
        else:
            lines[-1] = wider
    return lines


def _rows(plane: Plane, curve: pd.DataFrame, hues: Mapping[str, str]) -> list[dict]:
    """The points of all curves that have a place on the axes: x, y, low, high, part, curve, hue, coloured."""
    names = [key for key in ("label", "family", "band") if key in curve.columns]
    labels, ink, rows = _labels(curve), paper(plane.dark).muted, []
    parts = curve.groupby(names, sort=False) if names else [((), curve)]
    for i, (_, part) in enumerate(parts):
        told = part.iloc[0] if len(part) else {}
        label, family = str(told.get("label", "")), told.get("family", "")
        part = part[np.isfinite(part["x"]) & np.isfinite(part["y"])]
        for key, log in (("x", plane.log_x), ("y", plane.log_y)):
            part = part[part[key] > 0] if log else part
        part = part.sort_values("x").iloc[:: max(1, -(-len(part) // MOST_POINTS))]
        shared = {
            "part": i,
            "curve": str(labels.index(label)),
            "hue": hues.get(family, ink),
            "coloured": family in hues,
        }
        columns = [key for key in ("x", "y", "low", "high") if key in part.columns]
        rows += [
            {key: short(row[key]) for key in columns} | shared for row in part[columns].to_dict("records")
        ]
    return rows
