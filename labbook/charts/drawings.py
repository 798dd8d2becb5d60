"""Pictures of a swimmer to scale: side view with a scale bar, and its tail's section enlarged."""

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

import altair as alt
import numpy as np

from labbook.charts.palette import NO_PADDING, SMALL_SIZE, paper, text_width, theme
from labbook.charts.trend_layers import inline
from labbook.errors import Refusal

HEIGHT = 170
SECTION = 150  # pixels at right kept for the section
EDGE = 12
THINNEST = 1.2  # pixels: a thinner tail is drawn as a line of this width, and the drawing says so
ROUNDEST = 0.09  # half width over length of an undulating body's outline where no head radius is known
CURVE_POINTS = 33


@dataclass
class Sheet:
    """Outlines (pixels, y upwards), lines and texts of one drawing, until they become layers."""

    shapes: list[dict] = field(default_factory=list)
    lines: list[dict] = field(default_factory=list)
    texts: list[dict] = field(default_factory=list)

    def outline(self, x, y, hollow: bool = False) -> None:
        """A closed shape through the points; hollow: in the ground colour, to cut a hole."""
        self._path(self.shapes, x, y, hollow=hollow)

    def line(self, x, y, width: float) -> None:
        self._path(self.lines, x, y, width=width)

    def text(self, x: float, y: float, text: str, align: str = "center") -> None:
        self.texts.append({"x": round(x, 1), "y": round(y, 1), "text": text, "align": align})

    @staticmethod
    def _path(paths, x, y, **look):
        part = paths[-1]["part"] + 1 if paths else 0
        paths += [{"part": part, "step": i, "x": round(float(a), 2), "y": round(float(b), 2), **look}
                  for i, (a, b) in enumerate(zip(x, y, strict=True))]


def written_length(metres: float) -> str:
    """A length in mm, or in µm below 0.1 mm, to three digits."""
    value, unit = (metres * 1e6, "µm") if metres < 1e-4 else (metres * 1e3, "mm")
    digits = max(0, 2 - math.floor(math.log10(value))) if value > 0 else 0
    text = f"{value:.{digits}f}"
    return f"{text.rstrip('0').rstrip('.') if '.' in text else text} {unit}"


def scale_length(metres: float) -> float:
    """The longest of 1, 2, 5 times a power of ten (m) that is no longer than a length."""
    power = 10.0 ** math.floor(math.log10(metres) + 1e-9)
    return next(m * power for m in (5, 2, 1) if m * power <= metres * (1 + 1e-9))


def swimmer_drawing(swimmer: Mapping, dark: bool = False, *, width: int = 460) -> alt.LayerChart:
    """A swimmer from the side, head at left, at one scale in both directions, and its section enlarged.

    swimmer: form, section and SI floats (L_tail, L_body, b, b_long, d, w, t, D, d_in, R_helix, pitch), absent
    ones None, NaN or missing. A strip is seen on edge (its t), a helix as its projection, an undulating body
    as a spindle of its L_body, whose width is b or else schematic. Errors: Refusal without any length.
    """
    lengths = {k: float(v) for k, v in swimmer.items() if isinstance(v, (int, float, np.number)) and v > 0}
    form, section = str(swimmer.get("form") or ""), str(swimmer.get("section") or "")
    if not {"L_tail", "L_body"} & lengths.keys():
        raise Refusal("swimmer", None, "has neither tail length nor overall length", "give L_body")
    sheet = Sheet()
    cut = _section_size(section, lengths)
    room = width - 2 * EDGE - (SECTION + EDGE if cut else 0)
    notes = _side_view(sheet, form, section, lengths, room)
    if cut:
        _section(sheet, section, lengths, cut, width - EDGE - SECTION / 2)
    return _layers(sheet, notes, dark, width)


def _thickness(section: str, lengths) -> float:
    """The tail's thickness in the plane of bending (0 where unknown)."""
    return lengths.get({"strip": "t", "tube": "D"}.get(section, "d"), 0.0)


def _side_view(sheet: Sheet, form: str, section: str, lengths, room: float) -> list[str]:
    b = lengths.get("b", 0.0)
    head = 2 * lengths.get("b_long", b)
    tail = lengths.get("L_tail", lengths.get("L_body", 0.0))
    whole = max(lengths.get("L_body", 0.0), tail if form == "undulating" else head + tail)
    reach = max(b, lengths.get("R_helix", 0.0), _thickness(section, lengths) / 2)
    if form in ("undulating", "hinged"):
        reach = max(reach, b or ROUNDEST * whole)
    per_metre = min(room / whole, (HEIGHT - 70) / (2 * reach) if reach else math.inf)
    middle, start = HEIGHT / 2 + 18, EDGE + (room - whole * per_metre) / 2
    notes = []

    def across(metres):
        return start + np.asarray(metres) * per_metre

    def up(metres):
        return middle + np.asarray(metres) * per_metre

    if form == "undulating":
        _spindle(sheet, across, up, 0.0, whole, b or ROUNDEST * whole, tail=True)
        if not b:
            notes.append("body width schematic")
    else:
        if form == "hinged":
            # the flap is the tail; what lies ahead of the hinge is the body
            body = max(whole - tail, head)
            _spindle(sheet, across, up, 0.0, body or 0.1 * whole, b or ROUNDEST * whole, tail=False)
            if not b:
                notes.append("body width schematic")
        elif b:
            angle = np.linspace(0, 2 * math.pi, 2 * CURVE_POINTS)
            sheet.outline(across(head / 2 * (1 + np.cos(angle))), up(b * np.sin(angle)))
        notes += _tail(sheet, form, section, lengths, across, up, whole - tail, whole, per_metre)
    _scale_bar(sheet, whole, per_metre)
    sizes = [f"{name} {written_length(lengths[key])}" for key, name in
             (("L_body", "L_body"), ("L_tail", "L_tail"), ("b", "b"), ("b_long", "b_long"),
              ("R_helix", "R_h"), ("pitch", "p_h")) if key in lengths]
    _wrapped(sheet, sizes, EDGE, HEIGHT - 12, room)
    return notes


def _spindle(sheet, across, up, start, end, half, tail: bool) -> None:
    """A fusiform outline from start to end, widest a third of the way; with a tail fin if wanted."""
    s = (1 - np.cos(np.linspace(0, math.pi, CURVE_POINTS))) / 2  # close steps at the blunt nose
    profile = np.sqrt(s) * (1 - s)
    profile = profile / profile.max() * half
    x = start + (end - start) * s * (0.86 if tail else 1.0)
    sheet.outline(across(np.concatenate([x, x[::-1]])), up(np.concatenate([profile, -profile[::-1]])))
    if tail:
        length = end - start
        fin = np.array([0.83, 1.0, 0.95, 1.0, 0.83])
        sheet.outline(across(start + length * fin), up(half * np.array([0.06, 0.8, 0.0, -0.8, -0.06])))


def _tail(sheet, form, section, lengths, across, up, start, end, per_metre) -> list[str]:
    thick = _thickness(section, lengths) * per_metre
    if form == "helix" and {"R_helix", "pitch"} <= lengths.keys():
        turns = (end - start) / lengths["pitch"]
        s = np.linspace(0, 1, int(min(max(turns, 1) * 24, 1200)))
        # the helix leaves the head on the axis, as its lead-in does
        amplitude = lengths["R_helix"] * np.minimum(1, s * turns * 2)
        sheet.line(across(start + (end - start) * s), up(amplitude * np.sin(2 * math.pi * turns * s)),
                   max(thick, THINNEST))
    elif thick >= THINNEST:
        half = thick / per_metre / 2
        sheet.outline(across([start, end, end, start]), up([half, half, -half, -half]))
    else:
        sheet.line(across([start, end]), up([0, 0]), THINNEST)
    if thick >= THINNEST:
        return []
    return ["tail drawn thicker than to scale" if thick else "tail thickness unknown"]


def _scale_bar(sheet, whole: float, per_metre: float) -> None:
    length = scale_length(whole / 3)
    end = EDGE + length * per_metre
    sheet.line([EDGE, end], [22, 22], 2.5)
    sheet.text(end + 8, 22, written_length(length), "left")


def _wrapped(sheet, items: list[str], x: float, top: float, room: float) -> None:
    """Items in a row, in a second row where the first is full."""
    rows = [""]
    for item in items:
        joined = f"{rows[-1]},  {item}" if rows[-1] else item
        if text_width(joined, SMALL_SIZE) > room and rows[-1]:
            rows.append(item)
        else:
            rows[-1] = joined
    for i, row in enumerate(rows):
        sheet.text(x, top - i * (SMALL_SIZE + 4), row, "left")


def _section_size(section: str, lengths) -> tuple[float, float] | None:
    """Width and height (m) of a section whose sizes are all known."""
    if section == "strip" and {"w", "t"} <= lengths.keys():
        return lengths["w"], lengths["t"]
    if section == "tube" and {"D", "d_in"} <= lengths.keys():
        return lengths["D"], lengths["D"]
    if section == "rod" and "d" in lengths:
        return lengths["d"], lengths["d"]
    return None


def _section(sheet, section: str, lengths, size, centre: float) -> None:
    per_metre = min((SECTION - 30) / size[0], 78 / size[1])
    middle, half_w, half_t = HEIGHT / 2 + 14, size[0] * per_metre / 2, size[1] * per_metre / 2
    circle = np.linspace(0, 2 * math.pi, 2 * CURVE_POINTS)
    if section == "strip":
        half_t = max(half_t, THINNEST / 2)
        sheet.outline(centre + half_w * np.array([-1, 1, 1, -1]), middle + half_t * np.array([1, 1, -1, -1]))
        label = f"{written_length(lengths['w'])} × {written_length(lengths['t'])}"
    else:
        sheet.outline(centre + half_w * np.cos(circle), middle + half_w * np.sin(circle))
        label = f"d {written_length(size[0])}"
        if section == "tube":
            inner = lengths["d_in"] * per_metre / 2
            sheet.outline(centre + inner * np.cos(circle), middle + inner * np.sin(circle), hollow=True)
            label = f"D {written_length(lengths['D'])}, d_in {written_length(lengths['d_in'])}"
    sheet.text(centre, HEIGHT - 12, "section" if section != "strip" else "section, w × t")
    sheet.text(centre, 40, label)
    bar = scale_length(size[0] / 2)
    sheet.line([centre - bar * per_metre / 2, centre + bar * per_metre / 2], [22, 22], 2.5)
    sheet.text(centre, 9, written_length(bar))


def _layers(sheet: Sheet, notes: list[str], dark: bool, width: int) -> alt.LayerChart:
    colours = paper(dark)
    if notes:
        sheet.text(EDGE, 6, "; ".join(notes), "left")

    # one unit of either scale is one pixel: both directions have the same aspect
    def x(name="x"):
        return alt.X(f"{name}:Q", scale=alt.Scale(domain=[0, width], nice=False, zero=False), axis=None)

    def y(name="y"):
        return alt.Y(f"{name}:Q", scale=alt.Scale(domain=[0, HEIGHT], nice=False, zero=False), axis=None)

    path = dict(detail="part:N", order="step:Q")
    layers = []
    for name, fill, hollow in (("shapes", colours.muted, False), ("holes", colours.ground, True)):
        rows = [r for r in sheet.shapes if r["hollow"] == hollow]
        if rows:
            layers.append(
                alt.Chart(inline(rows), name=name)
                .mark_line(interpolate="linear-closed", fill=fill, stroke=colours.ink, strokeWidth=0.8,
                           tooltip=None)
                .encode(x=x(), y=y(), **path)
            )
    for stroke in sorted({r["width"] for r in sheet.lines}):
        rows = [r for r in sheet.lines if r["width"] == stroke]
        layers.append(
            alt.Chart(inline(rows), name=f"lines_{len(layers)}")
            .mark_line(stroke=colours.ink, strokeWidth=stroke, strokeCap="butt", tooltip=None)
            .encode(x=x(), y=y(), **path)
        )
    for align in sorted({r["align"] for r in sheet.texts}):
        rows = [r for r in sheet.texts if r["align"] == align]
        layers.append(
            alt.Chart(inline(rows), name=f"texts_{align}")
            .mark_text(align=align, baseline="middle", color=colours.ink, fontSize=SMALL_SIZE, tooltip=None)
            .encode(x=x(), y=y(), text="text:N")
        )
    return alt.layer(*layers).properties(width=width, height=HEIGHT, padding=NO_PADDING).configure(**theme(dark))
