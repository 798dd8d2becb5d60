"""A number's strip as a small inline drawing: regime bands with their names, a tick for each run's value."""

import base64
import html
import math
from collections.abc import Iterable, Sequence

import numpy as np

from labbook.charts.axes import tick_label
from labbook.charts.bands import Band, bands_of, limits_of
from labbook.charts.palette import BAND_OPACITY, SMALL_SIZE, band_hue, paper, text_width
from labbook.charts.strips import BEYOND, MOST_TICKS, strip_domain, strip_labels
from labbook.registry.group import Registry
from labbook.registry.regime_coverage import Stretch, gaps, overlaps
from labbook.registry.regimes import Regime

HEIGHT = 18
NARROWEST = 400  # pixels: on a tablet; a label that needs a wider strip stays away
LEAST_MARK = 0.004  # of the strip: a stretch that is a single point is drawn this wide


def strip_html(key: str, values: np.ndarray, dark: bool, registry: Registry) -> str:
    """The strip of a number over the sizes of the book's values; bands hold on the signed value."""
    sizes, regimes = _sizes(values), list(registry.regimes.values())
    return _strip(key, sizes, dark, regimes, strip_domain(key, sizes, regimes))


def coverage_html(
    key: str, values: np.ndarray, dark: bool, regimes: Iterable[Regime], chosen: str = ""
) -> str:
    """The strip out to every limit: what two regimes cover is hatched, what none covers is dashed.

    chosen: the name of the regime whose band is outlined.
    """
    sizes, regimes = _sizes(values), list(regimes)
    low, high = strip_domain(key, sizes, regimes)
    limits = [v for v in limits_of(key, regimes) if v > 0]
    low, high = min([low, *(v / 10**BEYOND for v in limits)]), max([high, *(v * 10**BEYOND for v in limits)])
    return _strip(key, sizes, dark, regimes, (low, high), overlaps(regimes, key), gaps(regimes, key), chosen)


def hues(regimes: Iterable[Regime]) -> dict[str, str]:
    """Name -> hue of a number's regimes, as its strip draws them."""
    rows = sorted(regimes, key=lambda r: (r.bands[0].low, r.bands[0].high))
    return {r.name: band_hue(r, i) for i, r in enumerate(rows)}


def swatch_html(hue: str) -> str:
    """A small square of a hue, to stand before the name that it belongs to."""
    return (f'<span style="display:inline-block;width:0.9rem;height:0.9rem;border-radius:0.2rem;'
            f'vertical-align:-0.12rem;margin-right:0.45rem;background:{html.escape(hue)};'
            'border:1px solid rgba(128,128,128,0.6)"></span>')  # fmt: skip


def _sizes(values) -> np.ndarray:
    sizes = np.abs(np.asarray(values, dtype=float))
    return sizes[np.isfinite(sizes) & (sizes > 0)]


def _strip(
    key: str, sizes: np.ndarray, dark: bool, regimes: Sequence[Regime], domain: tuple[float, float],
    twice: Sequence[Stretch] = (), bare: Sequence[Stretch] = (), chosen: str = "",
) -> str:  # fmt: skip
    low, high = domain

    def place(value):
        return min(max(math.log(max(value, low) / low) / math.log(high / low), 0.0), 1.0)

    bands, ink, grey = bands_of(key, low, high, regimes), paper(dark).ink, paper(dark).grey
    areas = [(place(b.low), place(b.high), b.hue) for b in bands]
    drawn = _rect(0.0, 1.0, grey, BAND_OPACITY / (2 if areas else 1))
    drawn += "".join(_rect(*area, 1.5 * BAND_OPACITY) for area in areas)
    drawn += "".join(_hatched(*_ends(s, place), ink) for s in twice if s.high > low and s.low < high)
    drawn += "".join(_outline(*_ends(s, place), ink, "4 3") for s in bare if s.high > low and s.low < high)
    drawn += "".join(_outline(place(b.low), place(b.high), ink) for b in bands if b.name == chosen)
    seen = sorted({round(place(v) * MOST_TICKS) for v in sizes})
    ticks = "".join(f"M{1000 * s / MOST_TICKS:.1f} 2v{HEIGHT - 4}" for s in seen)
    drawn += _path(ticks, ink, 0.5)
    marks = _kept_apart(bands, place, chosen) if twice else _labels(bands, low, high, place)
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


def _labels(bands: Sequence[Band], low: float, high: float, place) -> list[dict]:
    """Names and limits that a tablet's strip has room for; the limits alone where it has room for none."""
    names, limits = strip_labels(bands, None, low, high, place)
    marks = [m for m in (*names, *limits) if m["wide"] < NARROWEST]
    if any(m in limits for m in marks):
        return marks
    ends = [
        {"place": place(v), "text": tick_label(v)} for b in bands for v in (b.low, b.high) if low < v < high
    ]
    return marks or ends


def _kept_apart(bands: Sequence[Band], place, chosen: str) -> list[dict]:
    """Labels of overlapping bands, as many as do not touch: the chosen name, limits, other names."""
    names = [(place(math.sqrt(b.low * b.high)), b.name) for b in bands]
    limits = {v for b in bands for v, own in ((b.low, b.own_low), (b.high, b.own_high)) if own}
    wanted = [n for n in names if n[1] == chosen] + [(place(v), tick_label(v)) for v in sorted(limits)]
    kept: list[tuple[float, str]] = []
    for spot, text in dict.fromkeys([*wanted, *names]):
        room = [text_width(text + other, SMALL_SIZE) / 2 + 4 for _, other in kept]
        if all(NARROWEST * abs(spot - there) > need for (there, _), need in zip(kept, room, strict=True)):
            kept.append((spot, text))
    return [{"place": spot, "text": text} for spot, text in kept]


def _ends(stretch: Stretch, place) -> tuple[float, float]:
    """From where to where a stretch is drawn: a single point has some width too."""
    start, end = place(stretch.low), place(stretch.high)
    return (start, end) if end - start >= LEAST_MARK else (start - LEAST_MARK / 2, start + LEAST_MARK / 2)


def _hatched(start: float, end: float, ink: str) -> str:
    steps = max(round((end - start) * 125), 1)
    wide = 1000 * (end - start) / steps
    lines = "".join(f"M{1000 * start + i * wide:.1f} {HEIGHT}l{wide:.1f} {-HEIGHT}" for i in range(steps))
    return _path(lines, ink, 0.75) + _outline(start, end, ink)


def _outline(start: float, end: float, ink: str, dashes: str = "") -> str:
    x, wide = 1000 * start, 1000 * (end - start)
    return _path(f"M{x:.1f} 1h{wide:.1f}v{HEIGHT - 2}h{-wide:.1f}z", ink, 0.9, dashes)


def _path(lines: str, ink: str, opacity: float, dashes: str = "") -> str:
    if not lines:
        return ""
    dashed = f'stroke-dasharray="{dashes}" ' if dashes else ""
    return (f'<path d="{lines}" stroke="{ink}" stroke-opacity="{opacity}" stroke-width="1" {dashed}'
            'vector-effect="non-scaling-stroke" fill="none"/>')  # fmt: skip


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
