"""The trend as drawn, on the page or to keep: SVG and PNG with a caption, CSV with the values drawn."""

from dataclasses import dataclass

import pandas as pd
import streamlit as st

from labbook.api import Book
from labbook.app import session
from labbook.app.trend_choices import Choices
from labbook.book.asking import Question
from labbook.book.clock import local, now
from labbook.book.plotting import PlotRows
from labbook.charts.dialect_axis import HOUSE_ONLY, axis_words, dialect_label, dialect_title
from labbook.charts.files import png_bytes, svg_bytes
from labbook.charts.theory import Theory
from labbook.charts.trend import Trend, trend
from labbook.charts.trend_fit_marks import FitMarks, with_marks
from labbook.exchange.outward import frame_as_csv
from labbook.registry.group import Registry

FIGURE = {"width": 760, "height": 540}  # pixels of a saved figure
TEXTS = ("code", "at", "by", "swimmer", "fluid", "material", "series", "state")


def drawn_as(
    plotted: PlotRows, choices: Choices, registry: Registry, theory: Theory | None, published, *, dark: bool, **more
) -> Trend:  # fmt: skip
    """The chart of the rows as chosen, with theory and others' points or None; `more` goes to charts.trend."""
    titles = {}
    for axis, key in (("x", choices.x), ("y", choices.y)):
        if key in registry.numbers:
            spoken = (key, choices.dialects.get(key, {}), registry.choices(key) or None, registry.numbers)
            titles |= {f"{axis}_title": dialect_title(*spoken), f"{axis}_label": dialect_label(*spoken)}
    # bands are read in the house dialect
    regimes = [r for r in registry.regimes.values() if not choices.dialects.keys() & set(r.numbers)]
    return trend(
        plotted.frame.rename(columns={"by": "person"}), x=choices.x, y=choices.y, group=choices.colour,
        log_x=choices.log_x, log_y=choices.log_y, bars=choices.bars, bands=choices.bands,
        curve=theory.frame if theory else None, curve_words=theory.words if theory else (), dark=dark,
        left_out=plotted.left_out, numbers=registry.numbers, regimes=regimes, published=published, **titles, **more,
    )  # fmt: skip


@dataclass(frozen=True)
class Figure:
    """A figure to save, made when it is asked for: on light paper, without the run in hand."""

    plotted: PlotRows
    choices: Choices
    asked: Question
    theory: Theory | None
    published: pd.DataFrame | None
    book: Book
    registry: Registry
    fits: FitMarks | None = None

    def drawn(self) -> Trend:
        drawn = drawn_as(
            self.plotted, self.choices, self.registry, self.theory, self.published, dark=False, **FIGURE
        )
        return with_marks(drawn, self.fits, dark=False)

    def svg(self) -> bytes:
        drawn = self.drawn()
        return svg_bytes(drawn.chart, self.words(drawn))

    def png(self) -> bytes:
        drawn = self.drawn()
        return png_bytes(drawn.chart, self.words(drawn))

    def csv(self) -> bytes:
        """The runs found, with both axes as the figure has them; a column `dialect` where not the house's.

        Published points are no runs: the comment names them, the rows do not.
        """
        choices = self.choices
        frame = self.book.frame(self.asked, keys=choices.keys, texts=TEXTS, dialects=choices.dialects)
        return frame_as_csv(frame, comment=self.words(self.drawn())).encode()

    def words(self, drawn: Trend) -> str:
        """The caption: filter, counts, dialects, date and book."""
        only = f"{HOUSE_ONLY.capitalize()}." if self.choices.dialects else ""
        said = (f"Runs: {self.asked.in_words()}.", drawn.caption,
                axis_words(self.choices.keys, self.choices.dialects, self.registry), only,
                f"{self.book.name}, {local(now()):%Y-%m-%d}.")  # fmt: skip
        return " ".join(part for part in said if part)


def save(figure: Figure) -> None:
    """The popover with one download for each form of the figure."""
    with st.popover("Save figure", icon=":material/download:", width="stretch"):
        name = f"{figure.choices.y}-{figure.choices.x}"
        for ending, make, mime in (
            ("svg", figure.svg, "image/svg+xml"), ("png", figure.png, "image/png"),
            ("csv", figure.csv, "text/csv"),
        ):  # fmt: skip
            st.download_button(ending.upper(), make, f"{name}.{ending}", mime, key=f"trends:save:{ending}",
                               on_click="ignore", width="stretch")  # fmt: skip
        session.note("Each carries its filter, counts, dialects, date and book.")
