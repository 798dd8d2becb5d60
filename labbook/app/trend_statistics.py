"""Statistics of the runs on Trends: a part that folds open below the chart and is worked out only then."""

import html

import streamlit as st

from labbook.app import filters, session
from labbook.app.trend_choices import Choices
from labbook.app.trend_pieces import group_of, worked_out
from labbook.app.trend_range import between, slope_range
from labbook.book.asking import Question
from labbook.book.clock import local, now
from labbook.book.trend_group import EVERY, FAMILIES, TrendGroup
from labbook.book.trend_statistics import Statistics, repeats_placed
from labbook.book.trend_tables import changes_table, repeats_table, slopes_table, tops_table
from labbook.book.trend_told import axis_name, paragraphs
from labbook.charts.dialect_axis import axis_words
from labbook.charts.trend_fit_marks import FitMarks
from labbook.errors import Refusal
from labbook.physics.trend_text import told as told_in_words
from labbook.registry.group import Registry

KEY, NAME = "trends:statistics", "statistics"  # of the fold, in the session and in the address
TITLE = "Statistics: maximum, slope, change over time, outliers, repeats"
HOUSE = "Statistics are in the house dialect; nothing of them is drawn on axes in another."
TWO_READINGS = (
    "Two readings of one change: y at equal x, or x at equal y; the likelier one has the p. "
    "The other p is that any of all stands out as much by chance."
)
BY_COLOUR = ("material", "fluid")  # a swimmer's maximum by itself has no interval
ENDS = ("x", "x_low", "x_high", "y", "y_low", "y_high")
SHEET = "<style>.lb-told { max-width: 62rem; margin: 0 0 0.6rem 0; line-height: 1.45; }</style>"
CONTROLS = [0.18, 0.16, 0.2, 0.2, 0.26]


def on_chart(asked: Question, choices: Choices) -> FitMarks | None:
    """What the statistics worked out last draw on this chart, None where they are folded or of other runs."""
    told, found = st.session_state.get(f"{KEY}:found", (None, None))
    if session.address(NAME) != "on" or choices.dialects or told != _about(asked, choices):
        return None
    return _marks(found, choices)


def folded(asked: Question, choices: Choices, registry: Registry) -> None:
    """The fold where this is called, and in it, where it is open, the statistics.

    New ones run the page once more: the chart, which stands above and is there before them, shows them too.
    """
    st.session_state[KEY] = session.address(NAME) == "on"
    fold = st.expander(TITLE, key=KEY, icon=":material/functions:", on_change=_remember)
    if not st.session_state[KEY]:
        return
    about = _about(asked, choices)
    *given, family = about
    with fold:
        try:
            group = group_of(*given, asked)
        except Refusal as refusal:
            session.say_refused(str(refusal))
            if session.address("form"):
                st.button("The form with most runs", on_click=_write, args=("form", None))
            return
        _controls(group, choices, registry, family)
        found = worked_out(given, group, family, between())
        _shown(found, asked, choices, registry)
        if choices.dialects:
            session.note(HOUSE)
    before = st.session_state.get(f"{KEY}:found", (None, None))[0]
    st.session_state[f"{KEY}:found"] = (about, found)
    if before != about and not choices.dialects:
        st.rerun()


def _about(asked: Question, choices: Choices) -> tuple[str, ...]:
    """What the maxima depend on: state of the book, question, axes, form, family."""
    first = choices.colour if choices.colour in BY_COLOUR else FAMILIES[0]
    named = session.address("family", first)
    family = named if named in FAMILIES else first
    state, told = session.state_of_book(), filters.cache_key(asked)
    return state, told, choices.x, choices.y, session.address("form"), family


def _remember() -> None:
    session.set_address(**{NAME: "on" if st.session_state[KEY] else None})


# ---- the controls, kept in the address


def _controls(group: TrendGroup, choices: Choices, registry: Registry, family: str) -> None:
    places = st.columns(CONTROLS, gap="small", vertical_alignment="bottom")
    offered = [*group.forms, *([EVERY] if len(group.forms) > 1 else [])]
    with places[0]:
        _pick("form", "form", offered, group.form or EVERY,
              lambda name: f"{name} ({group.forms.get(name, sum(group.forms.values()))})")  # fmt: skip
    with places[1]:
        _pick("maxima by", "family", list(FAMILIES), family)
        if (named := session.address("family", family)) != family:
            session.say_refused(f"In the address, family cannot be {named!r}; {family} is shown.")
    with places[2], st.container(horizontal=True, vertical_alignment="bottom"):
        slope_range(axis_name(choices.x, registry))
    with places[3]:
        _switch("maxima on the chart", "maxima", True)
    with places[4]:
        _switch("means of repeats on the chart", "repeats", False)


def _pick(label: str, name: str, offered: list[str], value: str, written=str) -> None:
    st.session_state[f"{KEY}:{name}"] = value
    st.selectbox(label, offered, key=f"{KEY}:{name}", format_func=written, on_change=_chosen, args=(name,))


def _chosen(name: str) -> None:
    _write(name, st.session_state[f"{KEY}:{name}"])


def _write(name: str, value: str | None) -> None:
    session.set_address(**{name: value})


def _switch(label: str, name: str, first: bool) -> None:
    st.session_state[f"{KEY}:{name}"] = _is_on(name, first)
    st.toggle(label, key=f"{KEY}:{name}", on_change=_switched, args=(name, first))


def _switched(name: str, first: bool) -> None:
    value = st.session_state[f"{KEY}:{name}"]
    _write(name, None if value == first else "on" if value else "off")


def _is_on(name: str, first: bool) -> bool:
    return session.address(name, "on" if first else "off") == "on"


# ---- what is shown


def _shown(found: Statistics, asked: Question, choices: Choices, registry: Registry) -> None:
    x, y = (axis_name(key, registry) for key in (choices.x, choices.y))
    words, maxima, exponents, change, outliers, repeats = st.tabs(
        ["In words", "Maxima", "Slopes", "Change over time", "Outliers", "Repeats"]
    )
    with words:
        _words(found, asked, registry)
    with maxima:
        _table(tops_table([found.top, *found.tops], found.family, x, y), texts=1)
    with exponents:
        _table(slopes_table(found.slopes, x), texts=1)
    with change:
        session.note(found.changed.why or TWO_READINGS)
        _table(changes_table(found.changed, x, y), texts=1)
    with outliers:
        _outliers(found)
    with repeats:
        session.note(found.repeats.in_words())
        _table(repeats_table(found.repeats), texts=2)


def _table(lines: list[list[str]], texts: int) -> None:
    """Numbers to the right; a column of words at the end to the left, and none where it is empty."""
    if lines[0][-1] == "note" and not any(row[-1] for row in lines[1:]):
        lines = [row[:-1] for row in lines]
    last = len(lines[0]) - (lines[0][-1] == "note")
    if len(lines) > 1:
        session.table(lines[0], lines[1:], numeric=range(texts, last))


def _words(found: Statistics, asked: Question, registry: Registry) -> None:
    runs, book = found.group.runs, session.book()
    text = paragraphs(found, asked.in_words(), registry, axis_words((runs.x_key, runs.y_key), {}, registry))
    st.html(SHEET + "".join(f'<p class="lb-told">{html.escape(part)}</p>' for part in text))
    whole = "\n\n".join([*text, f"{book.name}, {local(now()):%Y-%m-%d}."])
    with st.container(horizontal=True):
        st.download_button("Save as text", whole, f"{runs.y_key}-{runs.x_key}.txt", "text/plain",
                           icon=":material/download:", on_click="ignore", key=f"{KEY}:save")  # fmt: skip
        with st.popover("Copy", icon=":material/content_copy:"):
            st.code(whole, language=None, wrap_lines=True, width=560)


def _outliers(found: Statistics) -> None:
    """Each outlier's sentence beside a touch that opens its run."""
    outlying = found.outlying.found
    session.note(found.outlying.why or told_in_words(outliers=outlying).partition(").")[0] + ").")
    for row in outlying.rows if outlying else ():
        code = str(found.group.runs.code[row.index])
        with st.container(horizontal=True, vertical_alignment="center"):
            st.button(code, key=f"{KEY}:open:{code}", on_click=_write, args=("run", code))
            st.html(html.escape(row.sentence.removeprefix(f"{code}: ")))


def _marks(found: Statistics, choices: Choices) -> FitMarks:
    drawn = []
    if _is_on("maxima", True):
        # a family's cross needs its colour, and a place that is known
        mine = found.tops if found.family == choices.colour else ()
        sure = [t for t in mine if t.maximum and not t.maximum.verdict]
        drawn = [{"name": t.name, **{k: getattr(t.maximum, k) for k in ENDS}}
                 for t in (found.top, *sure) if t.maximum and t.maximum.found]  # fmt: skip
    means = repeats_placed(found.group, found.repeats) if _is_on("repeats", False) else None
    return FitMarks(drawn, means)
