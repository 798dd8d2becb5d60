"""Trends: one number or quantity against another over all runs, with the open run beside the chart."""

import functools
import html

import pandas as pd
import streamlit as st

from labbook.app import filters, record, session, trend_statistics
from labbook.app.trend_choices import Choices, chosen, controls
from labbook.app.trend_figure import Figure, drawn_as, save
from labbook.app.trend_theory import theory_of
from labbook.book import queries
from labbook.book.asking import Question
from labbook.book.plotting import PlotRows, plot_frame
from labbook.book.published_points import points
from labbook.charts.dialect_axis import HOUSE_ONLY
from labbook.charts.theory import Theory
from labbook.charts.theory_axes import has_theory
from labbook.charts.trend import SPACE, Trend, caption, counted
from labbook.charts.trend_fit_marks import with_marks
from labbook.charts.trend_published import NO_RUN
from labbook.registry.group import Registry

CHART = "trends:chart"
# pixels of the chart on the smallest screen, with and without a run beside it: what its lettering must fit
ALONE, BESIDE = {"width": 760, "height": 480}, {"width": 520, "height": 480}

SHEET = """<style>
[data-testid="stLayoutWrapper"]:has(> .st-key-lb-trend-chart), .st-key-lb-trend-chart {
  height: calc(100vh - 14.2rem) !important; min-height: 22rem;
  flex: none !important; overflow: hidden !important; }
.st-key-lb-trends [data-testid="stColumn"]:first-child [data-testid="stVerticalBlock"] { gap: 0.3rem; }
/* the names of dialects are longer than the column of controls is wide */
[data-testid="stSelectboxVirtualDropdown"] { min-width: 20rem; }
.lb-title { font-size: 0.95rem; line-height: 1.35; }
</style>"""


def page() -> None:
    """The page."""
    registry = session.registry()
    choices, said = chosen(registry)
    asked = filters.row("trends")
    for sentence in said:
        session.say_refused(sentence)
    state = session.state_of_book()
    plotted = _rows(state, filters.cache_key(asked), asked, choices.x, choices.y, choices.group,
                    choices.log_x, choices.log_y, choices.dialects)  # fmt: skip
    others = _published(state, choices.x, choices.y, choices.dialects)
    nothing = plotted.frame.empty and not plotted.left_out
    if nothing and not session.book().ask(queries.count, Question(state="all")):
        _empty_book()
        return
    run = session.address("run")
    st.html(SHEET)
    with st.container(key="lb-trends"):
        places = st.columns([0.15, 0.62, 0.23] if run else [0.15, 0.85], gap="small")
        with places[0]:
            controls(choices, registry, others=bool(len(others) or others.attrs["lost"]))
        with places[1]:
            theory = theory_of(state, plotted, asked, choices, registry)
            shown = others if choices.published else None
            drawn = _on_screen(state, filters.cache_key(asked), choices, run or None, session.is_dark(),
                               plotted, theory, shown, registry)  # fmt: skip
            fits = trend_statistics.on_chart(asked, choices)
            drawn = with_marks(drawn, fits, dark=session.is_dark())
            _title(asked, drawn)
            _chart(drawn)
            _below(drawn, choices, registry, theory)
        if run:
            with places[2]:
                st.button("Close", icon=":material/close:", key="trends:close", on_click=_close,
                          width="stretch")  # fmt: skip
                record.show(run, place="trends", narrow=True)
        with places[0]:
            save(Figure(plotted, choices, asked, theory, shown, session.book(), registry, fits))
        trend_statistics.folded(asked, choices, registry)


def _empty_book() -> None:
    session.note("This book has no runs yet. Log one on the bench; its point will stand here.")
    st.page_link(st.session_state["pages"]["bench"], label="Go to the bench", icon=":material/edit_note:")


# ---- what is drawn


@st.cache_data(max_entries=24, show_spinner="Reading the runs …")
def _rows(state: str, asked: str, _asked: Question, x, y, group, log_x, log_y, dialects) -> PlotRows:
    return session.book().ask(plot_frame, _asked, x, y, group, log_x=log_x, log_y=log_y, dialects=dialects)


@st.cache_data(max_entries=24, show_spinner=False)
def _published(state: str, x: str, y: str, dialects) -> pd.DataFrame:
    """The points that others printed for these axes, in the page's dialects."""
    return session.book().ask(points, x, y, dialects)


@st.cache_resource(max_entries=24, show_spinner=False)
def _on_screen(
    state: str, asked: str, choices: Choices, picked, dark, _plotted, _theory, _shown, _registry
) -> Trend:  # fmt: skip
    """The chart of the page, kept for the reruns that change nothing in it."""
    size = BESIDE if picked else ALONE
    return drawn_as(_plotted, choices, _registry, _theory, _shown, dark=dark, picked=picked, **size)


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
        if not drawn.published:
            return
    key = f"{CHART}:{st.session_state.get(CHART, 0)}"
    chart = drawn.chart.properties(width="container", height="container")
    with st.container(key="lb-trend-chart", height=500, border=False):  # the stylesheet fills the window
        st.altair_chart(chart, theme=None, height="stretch", key=key, on_select=functools.partial(_pick, key),
                        selection_mode="pick")  # fmt: skip
    if st.session_state.pop("trends:many", False):
        session.note("That mark stands for several runs: narrow the filter until they stand apart.")


def _below(drawn: Trend, choices: Choices, registry: Registry, theory: Theory | None) -> None:
    notes = drawn.caption.removeprefix(caption(drawn.drawn, drawn.left_out)[:-1]).removeprefix(".").strip()
    total = drawn.drawn + sum(drawn.left_out.values())
    session.note(f"{_spaced(drawn.drawn)} of {counted(total)} drawn. {notes}")
    lines = [HOUSE_ONLY] if choices.dialects else []
    if choices.theory and has_theory(choices.x, choices.y):
        why = theory.why if theory else choices.why_no_curve(registry)
        lines += [f"no theory here: {why}"] if why else []
    if lines:
        session.note("; ".join(lines))


def _pick(key: str) -> None:
    """Open the run of the mark that was picked; a published point opens nothing."""
    picked = st.session_state[key].selection.get("pick") or []
    if picked and picked[0].get("code"):
        session.set_address(run=picked[0]["code"])
    elif picked and picked[0].get("code") != NO_RUN:
        st.session_state["trends:many"] = True


def _close() -> None:
    session.set_address(run=None)
    # a new chart: in the old one the same mark is picked already and would not open again
    st.session_state[CHART] = st.session_state.get(CHART, 0) + 1
