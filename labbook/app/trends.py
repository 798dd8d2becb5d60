"""Trends: one number or quantity against another over all runs, with the open run beside the chart."""

import functools
import html
from dataclasses import replace

import streamlit as st

from labbook.app import filters, record, session
from labbook.app.trend_choices import Choices, chosen, controls, has_theory
from labbook.app.trend_figure import Figure, drawn_as, save
from labbook.book import queries
from labbook.book.asking import Question
from labbook.book.plotting import PlotRows, plot_frame
from labbook.charts import dialect_axis, theory
from labbook.charts.trend import SPACE, Trend, caption, counted

CHART = "trends:chart"
THEORY_FROM = 2000  # newest runs that the curve's swimmer is the median of
# pixels of the chart on the smallest screen, with and without a run beside it: what its lettering must fit
ALONE, BESIDE = {"width": 760, "height": 480}, {"width": 520, "height": 480}

SHEET = """<style>
[data-testid="stLayoutWrapper"]:has(> .st-key-lb-trend-chart), .st-key-lb-trend-chart {
  height: calc(100vh - 14.2rem) !important; min-height: 22rem;
  flex: none !important; overflow: hidden !important; }
.lb-title { font-size: 0.95rem; line-height: 1.35; }
</style>"""


def page() -> None:
    """The page."""
    choices, said = chosen()
    asked = filters.row("trends")
    for sentence in said:
        session.say_refused(sentence)
    state = session.state_of_book()
    plotted = _rows(state, filters.cache_key(asked), asked, choices.x, choices.y, choices.group,
                    choices.log_x, choices.log_y, _wanted(choices))  # fmt: skip
    nothing = plotted.frame.empty and not plotted.left_out
    if nothing and not session.book().ask(queries.count, Question(state="all")):
        _empty_book()
        return
    if plotted.binned and not choices.house:
        session.say_refused(f"{choices.dialect}: so many runs are counted on a grid, in the house dialect; "
                            "narrow the filter to restate Sp.")  # fmt: skip
        choices = replace(choices, dialect="house")
    run = session.address("run")
    st.html(SHEET)
    with st.container(key="lb-trends"):
        places = st.columns([0.15, 0.62, 0.23] if run else [0.15, 0.85], gap="small")
        with places[0]:
            controls(plotted.binned)
        with places[1]:
            curve = _curve(plotted, asked, choices)
            drawn = _on_screen(state, filters.cache_key(asked), choices, run or None, session.is_dark(),
                               plotted, curve)  # fmt: skip
            _title(asked, drawn)
            _chart(drawn)
            _below(drawn, choices)
        if run:
            with places[2]:
                st.button("Close", icon=":material/close:", key="trends:close", on_click=_close,
                          width="stretch")  # fmt: skip
                record.show(run, place="trends", narrow=True)
        with places[0]:
            save(Figure(plotted, choices, asked, curve, session.book()))


def _empty_book() -> None:
    session.note("This book has no runs yet. Log one on the bench; its point will stand here.")
    st.page_link(st.session_state["pages"]["bench"], label="Go to the bench", icon=":material/edit_note:")


# ---- what is drawn


def _wanted(choices: Choices) -> tuple[str, ...]:
    """Further keys to read beside the axes."""
    return () if choices.house else dialect_axis.INPUTS


@st.cache_data(max_entries=24, show_spinner="Reading the runs …")
def _rows(state: str, asked: str, _asked: Question, x, y, group, log_x, log_y, also) -> PlotRows:
    return session.book().ask(plot_frame, _asked, x, y, group, log_x=log_x, log_y=log_y, also=also)


@st.cache_data(max_entries=24, show_spinner="Drawing the curve …")
def _theory_runs(state: str, asked: str, _asked: Question):
    """The newest runs of the question, with what the curve takes from them."""
    return session.book().frame(
        _asked, keys=theory.INPUTS, texts=("drive",), spread=False, newest=THEORY_FROM
    )


@st.cache_resource(max_entries=24, show_spinner=False)
def _on_screen(state: str, asked: str, choices: Choices, picked, dark: bool, _plotted, _curve) -> Trend:
    """The chart of the page, kept for the reruns that change nothing in it."""
    return drawn_as(_plotted, choices, _curve, dark=dark, picked=picked, **(BESIDE if picked else ALONE))


def _curve(plotted: PlotRows, asked: Question, choices: Choices):
    """The theory for these axes over the span of the runs, or None."""
    if not (choices.theory and choices.house and has_theory(choices.x, choices.y)):
        return None
    seen = plotted.frame.dropna(subset=[choices.x, choices.y])
    seen = seen[(seen["state"] != "void") & (seen[choices.x] > 0)]
    seen = seen[seen[choices.y] > 0] if choices.log_y else seen
    if seen.empty:
        return None
    runs = _theory_runs(session.state_of_book(), filters.cache_key(asked), asked)
    curve = theory.tail_curve(runs, float(seen[choices.x].min()), float(seen[choices.x].max()))
    return curve if len(curve) else None


# ---- the chart and the lines around it


def _title(asked: Question, drawn: Trend) -> None:
    counts = f"{counted(drawn.drawn)} drawn"
    if drawn.left_out:
        reasons = ", ".join(f"{_spaced(n)} {why}" for why, n in drawn.left_out.items())
        counts += f" · {_spaced(sum(drawn.left_out.values()))} not drawn: {reasons}"
    st.html(f'<div class="lb-title"><b>{html.escape(asked.in_words())}</b>&ensp;{html.escape(counts)}</div>')


def _spaced(number: int) -> str:
    return f"{number:,}".replace(",", SPACE)


def _chart(drawn: Trend) -> None:
    if not drawn.drawn:
        session.note("No run that was found has a place on these axes: choose others, or widen the filter.")
        return
    key = f"{CHART}:{st.session_state.get(CHART, 0)}"
    chart = drawn.chart.properties(width="container", height="container")
    with st.container(key="lb-trend-chart", height=500, border=False):  # the stylesheet fills the window
        st.altair_chart(chart, theme=None, height="stretch", key=key, on_select=functools.partial(_pick, key),
                        selection_mode="pick")  # fmt: skip
    if st.session_state.pop("trends:many", False):
        session.note("That mark stands for several runs: narrow the filter until they stand apart.")


def _below(drawn: Trend, choices: Choices) -> None:
    notes = drawn.caption.removeprefix(caption(drawn.drawn, drawn.left_out)[:-1]).removeprefix(".").strip()
    if choices.bands and not choices.house:
        notes += " Sp's bands belong to the house dialect and are not drawn."
    total = drawn.drawn + sum(drawn.left_out.values())
    session.note(f"{_spaced(drawn.drawn)} of {counted(total)} drawn. {notes}")


def _pick(key: str) -> None:
    """Open the run of the mark that was picked."""
    points = st.session_state[key].selection.get("pick") or []
    if points and points[0].get("code"):
        session.set_address(run=points[0]["code"])
    elif points:
        st.session_state["trends:many"] = True


def _close() -> None:
    session.set_address(run=None)
    # a new chart: in the old one the same mark is picked already and would not open again
    st.session_state[CHART] = st.session_state.get(CHART, 0) + 1
