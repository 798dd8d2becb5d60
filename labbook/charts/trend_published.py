"""Published points on the trend: hollow diamonds in ink over the marks, named and cited, no runs."""

from collections.abc import Mapping

import altair as alt
import numpy as np
import pandas as pd

from labbook.charts.palette import SMALL_SIZE, paper, text_width
from labbook.charts.trend_layers import Plane, bar_ends, inline, short
from labbook.errors import Refusal
from labbook.registry.written import written

MOST_POINTS = 1000
SIZE = 150  # square pixels; larger than a run's mark
REACH = 8  # pixels from a point's middle to its name
SIDES = {"right": ("left", REACH, 0), "above": ("center", 0, -REACH - 6), "below": ("center", 0, REACH + 6),
         "left": ("right", -REACH, 0)}  # fmt: skip
NO_RUN = ""  # a point's `code`: empty, where a mark of several runs has none


def drawable_points(
    published: pd.DataFrame | None, *, x: str, y: str, log_x: bool, log_y: bool
) -> tuple[pd.DataFrame, dict[str, int]]:
    """The published points that have a place on the axes, and {reason: points} for the others.

    published: columns series, citation, x, y and, where known, u_x, u_y under the keys' names;
    attrs['lost'], {reason: points}, holds those that had no value before. Of more than MOST_POINTS each
    second, third, ... is drawn. Errors: Refusal where the frame lacks a column.
    """
    if published is None:
        return pd.DataFrame({column: [] for column in ("series", "citation", x, y)}), {}
    for column in ("series", "citation", x, y):
        if column not in published.columns:
            raise Refusal("published", column, "the frame of published points has no such column")
    left_out = dict(published.attrs.get("lost", {}))
    shown = published
    for key, log in ((x, log_x), (y, log_y)):
        value = shown[key].to_numpy(dtype=float)
        reasons = [(~np.isfinite(value), f"without {key}")]
        reasons += [(value <= 0, f"{key} zero or negative on a log axis")] if log else []
        for which, reason in reasons:
            if which.any():
                left_out[reason] = left_out.get(reason, 0) + int(which.sum())
        shown = shown[~np.logical_or.reduce([which for which, _ in reasons])]
    step = max(1, -(-len(shown) // MOST_POINTS))
    if step > 1:
        few = shown.iloc[::step]
        left_out[f"only one in {step} is"] = len(shown) - len(few)
        shown = few
    return shown, left_out


def point_layers(plane: Plane, shown: pd.DataFrame, runs: pd.DataFrame, *, bars: bool) -> list[alt.Chart]:
    """Thin bars held inside the frame, the diamonds on a halo of ground, and a name beside each series."""
    if shown.empty:
        return []
    colours, data, layers = paper(plane.dark), inline(_rows(plane, shown)), []
    at = dict(x=plane.across("x"), y=plane.up("y"))
    for key, u, domain in (("x", "u_x", plane.x_domain), ("y", "u_y", plane.y_domain)):
        along = dict(x=plane.across("x0"), x2="x1", y=plane.up("y"))
        upward = dict(x=plane.across("x"), y=plane.up("y0"), y2="y1")
        if bars:
            layers.append(
                alt.Chart(data, name=f"published_bars_{key}")
                .transform_filter(f"isValid(datum.{u})")
                .transform_calculate(**bar_ends(domain, key, u))
                .mark_rule(color=colours.ink, strokeWidth=1, clip=True, tooltip=None)
                .encode(**(along if key == "x" else upward))
            )
    diamond = dict(shape="diamond", filled=False, size=SIZE, opacity=1, clip=True)
    tips = [alt.Tooltip("series:N", title="published, not a run"), alt.Tooltip("citation:N", title="in"),
            alt.Tooltip("x_text:N", title=plane.x_label), alt.Tooltip("y_text:N", title=plane.y_label)]  # fmt: skip
    layers += [
        alt.Chart(data, name="published_halo")
        .mark_point(stroke=colours.ground, strokeWidth=3.4, strokeOpacity=0.8, tooltip=None, **diamond)
        .encode(**at),
        # its tooltip makes it take the touch, which would else open the nearest run
        alt.Chart(data, name="published").mark_point(stroke=colours.ink, strokeWidth=1.6, **diamond)
        .encode(tooltip=tips, **at),
    ]  # fmt: skip
    return layers + _names(plane, named_places(plane, shown, runs))


def _rows(plane: Plane, shown: pd.DataFrame) -> list[dict]:
    def u(row, key):
        value = row.get(f"u_{key}")
        return value if value is not None and np.isfinite(value) and value > 0 else None

    return [
        {"x": short(row[plane.x]), "y": short(row[plane.y]), "u_x": u(row, plane.x), "u_y": u(row, plane.y),
         "x_text": written(row[plane.x], u(row, plane.x)), "y_text": written(row[plane.y], u(row, plane.y)),
         "series": row["series"], "citation": row["citation"], "code": NO_RUN}
        for row in shown.to_dict("records")
    ]  # fmt: skip


def named_places(plane: Plane, shown: pd.DataFrame, runs: pd.DataFrame) -> list[dict]:
    """Where each series' name stands: x, y, name and the side of that point; a name without room has no row.

    Right, above, below or left of a point, in the frame, on no other published point and on no other name; of
    such places the one that hides fewest of the runs' marks (columns x, y), the rightmost point's first.
    """
    # on a page the axes and the legend come off the chart's size
    width, height = max(plane.width - 60, 1), max(plane.height - 80, 1)
    (across, down), marks = (
        (width * _share(t[plane.x], plane.x_domain, plane.log_x),
         height * (1.0 - _share(t[plane.y], plane.y_domain, plane.log_y))) for t in (shown, runs)
    )  # fmt: skip
    series, found = shown["series"].to_numpy(), []
    taken = [
        (i, (px - 7, py - 7, px + 7, py + 7)) for i, (px, py) in enumerate(zip(across, down, strict=True))
    ]
    for name in dict.fromkeys(series):
        mine = [i for i in np.argsort(-across, kind="stable") if series[i] == name]
        need = text_width(name, SMALL_SIZE)
        options = [(side, i, box) for side in SIDES for i in mine
                   if _free(box := _box(side, across[i], down[i], need), i, taken, width, height)]  # fmt: skip
        if options:
            side, i, box = min(options, key=lambda option: _hidden(option[2], *marks))
            taken.append((-1, box))
            row = shown.iloc[i]
            found.append({"x": short(row[plane.x]), "y": short(row[plane.y]), "name": name, "side": side})
    return found


def _share(values, domain: tuple[float, float], log: bool) -> np.ndarray:
    values, (low, high) = np.asarray(values, dtype=float), domain
    return np.log(values / low) / np.log(high / low) if log else (values - low) / (high - low)


def _box(side: str, px: float, py: float, need: float) -> tuple[float, float, float, float]:
    align, dx, dy = SIDES[side]
    left = px + dx - {"left": 0.0, "center": need / 2, "right": need}[align]
    return left, py + dy - SMALL_SIZE / 2, left + need, py + dy + SMALL_SIZE / 2


def _free(box, point: int, taken, width: float, height: float) -> bool:
    """Whether a name's box lies in the frame and on nothing but its own point."""
    left, top, right, bottom = box
    inside = left >= 0 and right <= width and top >= 0 and bottom <= height
    return inside and not any(
        left < r and l < right and top < b and t < bottom for j, (l, t, r, b) in taken if j != point
    )


def _hidden(box, across: np.ndarray, down: np.ndarray) -> int:
    """How many marks lie under a box, a mark's half width around it."""
    left, top, right, bottom = box
    inside = (across > left - 3) & (across < right + 3) & (down > top - 3) & (down < bottom + 3)
    return int(inside.sum())


def _names(plane: Plane, places: list[dict]) -> list[alt.Chart]:
    """The names in ink, each over a halo of ground so that it stays legible over marks."""
    colours, layers = paper(plane.dark), []
    looks = (("halo", dict(color=colours.ground, stroke=colours.ground, strokeWidth=3, opacity=0.75)),
             ("names", dict(color=colours.ink)))  # fmt: skip
    for side, (align, dx, dy) in SIDES.items():
        rows = [row for row in places if row["side"] == side]
        for kind, look in looks if rows else ():
            layers.append(
                alt.Chart(inline(rows), name=f"published_{kind}_{side}")
                .mark_text(align=align, baseline="middle", dx=dx, dy=dy, fontSize=SMALL_SIZE, fontStyle="italic",
                           text=alt.expr("datum.name"), tooltip=None, clip=True, **look)
                .encode(x=plane.across("x"), y=plane.up("y"))
            )  # fmt: skip
    return layers


def point_words(shown: pd.DataFrame, left_out: Mapping[str, int], bars: bool = True) -> list[str]:
    """The sentences under the chart: each series with its citation, and the points not drawn and why."""
    said = []
    if len(shown):
        named = shown.groupby(["series", "citation"], sort=False).size()
        told = "; ".join(f"{series} ({citation}), {_points(n)}" for (series, citation), n in named.items())
        mark = "Hollow diamonds, with bars of their u," if bars else "Hollow diamonds"
        said.append(f"{mark} are published, not runs: {told}")
    total = sum(left_out.values())
    if total:
        why = [f"{n} {reason}" if len(left_out) > 1 else reason for reason, n in left_out.items()]
        said.append(f"{_points(total, 'published ')} not drawn: {', '.join(why)}")
    return said


def _points(number: int, what: str = "") -> str:
    return f"{number} {what}point{'' if number == 1 else 's'}"
