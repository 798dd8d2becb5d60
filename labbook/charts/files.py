"""Charts as files: SVG and PNG made on this machine, with the caption printed below the drawing."""

import json
from pathlib import Path

import altair as alt
import vl_convert

from labbook.charts.palette import SMALL_SIZE, paper, text_width, theme
from labbook.errors import Refusal

WIDTH = 720  # of a chart that fills its page
MARGIN = 14
ENDINGS = (".svg", ".png")


def still(chart: alt.TopLevelMixin, caption: str = "", dark: bool = False, width: int = WIDTH) -> dict:
    """The Vega-Lite specification of a chart as it goes to a file: own ground, no selection, caption below.

    A chart made for the dark theme must be saved with dark=True: its inks are its own.
    """
    spec = chart.to_dict()
    _without_selections(spec)
    if spec.get("width") == "container":
        spec["width"] = width
    spec["config"] = theme(dark, ground=True)
    spec["padding"] = MARGIN
    if caption:
        own = spec.get("title")
        above = own["text"] if isinstance(own, dict) else []
        room = spec["width"] if isinstance(spec.get("width"), (int, float)) else width
        spec["title"] = footer([*above, *_lines(caption, room)], dark)
    return spec


def footer(lines: list[str], dark: bool) -> dict:
    """A title that stands below the drawing, flush left, in small muted letters."""
    return {
        "text": lines, "orient": "bottom", "anchor": "start", "frame": "bounds", "offset": 12,
        "fontSize": SMALL_SIZE, "fontWeight": "normal", "color": paper(dark).muted,
        "lineHeight": SMALL_SIZE + 4,
    }


def _lines(text: str, room: float) -> list[str]:
    lines = [""]
    for word in text.split():
        if lines[-1] and text_width(f"{lines[-1]} {word}", SMALL_SIZE) > room:
            lines.append(word)
        else:
            lines[-1] = f"{lines[-1]} {word}".strip()
    return lines


def _without_selections(spec: dict) -> None:
    """Drop selection parameters: a nearest-mark selection would add an unseen shape per mark."""
    if "params" in spec:
        spec["params"] = [p for p in spec["params"] if "select" not in p]
    for part in ("layer", "hconcat", "vconcat", "concat"):
        for child in spec.get(part, ()):
            _without_selections(child)


def _version() -> str:
    """The Vega-Lite version that the installed altair writes, as vl_convert names it."""
    return ".".join(alt.SCHEMA_VERSION.split(".")[:2])


def svg_bytes(chart: alt.TopLevelMixin, caption: str = "", dark: bool = False, width: int = WIDTH) -> bytes:
    """A chart as SVG; nothing is fetched: any outside address in the chart is an error."""
    spec = json.dumps(still(chart, caption, dark, width))
    return vl_convert.vegalite_to_svg(spec, vl_version=_version(), allowed_base_urls=[]).encode()


def png_bytes(
    chart: alt.TopLevelMixin, caption: str = "", dark: bool = False, width: int = WIDTH, scale: float = 2
) -> bytes:
    """A chart as PNG with `scale` pixels for each of its own; nothing is fetched."""
    spec = json.dumps(still(chart, caption, dark, width))
    return vl_convert.vegalite_to_png(spec, vl_version=_version(), scale=scale, allowed_base_urls=[])


def save(
    chart: alt.TopLevelMixin, path: str | Path, caption: str = "", dark: bool = False, width: int = WIDTH
) -> Path:
    """Write a chart to a .svg or .png file and return its path; Refusal for another ending."""
    path = Path(path)
    writers = dict(zip(ENDINGS, (svg_bytes, png_bytes), strict=True))
    if path.suffix.lower() not in writers:
        raise Refusal("file", path.name, "not a kind of figure", "end the name with .svg or .png")
    path.write_bytes(writers[path.suffix.lower()](chart, caption, dark, width))
    return path
