"""Published points: what others printed, entered one by one or loaded as a sheet, beside the group's runs."""

import streamlit as st

from labbook.app import session
from labbook.book.published_points import points, series_table
from labbook.book.records import KINDS
from labbook.registry.dialects import CHOICES
from labbook.registry.written import written

PLACE = "numbers:published"
FIELDS = ("series", "citation", "x_value", "x_dialect", "y_value", "y_dialect", "L_tail", "L_body", "d", "note")
HINTS = {
    "series": "pond-2019", "citation": "Pond & Weir, ... (2019)", "x_value": "2.0(1)", "y_value": "0.0120(6)",
    "x_dialect": "rate:f,power:1", "y_dialect": "", "L_tail": "24 mm", "L_body": "30 mm", "d": "1 mm",
}  # fmt: skip


@st.cache_data(max_entries=8, show_spinner=False)
def _series(state: str) -> list[dict]:
    return session.book().ask(series_table)


def part() -> None:
    """The part of the page."""
    session.note("Points that others printed stand beside the runs on Trends, restated to the dialect shown there, with "
                 "a mark of their own. They are never counted among the runs.")  # fmt: skip
    rows = _series(session.state_of_book())
    for row in rows:
        _one(row)
    if not rows:
        session.note("None yet. Enter one below, or load a sheet published.csv on the Shelf page (Load sheets).")
    _form()


def _one(row: dict) -> None:
    series = row["series"]
    words, act = st.columns([80, 20], vertical_alignment="center")
    with words:
        n = row["points"]
        session.table((series, "", ""), [(row["citation"], f"{row['y']} against {row['x']}",
                                          f"{n} point{'s' if n != 1 else ''}")])  # fmt: skip
        st.page_link(st.session_state["pages"]["trends"], label="on Trends", icon=":material/arrow_forward:",
                     query_params={"x": row["x"], "y": row["y"]})  # fmt: skip
        found = session.book().ask(points, row["x"], row["y"])
        mine = found[found["series"] == series]
        with st.expander("in the house dialect"):
            cells = [tuple(written(p[k], p[f"u_{k}"]) for k in (row["x"], row["y"])) for p in mine.to_dict("records")]
            session.table((row["x"], row["y"]), cells, numeric=(0, 1))
            for sentence, count in found.attrs["lost"].items():
                session.note(f"{count} without a value: {sentence}")
    with act, st.popover("Withdraw"):
        place = f"{PLACE}:withdraw:{series}"
        why = st.text_input("Why?", key=f"{place}:why")
        _refused(place)
        if st.button("Withdraw the series", key=f"{place}:go"):
            if session.attempt(
                lambda: session.book().withdraw("published", series, why=why, by=session.handle()), place
            ):
                session.keep_message(f"{series} is withdrawn; its points stay in the book, and off the plots.")
            st.rerun()


def _form() -> None:
    """One point as typed; what is refused stands at its field and keeps what was typed."""
    st.html('<h3 style="margin:0.6rem 0 0.2rem 0">A point</h3>')
    registry = session.registry()
    refused = session.refused(PLACE)
    cells: dict[str, str] = {}
    first, second = st.columns(2)
    for column, name, options in ((first, "x", list(registry.numbers)), (second, "y", list(registry.numbers))):
        with column:
            start = options.index({"x": "Sp", "y": "U_scaled"}[name])
            cells[name] = st.selectbox(name, options, start, key=f"{PLACE}:{name}")
            _say(refused, name)
            if cells[name] in CHOICES:
                told = "; ".join(f"{c}: {', '.join(map(str, o))}" for c, o in CHOICES[cells[name]].items())
                session.note(f"dialect choices: {told}; empty is labbook's dialect at birth")
    for place, name in enumerate(FIELDS):
        with (first, second)[place % 2]:
            cells[name] = st.text_input(name, key=f"{PLACE}:{name}", placeholder=HINTS.get(name, ""))
            _say(refused, name)
    for field, sentence in refused.items():
        if field not in (*FIELDS, "x", "y"):
            session.say_refused(sentence)
    waiting = session.warned(PLACE)
    session.warn(waiting)
    if st.button("It is right, add it" if waiting else "Add the point", type="primary", key=f"{PLACE}:go"):
        typed = {k: v for k, v in cells.items() if v and k in KINDS["published"].columns}
        if session.attempt(
            lambda: session.book().stock("published", by=session.handle(), confirm=bool(waiting), **typed), PLACE
        ):
            for name in ("x_value", "y_value"):  # the series goes on: only the point is new
                st.session_state.pop(f"{PLACE}:{name}", None)
            session.keep_message(f"A point of {typed['series']} is added.")
        st.rerun()


def _say(refused: dict[str, str], name: str) -> None:
    if name in refused:
        session.say_refused(refused[name])


def _refused(place: str) -> None:
    for sentence in session.refused(place).values():
        session.say_refused(sentence)
