"""The group's plot: one number against another across runs, with bars, bands, a curve and the run in hand."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import altair as alt
import numpy as np
import pandas as pd

from labbook.charts import (
    axes,
    drawable,
    trend_boxes,
    trend_layers,
    trend_marks,
    trend_published,
    trend_shared,
    trend_theory,
)
from labbook.charts.bands import bands_of
from labbook.charts.palette import OTHER, series, theme
from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS, Number

BARS = {"own": "u_own_", "shared": "u_shared_", "total": "u_", "none": "",
        trend_shared.SHARED: "u_own_"}  # fmt: skip
SPACE = " "  # in 1 204: a line must not break there


@dataclass(frozen=True)
class Trend:
    """A chart, the number of runs drawn, {reason: runs} left out, and the line that goes below.

    published: the points of others that are drawn beside the runs, and never counted among them.
    """

    chart: alt.LayerChart
    drawn: int
    left_out: dict[str, int]
    caption: str
    published: int = 0


def trend(
    frame: pd.DataFrame,
    *,
    x: str,
    y: str,
    group: str | None = None,
    log_x: bool = True,
    log_y: bool = True,
    bars: str = "own",
    bands: bool = True,
    picked: str | None = None,
    in_hand: Mapping[str, float] | None = None,
    curve: pd.DataFrame | None = None,
    curve_words: Sequence[str] = (),
    dark: bool = False,
    width: int | str = "container",
    height: int = 380,
    x_title: str = "",
    y_title: str = "",
    x_label: str = "",
    y_label: str = "",
    left_out: Mapping[str, int] | None = None,
    numbers: Mapping[str, Number] = NUMBERS,
    regimes=None,
    published: pd.DataFrame | None = None,
) -> Trend:
    """y against x, a mark per run (or per cell of runs), coloured and shaped by `group`.

    frame: one row per run with SI columns x, y, their u_ columns, `code`, `state` and the group's; a column n
    says that a row stands for n runs (binned in the database), and such a row needs no code.
    bars: whose standard uncertainty is drawn, 'own', 'shared', 'total' or 'none'; 'shared band' draws the own
    one and, behind the marks, how far each group's runs may move together (not for binned rows).
    picked: code of the run ringed in rust; in_hand: x, y, u_x, u_y of the new run, a rust dot.
    curve: columns x, y and, where known, low, high (a band), label and family (the group whose colour it has);
    curve_words: sentences about it for the caption.
    x_title, y_title, x_label, y_label: replace the registry's titles and symbols (another dialect).
    left_out: runs the caller already dropped, by reason.
    numbers, regimes: the book's own rows in place of those at birth.
    published: points that others printed, as trend_published.drawable_points takes them.
    The selection parameter 'pick' returns the field `code`.
    Errors: Refusal for an unknown column, key or kind of bars.
    """
    if bars not in BARS:
        raise Refusal("bars", bars, "not a kind of bars", f"one of {', '.join(BARS)}")
    if group is not None and group not in frame.columns:
        raise Refusal("group", group, "the frame has no such column")
    u_x, u_y = f"{BARS[bars]}{x}", f"{BARS[bars]}{y}"
    families = [f"u_shared_{k}" for k in (x, y) if bars == trend_shared.SHARED]
    wanted = ("code", "state", "n", "U", "u_U", x, y, u_x, u_y, f"u_{x}", f"u_{y}", *families, group)
    frame = frame[[c for c in dict.fromkeys(wanted) if c in frame.columns]]
    shown, reasons = drawable.split(frame, x=x, y=y, log_x=log_x, log_y=log_y, numbers=numbers)
    for reason, count in (left_out or {}).items():
        reasons[reason] = reasons.get(reason, 0) + count
    drawn = int(drawable.runs_of(shown).sum())

    names: list[str] = []
    if group is not None:
        named, names = drawable.named_groups(shown[group], drawable.runs_of(shown))
        shown = shown.assign(_group=named)
    ring = shown[shown["code"] == picked].head(1) if picked and "code" in shown.columns else shown.head(0)
    binned = "n" in frame.columns
    if len(shown) > (drawable.MOST_MARKS if binned else drawable.MOST_ROWS):
        shown = drawable.thinned(shown, x=x, y=y, group="_group" if names else None, log_x=log_x, log_y=log_y)

    point = _point_in_hand(in_hand, log_x, log_y)
    beside, not_beside = trend_published.drawable_points(published, x=x, y=y, log_x=log_x, log_y=log_y)
    hand = {"x": [], "y": []} if point is None else {k: [point[k]] for k in ("x", "y")}
    x_values = np.concatenate([shown[x].to_numpy(dtype=float), beside[x].to_numpy(dtype=float), hand["x"]])
    y_values = np.concatenate([shown[y].to_numpy(dtype=float), beside[y].to_numpy(dtype=float), hand["y"]])
    if not x_values.size and curve is not None:
        x_values, y_values = curve["x"].to_numpy(dtype=float), curve["y"].to_numpy(dtype=float)
    x_domain = (axes.log_domain if log_x else axes.linear_domain)(x_values)
    y_domain = (axes.log_domain if log_y else axes.linear_domain)(y_values)
    if bands and bands_of(x, *x_domain, regimes):
        y_domain = _with_headroom(y_domain, log_y)
    plane = trend_layers.Plane(
        x, y, x_domain, y_domain, log_x, log_y,
        x_title or axes.title(x, numbers=numbers), y_title or axes.title(y, numbers=numbers),
        x_label or axes.label(x, numbers), y_label or axes.label(y, numbers), dark,
        width if isinstance(width, int) else trend_layers.NARROWEST, height,
    )
    layers = []
    if bands:
        layers += trend_layers.band_areas(plane, bands_of(x, *plane.x_domain, regimes),
                                          bands_of(y, *plane.y_domain, regimes))
        layers += trend_boxes.box_layers(plane, regimes)
    told: list[str] = []
    if families:
        behind, told = _shared(plane, shown, names, group)
        layers += behind
    hues = {n: s.colour for n, s in trend_marks.looks_of(names, dark).items()}
    if curve is not None and len(curve):
        layers += trend_theory.theory_bands(plane, curve, hues)
    layers += trend_marks.marks(plane, shown, names=names, group=group, u_x=u_x, u_y=u_y, bars=bars != "none")
    if curve is not None and len(curve):  # over the marks, which would hide it where there are many
        layers += trend_theory.theory_lines(plane, curve, hues)
        told += curve_words
    if bands:
        layers += trend_layers.band_names(plane, bands_of(x, *plane.x_domain, regimes),
                                          bands_of(y, *plane.y_domain, regimes))
    layers += trend_published.point_layers(plane, beside, shown, bars=bars != "none")
    if len(ring):
        layers.append(trend_layers.ring(plane, ring.iloc[0]))
    if point is not None:
        layers += trend_layers.in_hand(plane, point)
    chart = alt.layer(*layers).properties(width=width, height=height).configure(**theme(dark))
    largest = int(drawable.runs_of(shown).max(initial=1)) if len(shown) else 1
    barred = bool({u_x, u_y} & set(shown.columns)) and len(shown) > 0
    notes = _notes(bars if barred else "none", largest, names, in_hand is not None and point is None,
                   bool(picked) and not len(ring))
    told += trend_published.point_words(beside, not_beside, bars != "none")
    return Trend(chart, drawn, reasons, caption(drawn, reasons, [*notes, *told]), len(beside))


def _shared(plane: trend_layers.Plane, shown: pd.DataFrame, names: list[str], group) -> tuple[list, list[str]]:
    """The shared bands and what is said of them; a grid of many runs and 'other' groups have none."""
    if "n" in shown.columns:
        return [], ["No shared bands on a grid of many runs: narrow the filter first"]
    if group != "swimmer":
        return [], [trend_shared.ELSEWHERE]
    one_family = shown[shown["_group"] != OTHER] if names else shown
    bands = trend_shared.family_bands(one_family, plane.x, plane.y, one_family["_group"] if names else None)
    hues = {n: s.colour for n, s in trend_marks.looks_of(names, plane.dark).items()}
    told = trend_shared.shared_words(one_family, bands, plane)
    return trend_shared.shared_layers(plane, bands, hues, series(plane.dark)[0].colour), told


def _with_headroom(domain: tuple[float, float], log: bool, share: float = 0.06) -> tuple[float, float]:
    """A domain with room above the marks for the bands' names."""
    low, high = domain
    return (low, high * (high / low) ** share) if log else (low, high + share * (high - low))


def _point_in_hand(in_hand, log_x: bool, log_y: bool):
    """x, y, u_x, u_y of the run in hand, or None where it has no place on the axes."""
    if in_hand is None:
        return None
    point = {k: float(v) for k, v in in_hand.items() if k in ("x", "y", "u_x", "u_y") and v is not None}
    for key, log in (("x", log_x), ("y", log_y)):
        if not np.isfinite(point.get(key, np.nan)) or (log and point[key] <= 0):
            return None
    return point


def counted(number: int, noun: str = "run") -> str:
    """'1 run', '1 204 runs'."""
    return f"{number:,}".replace(",", SPACE) + f" {noun}{'' if number == 1 else 's'}"


def caption(drawn: int, left_out: Mapping[str, int], notes=()) -> str:
    """The line below a chart: runs drawn, runs not drawn and why, and notes."""
    text = f"{counted(drawn)} drawn"
    if left_out:
        reasons = ", ".join(f"{counted(n).rsplit(' ', 1)[0]} {reason}" for reason, n in left_out.items())
        text += f"; {counted(sum(left_out.values())).rsplit(' ', 1)[0]} not drawn: {reasons}"
    return ". ".join([text, *notes]) + "."


def _notes(bars, largest, names, hand_lost, ring_lost) -> list[str]:
    notes = []
    if largest > 1:
        notes.append(f"One mark stands for up to {counted(largest)}, a larger mark for more")
    if bars != "none":
        own = "the run's own part of one"
        kind = {"own": own, trend_shared.SHARED: own, "shared": "the shared part of one", "total": "one"}[bars]
        notes.append(f"Bars: {kind} standard uncertainty" + (", on marks of one run" if largest > 1 else ""))
    if drawable.OTHER in names:
        notes.append("The six groups with most runs are named, the rest are 'other'")
    if hand_lost:
        notes.append("The run in hand has no place on these axes")
    if ring_lost:
        notes.append("The open run is not among the runs drawn")
    return notes
