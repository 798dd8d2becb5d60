"""Picture of a predicted beat to scale: envelope and frames of tail and head, with the tip's excursion."""

import math
from collections.abc import Mapping

import altair as alt
import numpy as np

from labbook.charts.beat_frame import Frame, frame_for, scale_bar
from labbook.charts.beat_tips import Tip, room_for, texts, tip_layers
from labbook.charts.palette import NO_PADDING, Paper, paper, theme
from labbook.charts.trend_layers import inline
from labbook.errors import Refusal
from labbook.physics.tail_shapes import TailShape

THINNEST, GHOST = 1.2, 1.4  # pixels: the tail that moves at least, the lines of the frames
CIRCLE = np.linspace(0.0, 2.0 * math.pi, 41)
FAINTEST, STRONGEST = 0.12, 0.62  # opacity of the frames, the oldest and the newest
PHASE = "phase"


def beat_chart(
    beat: TailShape, swimmer: Mapping, *, unit: float, head: float = 0.0, predicted: Tip | None = None,
    measured: Tip | None = None, dark: bool = False, width: int = 460,
) -> alt.LayerChart:  # fmt: skip
    """One beat of a tail from the side, head at left, at one scale in both directions.

    beat: as tail_shapes.shape gives it; unit: metres of its displacements, L_tail theta0 or h0; head: from
    the head's centre to the tail over L_tail, 0 for a held base, which is drawn without one. swimmer: L_tail
    and, where known, b, b_long and thickness, SI. A slider moves the dark tail through the beat in the
    browser. Errors: Refusal without L_tail or a finite beat.
    """
    L = _length(swimmer, "L_tail")
    if not L > 0 or not np.isfinite(beat.envelope).all():
        raise Refusal("beat", None, "has no tail to draw", "give L_tail, and a beat of finite size")
    across = _length(swimmer, "b") if head else 0.0
    along = (_length(swimmer, "b_long") or across) if head else 0.0
    colours, centre = paper(dark), unit * (beat.amplitude[0] - head * beat.angle)
    tips = {"predicted_tip": (predicted, colours.ink), "measured_tip": (measured, colours.rust)}
    tips = {name: (tip, colour) for name, (tip, colour) in tips.items() if tip is not None}
    sizes = [tip.size / 2 for tip, _ in tips.values()]
    reach = max(unit * float(beat.envelope.max()), across + abs(centre) if head else 0.0, *sizes, 0.0)
    room = room_for([tip for tip, _ in tips.values()])
    frame = frame_for(ahead=head * L + along, length=L, reach=reach, room=room, width=width)
    outline = frame.x(-head * L + along * np.cos(CIRCLE)), across * np.sin(CIRCLE)
    thick = max(THINNEST, _length(swimmer, "thickness") * frame.per_metre)
    layers = [
        _envelope(frame, beat, L, unit, colours),
        _frames(frame, beat, L, unit, outline if across else None, colours),
        *([_moving_head(frame, centre, outline, colours)] if across else []),
        _moving_tail(frame, beat, L, unit, thick, colours),
        *tip_layers(frame, L, tips),
        scale_bar(frame, L, colours),
        texts(frame, L, tips, colours),
    ]
    slider = alt.binding_range(min=0, max=360, step=5, name="phase of the beat, °  ")
    chart = alt.layer(*layers).add_params(alt.param(name=PHASE, value=0, bind=slider))
    return chart.properties(width=width, height=frame.height, padding=NO_PADDING).configure(**theme(dark))


def _length(swimmer: Mapping, key: str) -> float:
    value = swimmer.get(key)
    return 0.0 if value is None or not np.isfinite(value) else float(value)


def _points(x, y, **more) -> list[dict]:
    return [
        {"x": round(float(a), 2), "y": round(float(b), 2), "step": i, **more}
        for i, (a, b) in enumerate(zip(x, y, strict=True))
    ]


def _envelope(frame: Frame, beat, L, unit, colours: Paper) -> alt.Chart:
    half = unit * beat.envelope
    ends = zip(frame.x(beat.s * L), frame.y(-half), frame.y(half), strict=True)
    rows = [dict(zip(("x", "low", "high"), (round(float(v), 2) for v in row), strict=True)) for row in ends]
    return (
        alt.Chart(inline(rows), name="envelope")
        .mark_area(color=colours.accent, opacity=0.16, line=False, tooltip=None)
        .encode(x=frame.across("x"), y=frame.up("low"), y2="high")
    )


def _frames(frame: Frame, beat, L, unit, outline, colours: Paper) -> alt.Chart:
    """The frames of the beat, the earlier the fainter; the head's outline moves with them."""
    rows, shades = [], np.linspace(FAINTEST, STRONGEST, len(beat.phase))
    for i, (shape, centre, shade) in enumerate(zip(beat.frames, beat.head, shades, strict=True)):
        told = {"shade": round(float(shade), 2)}
        rows += _points(frame.x(beat.s * L), frame.y(unit * shape), part=f"t{i}", **told)
        if outline is not None:
            rows += _points(outline[0], frame.y(unit * centre + outline[1]), part=f"h{i}", **told)
    return (
        alt.Chart(inline(rows), name="frames")
        .mark_line(
            stroke=colours.muted, strokeWidth=GHOST, strokeOpacity={"expr": "datum.shade"}, tooltip=None
        )
        .encode(x=frame.across("x"), y=frame.up("y"), detail="part:N", order="step:Q")
    )


def _turned(start: str) -> str:
    """Where a point is at the slider's phase, worked out in the browser."""
    return f"{start} + datum.re * cos({PHASE} * PI / 180) - datum.im * sin({PHASE} * PI / 180)"


def _phasor(z) -> dict[str, float]:
    return {"re": float(f"{z.real:.5g}"), "im": float(f"{z.imag:.5g}")}


def _moving_tail(frame: Frame, beat, L, unit, thick: float, colours: Paper) -> alt.Chart:
    rows = [
        {"x": round(float(x), 2), "step": i} | _phasor(unit * frame.per_metre * z)
        for i, (x, z) in enumerate(zip(frame.x(beat.s * L), beat.amplitude, strict=True))
    ]
    return (
        alt.Chart(inline(rows), name="tail")
        .transform_calculate(now=_turned(f"{frame.axis:.2f}"))
        .mark_line(stroke=colours.ink, strokeWidth=thick, tooltip=None)
        .encode(x=frame.across("x"), y=frame.up("now"), order="step:Q")
    )


def _moving_head(frame: Frame, centre: complex, outline, colours: Paper) -> alt.Chart:
    moved = _phasor(centre * frame.per_metre)
    rows = [row | moved for row in _points(outline[0], frame.y(outline[1]))]
    return (
        alt.Chart(inline(rows), name="head")
        .transform_calculate(now=_turned("datum.y"))
        .mark_line(
            interpolate="linear-closed", fill=colours.muted, stroke=colours.ink, strokeWidth=0.8, tooltip=None
        )
        .encode(x=frame.across("x"), y=frame.up("now"), order="step:Q")
    )
