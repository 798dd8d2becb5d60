"""The strips: per number one log axis with regimes, a tick per earlier run, the new value and its bar."""

import math
from collections.abc import Mapping, Sequence

import altair as alt
import numpy as np

from labbook.charts import axes
from labbook.charts.bands import Band, bands_of, limits_of
from labbook.charts.palette import (
    BAND_OPACITY,
    SMALL_SIZE,
    TITLE_SIZE,
    paper,
    text_width,
    theme,
)
from labbook.registry.catalogue import NUMBERS, Number

PARTS = ("areas", "names", "limits", "ticks", "bars", "dots", "texts", "absent", "symbols")
ROW = 46  # pixels from one strip to the next
STRIP = 18  # height of a strip
MOST_TICKS = 300  # places for ticks along a strip: closer ones fall together
NEAR_LIMIT, FAR_LIMIT = 1.3, 2.6  # decades: limits shown beside the values; a lone one, farther off
BEYOND = 0.3  # decades shown beyond the outermost value or limit


def strip_domain(key: str, values: np.ndarray, regimes=None) -> tuple[float, float]:
    """Low and high of a strip: its positive values, the nearest regime limit each side, and some more."""
    values = np.asarray(values, dtype=float)
    values = values[np.isfinite(values) & (values > 0)]
    limits = [v for v in limits_of(key, regimes) if v > 0]
    if not values.size:
        values = np.array(limits or [0.1, 10.0])
    low, high = math.log10(values.min()), math.log10(values.max())
    marks = [math.log10(v) for v in limits]
    near = [v for v in marks if low - NEAR_LIMIT < v < high + NEAR_LIMIT]
    near = near or [v for v in marks if low - FAR_LIMIT < v < high + FAR_LIMIT]
    # beyond the values only the nearest limit on each side; both of a band to one side, such as cruising
    below, above = sorted(v for v in near if v < low), sorted(v for v in near if v > high)
    low = min([low, *(below[-1:] if above or len(below) < len(near) else below)])
    high = max([high, *(above[:1] if below or len(above) < len(near) else above)])
    return 10 ** (low - BEYOND), 10 ** (high + BEYOND)


def strips(
    rows: Sequence[Mapping],
    dark: bool = False,
    *,
    width: int | str = "container",
    numbers: Mapping[str, Number] = NUMBERS,
    regimes=None,
) -> alt.LayerChart:
    """One strip per row, from top to bottom, with the number's symbol at left and its written value at right.

    rows: key; earlier, values of earlier runs (array, NaN allowed); value and its standard uncertainty u
    (None or NaN where absent); written, the value as text. The rust bar spans 2 u either side (95 %).
    Signed values stand at their size: a negative one is marked 'by size' below its written value, and zero
    has no place on a log axis. The band of the value is always named, the others
    where their names fit, whatever the width turns out to be.
    """
    parts: dict[str, list[dict]] = {k: [] for k in PARTS}
    for position, row in enumerate(rows):
        _lay(parts, position, row, dark, numbers, regimes)
    height = max(len(rows), 1) * ROW
    colours = paper(dark)
    across = dict(scale=alt.Scale(domain=[0, 1], nice=False, zero=False), axis=None)
    down = dict(scale=alt.Scale(domain=[height, 0], nice=False, zero=False), axis=None)

    def x(field):
        return alt.X(f"{field}:Q", **across)

    def y(field):
        return alt.Y(f"{field}:Q", **down)

    def chart(part, name=""):
        return alt.Chart(alt.InlineData(values=parts[part]), name=f"strip_{name or part}")

    small = dict(fontSize=SMALL_SIZE, baseline="top", tooltip=None)
    fits = "width > datum.wide ? datum.text : ''"
    layers = [
        chart("areas").mark_rect(fill={"expr": "datum.hue"}, opacity=BAND_OPACITY, tooltip=None)
        .encode(x=x("low"), x2="high", y=y("top"), y2="bottom"),
        chart("ticks").mark_rule(color=colours.ink, opacity=0.45, strokeWidth=1, tooltip=None)
        .encode(x=x("place"), y=y("top"), y2="bottom"),
        chart("bars").mark_rule(color=colours.rust, strokeWidth=3.5, tooltip=None)
        .encode(x=x("low"), x2="high", y=y("middle")),
        chart("dots").mark_point(shape="circle", fill=colours.rust, stroke=colours.ground, strokeWidth=1.2,
                                 size=120, opacity=1, tooltip=None)
        .encode(x=x("place"), y=y("middle")),
        chart("names").mark_text(color=colours.muted, text=alt.expr(fits), **small)
        .encode(x=x("place"), y=y("bottom")),
        chart("limits").mark_text(color=colours.muted, opacity=0.85, text=alt.expr(fits), **small)
        .encode(x=x("place"), y=y("bottom")),
    ]
    bold = dict(fontSize=TITLE_SIZE, fontWeight="bold", tooltip=None)
    layers += [
        chart("symbols").mark_text(align="right", color=colours.ink, dx=-12, **bold)
        .encode(x=alt.value(0), y=y("middle"), text="symbol:N"),
        chart("texts").mark_text(align="left", color=colours.rust, dx=10, lineBreak="\n", **bold)
        .encode(x=alt.value("width"), y=y("middle"), text="written:N"),
        chart("absent")
        .mark_text(align="left", color=colours.muted, dx=10, lineBreak="\n", fontSize=SMALL_SIZE)
        .encode(x=alt.value("width"), y=y("middle"), text="written:N"),
        chart("texts", "notes").mark_text(align="left", color=colours.muted, dx=10, dy=STRIP / 2 + 3, **small)
        .encode(x=alt.value("width"), y=y("middle"), text="note:N"),
    ]
    return alt.layer(*layers).properties(width=width, height=height).configure(**theme(dark))


def _lay(parts, position, row, dark, numbers, regimes) -> None:
    """Put one strip's pieces, placed from 0 to 1 along it, into the lists that the layers draw."""
    key, value, u = row["key"], row.get("value"), row.get("u")
    value = None if value is None or not math.isfinite(value) else float(value)
    u = None if u is None or not math.isfinite(u) or u <= 0 else float(u)
    earlier = np.abs(np.asarray(row.get("earlier", ()), dtype=float))
    low, high = strip_domain(key, np.append(earlier, [] if value is None else abs(value)), regimes)

    def place(v):
        share = math.log(max(v, low) / low) / math.log(high / low)
        return round(min(max(share, 0.0), 1.0), 4)

    top = position * ROW + 4
    at = {"top": top, "bottom": top + STRIP, "middle": top + STRIP / 2}
    below = at["bottom"] + 3
    bands = bands_of(key, low, high, regimes)
    free, grey = low, paper(dark).grey
    for band in bands:
        if band.low > free:
            parts["areas"].append({"low": place(free), "high": place(band.low), "hue": grey, **at})
        parts["areas"].append({"low": place(band.low), "high": place(band.high), "hue": band.hue, **at})
        free = max(free, band.high)
    if free < high:
        parts["areas"].append({"low": place(free), "high": 1, "hue": grey, **at})
    # bands hold on the signed value: a negative one stands by size among them but belongs to none
    names, limits = strip_labels(bands, value if value and value > 0 else None, low, high, place)
    parts["names"] += [dict(name, bottom=below) for name in names]
    parts["limits"] += [dict(limit, bottom=below) for limit in limits]
    seen = {round(place(v) * MOST_TICKS) / MOST_TICKS for v in earlier[np.isfinite(earlier) & (earlier > 0)]}
    parts["ticks"] += [{"place": round(p, 4), "top": at["top"] + 2, "bottom": at["bottom"] - 2}
                       for p in sorted(seen)]
    note = ""
    if value is not None and value != 0:
        parts["dots"].append({"place": place(abs(value)), "middle": at["middle"]})
        if u is not None:
            parts["bars"].append({"low": place(abs(value) - 2 * u), "high": place(abs(value) + 2 * u),
                                  "middle": at["middle"]})
        note = "by size" if value < 0 else ""
    elif value == 0:
        note = "zero: not drawn"
    written = "\n".join(axes.title_lines(row.get("written", ""), 14))
    text = {"written": written, "note": note, "middle": at["middle"]}
    parts["absent" if value is None else "texts"].append(text)
    symbol = axes.label(key, numbers)
    parts["symbols"].append({"symbol": key if "/" in symbol else symbol, "middle": at["middle"]})


def strip_labels(bands: list[Band], value: float | None, low: float, high: float, place) -> tuple[list, list]:
    """Names and printed limits below a strip: text, place from 0 to 1, least width of strip that shows it.

    The name of the band that holds the value always shows, and whatever would touch it does not. Other names
    show where their band is wider than they are, limits where they touch no name. Without bands two ticks
    of the axis are printed.
    """
    if not bands:
        ends = [v for v in axes.log_ticks(low, high) if 0.04 < place(v) < 0.96]
        ends = [ends[0], ends[-1]] if len(ends) > 1 else ends
        return [], [{"place": place(v), "text": axes.tick_label(v), "wide": 120} for v in ends]
    names, held = [], None
    for i, band in enumerate(bands):
        # a name may spill over grey ground beside its band, but not over the next band
        left = place(bands[i - 1].high) if i else 0.0
        right = place(bands[i + 1].low) if i + 1 < len(bands) else 1.0
        middle = (place(band.low) + place(band.high)) / 2
        room = max(2 * min(middle - left, right - middle), 1e-6)
        name = {"place": middle, "text": band.name, "wide": (text_width(band.name, SMALL_SIZE) + 6) / room}
        if held is None and value is not None and band.regime.holds(value):
            held = name | {"place": min(max(middle, 0.12), 0.88), "wide": 0}
            name = held
        names.append(name)
    inner = sorted({v for b in bands for v, own in ((b.low, b.own_low), (b.high, b.own_high)) if own})
    limits = [{"place": place(v), "text": axes.tick_label(v), "wide": 0} for v in inner]
    for limit in limits:
        limit["wide"] = max(_clear_of(limit, name) for name in names)
    for name in names:
        if held is not None and name is not held:
            name["wide"] = max(name["wide"], _clear_of(name, held))
    return names, limits


def _clear_of(one: dict, other: dict) -> float:
    """The width of the strip from which two labels do not touch."""
    need = (text_width(one["text"], SMALL_SIZE) + text_width(other["text"], SMALL_SIZE)) / 2 + 4
    return need / max(abs(one["place"] - other["place"]), 1e-6)
