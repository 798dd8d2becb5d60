"""Where things stand in the picture of a beat: one scale both ways, its channels and its scale bar."""

from dataclasses import dataclass

import altair as alt
import numpy as np

from labbook.charts.drawings import scale_length
from labbook.charts.palette import Paper
from labbook.charts.trend_layers import inline

EDGE = 12
BELOW = 34  # pixels under the tail for the scale bar
LOWEST, HIGHEST = 118, 340  # pixels of height at least and at most
BAR = 14  # pixels from the lower edge up to the scale bar


@dataclass(frozen=True)
class Frame:
    """Pixels of a metre, of the tail's base along and of the axis upwards; the picture's width and height."""

    per_metre: float
    base: float
    axis: float
    width: int
    height: int

    def x(self, metres) -> np.ndarray:
        """Pixels along, of places from the base towards the tip."""
        return self.base + np.asarray(metres) * self.per_metre

    def y(self, metres) -> np.ndarray:
        """Pixels upwards, of places across the axis."""
        return self.axis + np.asarray(metres) * self.per_metre

    def across(self, field: str) -> alt.X:
        """A channel along the picture whose unit is a pixel."""
        return alt.X(f"{field}:Q", scale=_pixels(self.width), axis=None)

    def up(self, field: str) -> alt.Y:
        """A channel up the picture whose unit is a pixel."""
        return alt.Y(f"{field}:Q", scale=_pixels(self.height), axis=None)


def _pixels(size: int) -> alt.Scale:
    return alt.Scale(domain=[0, size], nice=False, zero=False)


def frame_for(*, ahead: float, length: float, reach: float, room: float, width: int) -> Frame:
    """The Frame of a tail of some length with `ahead` of head before it, all m, and `room` pixels after it.

    reach: how far from the axis anything goes, m.
    """
    along = (width - EDGE - room) / (ahead + length)
    per_metre = min(along, (HIGHEST - BELOW - 2 * EDGE) / (2 * reach)) if reach > 0 else along
    height = int(max(LOWEST, 2 * reach * per_metre + BELOW + 2 * EDGE))
    return Frame(per_metre, EDGE + ahead * per_metre, (height + BELOW) / 2, width, height)


def scale_bar(frame: Frame, length: float, colours: Paper) -> alt.Chart:
    """A bar of a round length, about a third of some length (m)."""
    bar = [{"x": EDGE, "x2": EDGE + scale_length(length / 3) * frame.per_metre, "y": BAR}]
    return (
        alt.Chart(inline(bar), name="scale_bar")
        .mark_rule(stroke=colours.ink, strokeWidth=2.5, tooltip=None)
        .encode(x=frame.across("x"), x2="x2", y=frame.up("y"))
    )
