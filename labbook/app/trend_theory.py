"""Theory of the axes on Trends, asked for once in each state of the book."""

import pandas as pd
import streamlit as st

from labbook.app import filters, session
from labbook.app.trend_choices import Choices
from labbook.book.asking import Question
from labbook.book.plotting import PlotRows
from labbook.book.theory_runs import theory_runs
from labbook.charts import theory_axes
from labbook.charts.theory import Theory
from labbook.charts.theory_axes import Reach
from labbook.registry.group import Registry


def theory_of(
    state: str, plotted: PlotRows, asked: Question, choices: Choices, registry: Registry
) -> Theory | None:
    """The theory over the span of the runs drawn; None where it is switched off or the axes have none."""
    if not choices.theory or choices.why_no_curve(registry):
        return None
    where = theory_axes.reach(
        plotted.frame,
        choices.x,
        choices.y,
        choices.group,
        log_x=choices.log_x,
        log_y=choices.log_y,
        numbers=registry.numbers,
    )
    if where is None:
        return None
    return _theory(
        state,
        filters.cache_key(asked),
        choices.x,
        choices.y,
        choices.group,
        where,
        choices.spoken(registry),
        registry.coefficient,
        asked,
    )


@st.cache_data(max_entries=24, show_spinner="Working out the theory …")
def _theory(
    state: str, asked: str, x, y, group, where: Reach, spoken, coefficient, _asked: Question
) -> Theory:
    runs = _runs(state, asked, x, y, group, tuple(where.groups), _asked)
    return theory_axes.theory_on(runs, where, x, y, group=group, spoken=spoken, coefficient=coefficient)


@st.cache_data(max_entries=24, show_spinner=False)
def _runs(state: str, asked: str, x, y, group, names, _asked: Question) -> pd.DataFrame:
    """What the theory of these axes takes from the newest runs of the question."""
    keys, texts, spread = theory_axes.takes(x, y)
    return session.book().ask(theory_runs, _asked, keys, texts, group=group, names=names, spread=spread)
