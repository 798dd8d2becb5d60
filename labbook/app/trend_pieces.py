"""Statistics of a trend on its page, worked out piece by piece, each once in each state of the book."""

import streamlit as st

from labbook.app import session
from labbook.book.asking import Question
from labbook.book.repeat_groups import RepeatGroups
from labbook.book.trend_group import NO_FAMILY, TrendGroup, trend_group
from labbook.book.trend_statistics import (
    Changed,
    Outlying,
    Slope,
    Statistics,
    Top,
    changed_over_time,
    family_names,
    outlying_runs,
    repeated_runs,
    slopes,
    top_of,
)


def worked_out(
    given: tuple[str, ...], group: TrendGroup, family: str, ends: tuple[float, float] | None
) -> Statistics:
    """Everything about a group, with what is going on in words where a piece takes its time.

    given: state of the book, question as text, x, y and form, which the group is of; ends: of the slope.
    """
    names, more = family_names(group, family)
    whole = len(names) + 4
    with st.spinner(f"Maximum of {len(group.points.x)} runs (1 of {whole}) …"):
        top = _top(*given, NO_FAMILY, "", group)
    tops = []
    for i, name in enumerate(names):
        with st.spinner(f"Maximum of {name} ({i + 2} of {whole}) …"):
            tops.append(_top(*given, family, name, group))
    with st.spinner(f"Slopes ({whole - 2} of {whole}) …"):
        found = _slopes(*given, ends, group, top)
    with st.spinner(f"Change over time ({whole - 1} of {whole}) …"):
        changed = _changed(*given, "swimmer" if family == "swimmer" else "material", group)
    with st.spinner(f"Outliers and repeats ({whole} of {whole}) …"):
        outlying, repeats = _outlying(*given, group), _repeats(*given, group)
    return Statistics(group, family, top, tuple(tops), more, found, changed, outlying, repeats)


@st.cache_resource(max_entries=12, show_spinner="Reading the runs …")
def group_of(state: str, told: str, x: str, y: str, form: str, _asked: Question) -> TrendGroup:
    """The runs that the statistics are over; refusals as trend_group."""
    return session.book().ask(trend_group, _asked, x, y, form)


@st.cache_resource(max_entries=300, show_spinner=False)
def _top(
    state: str, told: str, x: str, y: str, form: str, family: str, name: str, _group: TrendGroup
) -> Top:  # fmt: skip
    return top_of(_group, family, name)


@st.cache_resource(max_entries=24, show_spinner=False)
def _slopes(
    state: str, told: str, x: str, y: str, form: str, ends, _group: TrendGroup, _top: Top
) -> tuple[Slope, ...]:  # fmt: skip
    return slopes(_group, _top.maximum, ends)


@st.cache_resource(max_entries=24, show_spinner=False)
def _changed(state: str, told: str, x: str, y: str, form: str, owner: str, _group: TrendGroup) -> Changed:
    return changed_over_time(_group, owner)


@st.cache_resource(max_entries=24, show_spinner=False)
def _outlying(state: str, told: str, x: str, y: str, form: str, _group: TrendGroup) -> Outlying:
    return outlying_runs(_group)


@st.cache_resource(max_entries=24, show_spinner=False)
def _repeats(state: str, told: str, x: str, y: str, form: str, _group: TrendGroup) -> RepeatGroups:
    return repeated_runs(_group)
