"""The layers of a plan's map, without spans and rows: zones, lines, runs, and the names along them."""

from functools import lru_cache

import altair as alt

from labbook.charts.palette import LABEL_SIZE, SMALL_SIZE, Paper, paper
from labbook.charts.plan_plane import across, layer_of, template, up

AMBER = "#E69F00"  # Okabe & Ito's orange: warnings have it on every page
LEADER = 12  # pixels from a fluid's line to its name
RING, DONE = 330, 170  # square pixels


@lru_cache(maxsize=2)
def map_layers(dark: bool) -> str:
    """The template of a theme, for plan_plane.spanned."""
    ink = paper(dark)
    layers = [
        *_zone_layers(ink),
        *_line_layers(ink),
        *_dot_layers(ink),
        *_word_layers(ink),
        *_ring_layers(ink),
    ]
    return template(layers, "container", dark)


def _zone_layers(ink: Paper) -> list[alt.Chart]:
    """Amber for what is doubtful, grey and hatched for what is forbidden, each edge a line."""

    def area(name, colour, opacity):
        mark = dict(orient="horizontal", color=colour, opacity=opacity, clip=True, tooltip=None)
        place = dict(y=up("mu"), x=across("low"), x2="high", detail="part:N")
        return layer_of(name).mark_area(**mark).encode(**place)

    rule = dict(clip=True, tooltip=None)
    return [
        area("doubtful", AMBER, 0.20),
        area("forbidden", ink.grey, 0.22),
        layer_of("hatch")
        .mark_rule(color=ink.muted, strokeWidth=0.8, opacity=0.45, **rule)
        .encode(x=across("f"), x2="f2", y=up("mu"), y2="mu2"),
        layer_of("edges")
        .mark_line(color=ink.muted, strokeWidth=1.2, **rule)
        .encode(
            x=across("f"),
            y=up("mu"),
            detail="line:N",
            order="mu:Q",
            strokeDash=alt.condition("datum.verdict == 'forbidden'", alt.value([1, 0]), alt.value([2, 3])),
        ),
    ]


def _line_layers(ink: Paper) -> list[alt.Chart]:
    """Fluids, lines of equal number, and the one that is aimed at."""
    line, edge = dict(clip=True, tooltip=None), alt.value("width")
    return [
        layer_of("fluids")
        .mark_rule(color=ink.ink, strokeWidth=1.0, opacity=0.75, strokeDash=[7, 3], **line)
        .encode(y=up("mu")),
        layer_of("fluid_names")
        .mark_rule(color=ink.muted, strokeWidth=0.8, x2Offset=LEADER - 3, tooltip=None)
        .encode(x=edge, x2=edge, y=up("mu"), y2="at"),
        layer_of("levels")
        .mark_line(color=ink.accent, strokeWidth=1.2, opacity=0.8, **line)
        .encode(x=across("f"), y=up("mu"), detail="line:N", order="mu:Q"),
        layer_of("target")
        .mark_line(color=ink.accent, strokeWidth=3.4, **line)
        .encode(x=across("f"), y=up("mu"), order="mu:Q"),
    ]


def _where() -> dict:
    return dict(x=across("f"), y=up("mu"))


def _tips(first: str = "code:N", title: str = "run") -> list[alt.Tooltip]:
    fluid, f = alt.Tooltip("fluid:N"), alt.Tooltip("f:Q", title="f (Hz)", format=".3g")
    return [alt.Tooltip(first, title=title), fluid, f]


def _dot_layers(ink: Paper) -> list[alt.Chart]:
    """Earlier runs as dots."""
    dot = dict(shape="circle", size=42, filled=True, color=ink.ink, stroke=ink.ground, strokeWidth=0.8)
    return [layer_of("runs").mark_point(**dot, opacity=0.8, clip=True).encode(**_where(), tooltip=_tips())]


def _ring_layers(ink: Paper) -> list[alt.Chart]:
    """Runs that wait on Bench dashed, those proposed numbered, those that were logged from a plan filled."""
    ring = dict(shape="circle", strokeWidth=2.2, opacity=1, clip=True)
    empty = ring | dict(size=RING, fill=ink.ground, stroke=ink.accent)
    return [
        layer_of("waiting")
        .mark_point(**empty, fillOpacity=0.5, strokeDash=[4, 3])
        .encode(**_where(), tooltip=_tips()[1:]),
        layer_of("proposed")
        .mark_point(**empty, fillOpacity=0.85)
        .encode(**_where(), tooltip=_tips("place:N", "proposed")),
        layer_of("proposed", "places")
        .mark_text(color=ink.ink, fontSize=SMALL_SIZE, fontWeight="bold", clip=True, tooltip=None)
        .encode(**_where(), text="place:N"),
        layer_of("done")
        .mark_point(**ring, size=DONE, fill=ink.accent, stroke=ink.ground)
        .encode(**_where(), tooltip=_tips()),
    ]


def _word_layers(ink: Paper) -> list[alt.Chart]:
    """Names along lines, turned as their line is on the screen; names of fluids beside the frame."""
    rise, run = ("scale('y', datum.mu2) - scale('y', datum.mu)", "scale('x', datum.f2) - scale('x', datum.f)")
    turned = f"atan2({rise}, {run}) * 180 / PI"
    shared = dict(
        angle=alt.expr(turned),
        baseline=alt.expr("datum.baseline"),
        dy=alt.expr("datum.dy"),
        clip=True,
        fontSize=SMALL_SIZE,
        tooltip=None,
    )
    looks = (
        ("halos", dict(color=ink.ground, stroke=ink.ground, strokeWidth=3.5, opacity=0.85)),
        ("words", dict(color=alt.expr(f"datum.of == 'zone' ? '{ink.ink}' : '{ink.accent}'"))),
    )
    words = [
        layer_of("words", name).mark_text(**look, **shared).encode(x=across("f"), y=up("mu"), text="text:N")
        for name, look in looks
    ]
    beside = (
        layer_of("fluid_names", "fluid_texts")
        .mark_text(align="left", dx=LEADER, color=ink.ink, fontSize=LABEL_SIZE - 1, tooltip=None)
        .encode(x=alt.value("width"), y=up("at"), text="name:N")
    )
    return [*words, beside]
