"""A number's strip as a small inline drawing: regime bands with their names, a tick for each run's value."""

import base64
import html
import math

import numpy as np

from labbook.charts.axes import tick_label
from labbook.charts.bands import bands_of
from labbook.charts.palette import BAND_OPACITY, paper
from labbook.charts.strips import MOST_TICKS, strip_domain, strip_labels

HEIGHT = 18
NARROWEST = 400  # pixels: on a tablet; a label that needs a wider strip stays away


def strip_html(key: str, values: np.ndarray, dark: bool) -> str:
    """The strip of a number over the sizes of the book's values; bands hold on the signed value."""
    sizes = np.abs(np.asarray(values, dtype=float))
    sizes = sizes[np.isfinite(sizes) & (sizes > 0)]
    low, high = strip_domain(key, sizes)

    def place(value):
        return min(max(math.log(max(value, low) / low) / math.log(high / low), 0.0), 1.0)

    bands, ink, grey = bands_of(key, low, high), paper(dark).ink, paper(dark).grey
    areas = [(place(b.low), place(b.high), b.hue) for b in bands]
    drawn = _rect(0.0, 1.0, grey, BAND_OPACITY / (2 if areas else 1))
    drawn += "".join(_rect(*area, 1.5 * BAND_OPACITY) for area in areas)
    seen = sorted({round(place(v) * MOST_TICKS) for v in sizes})
    ticks = "".join(f"M{1000 * s / MOST_TICKS:.1f} 2v{HEIGHT - 4}" for s in seen)
    drawn += (f'<path d="{ticks}" stroke="{ink}" stroke-opacity="0.5" stroke-width="1" '
              'vector-effect="non-scaling-stroke" fill="none"/>') if ticks else ""  # fmt: skip
    names, limits = strip_labels(bands, None, low, high, place)
    marks = [m for m in (*names, *limits) if m["wide"] < NARROWEST]
    if not any(m in limits for m in marks):
        ends = [{"place": place(v), "text": tick_label(v)} for b in bands for v in (b.low, b.high)
                if low < v < high]  # fmt: skip
        marks = marks or ends
    svg = (f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 1000 {HEIGHT}" '
           f'preserveAspectRatio="none">{drawn}</svg>')  # fmt: skip
    # Streamlit strips drawings out of HTML but leaves pictures in
    picture = base64.b64encode(svg.encode()).decode()
    return (
        f'<img alt="{html.escape(key)} over the book\'s runs" src="data:image/svg+xml;base64,{picture}" '
        f'style="width:100%;height:{HEIGHT}px;display:block">'
        '<div class="lb-note" style="position:relative;height:1.3rem">'
        + "".join(_label(m["place"], m["text"]) for m in marks) + "</div>"
    )  # fmt: skip


def _rect(start: float, end: float, hue: str, opacity: float) -> str:
    return (
        f'<rect x="{1000 * start:.1f}" y="0" width="{1000 * max(end - start, 0):.1f}" height="{HEIGHT}" '
        f'fill="{hue}" fill-opacity="{opacity:.2f}"/>'
    )


def _label(place: float, text: str) -> str:
    return (
        f'<span style="position:absolute;left:{100 * min(max(place, 0.03), 0.97):.1f}%;'
        f'transform:translateX(-50%);font-size:0.75rem;white-space:nowrap">{html.escape(text)}</span>'
    )
