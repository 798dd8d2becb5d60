"""Beside the tail in the picture of a beat: predicted and measured excursion of its tip, with their words."""

from dataclasses import dataclass

import altair as alt

from labbook.charts.beat_frame import BAR, EDGE, Frame
from labbook.charts.drawings import scale_length, written_length
from labbook.charts.palette import SMALL_SIZE, Paper, text_width
from labbook.charts.trend_layers import inline

BESIDE = 18  # pixels from bar to bar
FIRST = 11  # pixels from the tip to the first bar
LINE = SMALL_SIZE + 5  # pixels from line to line


@dataclass(frozen=True)
class Tip:
    """An excursion of the tip, peak to peak, m, with its words; u: None where none was stated."""

    size: float
    words: str
    u: float | None = None


def room_for(tips: list[Tip]) -> float:
    """Pixels that bars and words take at the right."""
    return BESIDE * len(tips) + max((text_width(tip.words, SMALL_SIZE) for tip in tips), default=0) + EDGE


def tip_layers(frame: Frame, length: float, tips: dict[str, tuple[Tip, str]]) -> list[alt.Chart]:
    """A bar with ends for each tip, its u at both ends; tips: name -> (tip, colour), in their order."""
    layers, at = [], float(frame.x(length)) + FIRST
    for name, (tip, colour) in tips.items():
        ends = [frame.axis + side * tip.size / 2 * frame.per_metre for side in (-1, 1)]
        layers.append(
            alt.Chart(inline([{"x": at, "low": ends[0], "high": ends[1]}]), name=name)
            .mark_rule(stroke=colour, strokeWidth=2.4, tooltip=None)
            .encode(x=frame.across("x"), y=frame.up("low"), y2="high")
        )
        layers.append(
            alt.Chart(inline([{"x": at, "y": end} for end in ends]), name=f"{name}_ends")
            .mark_tick(color=colour, orient="horizontal", size=9, thickness=2, tooltip=None)
            .encode(x=frame.across("x"), y=frame.up("y"))
        )
        half = (tip.u or 0.0) / 2 * frame.per_metre  # each end may lie half of u further in or out
        if half > 0:
            spread = [{"x": at, "low": end - half, "high": end + half} for end in ends]
            layers.append(
                alt.Chart(inline(spread), name=f"{name}_u")
                .mark_rule(stroke=colour, strokeWidth=7, opacity=0.35, tooltip=None)
                .encode(x=frame.across("x"), y=frame.up("low"), y2="high")
            )
        at += BESIDE
    return layers


def texts(frame: Frame, length: float, tips: dict[str, tuple[Tip, str]], colours: Paper) -> alt.Chart:
    """The words of the tips at the right of their bars, and of the scale bar."""
    bar = scale_length(length / 3)
    first = {"x": EDGE + bar * frame.per_metre + 8, "y": BAR}
    rows = [first | {"text": written_length(bar), "colour": colours.ink}]
    at = float(frame.x(length)) + FIRST + BESIDE * (len(tips) - 1) + 9
    for i, (tip, colour) in enumerate(tips.values()):
        up = frame.axis + (len(tips) - 1 - 2 * i) * LINE / 2
        rows.append({"x": at, "y": up, "text": tip.words, "colour": colour})
    return (
        alt.Chart(inline(rows), name="texts")
        .mark_text(
            align="left", baseline="middle", fontSize=SMALL_SIZE, color={"expr": "datum.colour"}, tooltip=None
        )
        .encode(x=frame.across("x"), y=frame.up("y"), text="text:N")
    )
