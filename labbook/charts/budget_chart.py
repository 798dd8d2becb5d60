"""An uncertainty budget as bars: the run's own sources solid, shared ones striped, the shares in numbers."""

import math
from collections.abc import Mapping, Sequence

import altair as alt

from labbook.charts.palette import LABEL_SIZE, SMALL_SIZE, paper, text_width, theme
from labbook.charts.trend_layers import inline, short

HEADING, ROW = 24, 29  # pixels that a heading and a source take
BAR = 8  # height of a bar
LEAST = 0.005  # of the variance: smaller sources of a group share one row
STRIPES = [3, 2]  # pixels drawn and left out along a shared bar


def share_in_words(share: float) -> str:
    """A share of the variance as printed: '59 %', '0.3 %', 'below 0.1 %'."""
    per_cent = 100 * share
    if per_cent < 0.05:
        return "below 0.1 %"
    return f"{per_cent:.0f} %" if per_cent >= 0.95 else f"{per_cent:.1f} %"


def budget_chart(
    rows: Sequence[Mapping], dark: bool = False, *, width: int | str = "container"
) -> alt.LayerChart:
    """Bars of what each source brings to the variance of one number, the whole width being all of it.

    rows: name; own, whether the source belongs to the run alone; share of the variance (0 to 1), the largest
    first. Small sources of a group share one row. Names are cut where the chart is too narrow for them.
    """
    parts: dict[str, list[dict]] = {"headings": [], "names": [], "solid": [], "striped": []}
    top = 0
    for belongs_to_run, heading in ((True, "this run's own"), (False, "shared with other runs")):
        group = _gathered([row for row in rows if row["own"] is belongs_to_run])
        total = share_in_words(math.fsum(row["share"] for row in group)) if group else "nothing"
        parts["headings"].append(_line(heading, total, top + HEADING / 2))
        top += HEADING
        for row in group:
            bar = {"share": short(row["share"]), "none": 0, "top": top + 17, "bottom": top + 17 + BAR,
                   "middle": top + 17 + BAR / 2}  # fmt: skip
            parts["solid" if belongs_to_run else "striped"].append(bar)
            parts["names"].append(_line(row["name"], share_in_words(row["share"]), top + 8))
            top += ROW
    chart = _layers(parts, top, dark).properties(width=width, height=top, padding=0)
    return chart.configure(**theme(dark))


def _line(name: str, text: str, at: float) -> dict:
    """A name at left and a text at right, with the room that the text takes from the name."""
    return {"name": name, "text": text, "at": at, "taken": text_width(text) + 8}


def _gathered(rows: list[Mapping]) -> list[Mapping]:
    """The rows, small ones in a last one together."""
    small = [row for row in rows if row["share"] < LEAST]
    if len(small) < 2:
        return rows
    together = {"name": f"{len(small)} smaller ones", "share": math.fsum(row["share"] for row in small)}
    return [row for row in rows if row["share"] >= LEAST] + [together]


def _layers(parts: dict[str, list[dict]], height: int, dark: bool) -> alt.LayerChart:
    colours = paper(dark)
    across = dict(scale=alt.Scale(domain=[0, 1], nice=False, zero=False), axis=None)
    down = dict(scale=alt.Scale(domain=[height, 0], nice=False, zero=False), axis=None)

    def chart(part, name):
        return alt.Chart(inline(parts[part]), name=f"budget_{name}")

    def text(part, field, name, align, **look):
        end = alt.value(0) if align == "left" else alt.value("width")
        room = {"limit": alt.expr("width - datum.taken")} if align == "left" else {}
        marks = chart(part, name).mark_text(align=align, baseline="middle", tooltip=None, **look, **room)
        return marks.encode(x=end, y=alt.Y("at:Q", **down), text=f"{field}:N")

    headed = dict(color=colours.ink, fontSize=LABEL_SIZE, fontWeight="bold")
    plain = dict(color=colours.ink, fontSize=SMALL_SIZE)
    frames = [{**bar, "all": 1} for bar in (*parts["solid"], *parts["striped"])]
    return alt.layer(
        alt.Chart(inline(frames), name="budget_whole").mark_rect(fill=colours.grid, tooltip=None)
        .encode(x=alt.X("none:Q", **across), x2="all:Q", y=alt.Y("top:Q", **down), y2="bottom:Q"),
        chart("solid", "own").mark_rect(fill=colours.accent, tooltip=None)
        .encode(x=alt.X("none:Q", **across), x2="share:Q", y=alt.Y("top:Q", **down), y2="bottom:Q"),
        chart("striped", "shared")
        .mark_rule(stroke=colours.ink, strokeWidth=BAR, strokeDash=STRIPES, tooltip=None)
        .encode(x=alt.X("none:Q", **across), x2="share:Q", y=alt.Y("middle:Q", **down)),
        text("headings", "name", "headings", "left", **headed),
        text("headings", "text", "totals", "right", **headed),
        text("names", "name", "names", "left", **plain),
        text("names", "text", "shares", "right", **plain),
    )  # fmt: skip
