"""The trend as drawn, on the page or to keep: SVG and PNG with a caption, CSV with the values that are drawn."""

from dataclasses import dataclass

import pandas as pd
import streamlit as st

from labbook.api import Book
from labbook.app import session
from labbook.app.trend_choices import Choices
from labbook.book.asking import Question
from labbook.book.clock import local, now
from labbook.book.plotting import PlotRows
from labbook.charts import axes, dialect_axis
from labbook.charts.files import png_bytes, svg_bytes
from labbook.charts.trend import Trend, trend
from labbook.exchange.outward import frame_as_csv
from labbook.registry.regimes import REGIMES

FIGURE = {"width": 760, "height": 540}  # pixels of a saved figure
TEXTS = ("code", "at", "by", "swimmer", "fluid", "material", "series", "state")


def drawn_as(plotted: PlotRows, choices: Choices, curve, *, dark: bool, **options) -> Trend:
    """The chart of the rows as chosen, over a curve or None; options go to charts.trend."""
    frame = plotted.frame.rename(columns={"by": "person"})
    if not choices.house:
        spoken = dialect_axis.dialects()[choices.dialect]
        frame = dialect_axis.restated_frame(frame, spoken)
        for axis, key in (("x_title", choices.x), ("y_title", choices.y)):
            if key == "Sp":
                options[axis] = dialect_axis.dialect_title(spoken)
        # the bands are read in the house dialect
        options["regimes"] = [r for r in REGIMES.values() if r.number != "Sp"]
    return trend(
        frame, x=choices.x, y=choices.y, group=choices.colour, log_x=choices.log_x, log_y=choices.log_y,
        bars=choices.bars, bands=choices.bands, curve=curve, dark=dark, left_out=plotted.left_out, **options,
    )  # fmt: skip


@dataclass(frozen=True)
class Figure:
    """A figure to save, made when it is asked for: on light paper, without the run in hand."""

    plotted: PlotRows
    choices: Choices
    asked: Question
    curve: pd.DataFrame | None
    book: Book

    def drawn(self) -> Trend:
        return drawn_as(self.plotted, self.choices, self.curve, dark=False, **FIGURE)

    def svg(self) -> bytes:
        drawn = self.drawn()
        return svg_bytes(drawn.chart, self.words(drawn))

    def png(self) -> bytes:
        drawn = self.drawn()
        return png_bytes(drawn.chart, self.words(drawn))

    def csv(self) -> bytes:
        """The runs found, with both axes; Sp as the figure has it, its columns named after the dialect."""
        keys = self.choices.keys
        if self.choices.house:
            frame = self.book.frame(self.asked, keys=keys, texts=TEXTS)
        else:
            needed = tuple(dict.fromkeys((*keys, *dialect_axis.INPUTS)))
            whole = self.book.frame(self.asked, keys=needed, texts=TEXTS)
            spoken = dialect_axis.restated_frame(whole, dialect_axis.dialects()[self.choices.dialect])
            wanted = [c for c in whole if c in TEXTS or c.removeprefix("u_own_").removeprefix("u_shared_")
                      .removeprefix("u_") in keys]  # fmt: skip
            frame = spoken[wanted].rename(
                columns={c: f"{c} ({self.choices.dialect})" for c in wanted if c == "Sp" or c.endswith("_Sp")}
            )
            frame.attrs = whole.attrs
        return frame_as_csv(frame, comment=self.words(self.drawn())).encode()

    def words(self, drawn: Trend) -> str:
        """The caption: filter, counts, dialect, date and book."""
        keys, restated = self.choices.keys, ""
        if not self.choices.house:
            title = dialect_axis.dialect_title(dialect_axis.dialects()[self.choices.dialect])
            keys, restated = tuple(k for k in keys if k != "Sp"), f"{title} ({self.choices.dialect})."
        said = (f"Runs: {self.asked.in_words()}.", drawn.caption, restated, axes.house_words(keys),
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
        session.note("Each carries its filter, counts, dialect, date and book.")
