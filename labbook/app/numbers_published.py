"""Numbers, published: the series that others printed, in the house dialect; adding and withdrawing them."""

import html

import pandas as pd
import streamlit as st

from labbook.app import numbers_published_form, session
from labbook.app.shelf_forms import with_reason
from labbook.book.published_points import points, series_table
from labbook.registry.dialects import CHOICES
from labbook.registry.group import Registry
from labbook.registry.written import written

BIRTH = "labbook's own"  # where a print named no dialect
RULE = '<hr style="margin:0.4rem 0;border:none;border-top:1px solid rgba(128,128,128,0.25)">'


@st.cache_data(max_entries=8, show_spinner=False)
def _series(state: str) -> dict[str, list[dict]]:
    """Series -> a row for each pair of numbers that it has points for."""
    found: dict[str, list[dict]] = {}
    for row in session.book().ask(series_table):
        found.setdefault(row["series"], []).append(row)
    return found


@st.cache_data(max_entries=64, show_spinner=False)
def _points(state: str, series: str, x: str, y: str) -> pd.DataFrame:
    return session.book().ask(points, x, y, series=series)


def part() -> None:
    """The part of the page: what the book has on the left, one more point on the right."""
    registry, state = session.registry(), session.state_of_book()
    session.note(
        "Points that others printed stand beside the runs on Trends: hollow diamonds, restated to the dialect "
        "shown there. They are never counted among the runs."
    )
    left, right = st.columns([54, 46], gap="medium")
    with right:
        numbers_published_form.form(registry)
    with left:
        series = _series(state)
        for name, rows in series.items():
            _one(state, name, rows, registry)
        if not series:
            session.note("No published point yet: type the first one beside, or load a sheet of them.")
        _sheet(bool(series))


def _one(state: str, series: str, rows: list[dict], registry: Registry) -> None:
    words, act = st.columns([70, 30], vertical_alignment="top")
    words.html(
        f"<div><b>{html.escape(series)}</b></div>"
        f'<div class="lb-note">{html.escape(rows[0]["citation"])}</div>'
    )
    with act, st.container(horizontal=True, horizontal_alignment="right"):
        _withdraw(series)
    for row in rows:
        x, y, n = row["x"], row["y"], row["points"]
        with st.container(horizontal=True, gap="medium", vertical_alignment="center"):
            session.note(f"{y} against {x}, {n} point{'' if n == 1 else 's'}")
            st.page_link(
                st.session_state["pages"]["trends"], label="on Trends", icon=":material/arrow_forward:",
                query_params={"x": x, "y": y},
            )  # fmt: skip
        with st.expander("Points in the house dialect"):
            _table(_points(state, series, x, y), x, y, registry)
    st.html(RULE)


def _table(found: pd.DataFrame, x: str, y: str, registry: Registry) -> None:
    """Each point as the house says it, and as it was printed."""
    mixed = [k for k in (x, y) if found[f"dialect_{k}"].nunique() > 1]
    noted = ["note"] if (found["note"] != "").any() else []
    rows = [
        (*(written(row[k], row[f"u_{k}"]) for k in (x, y)), *(row[f"printed_{k}"] for k in (x, y)),
         *(row[f"dialect_{k}"] or BIRTH for k in mixed), *(row[name] for name in noted))
        for row in found.to_dict("records")
    ]  # fmt: skip
    header = (x, y, f"{x} in print", f"{y} in print", *(f"dialect of {k}" for k in mixed), *noted)
    if rows:
        session.table(header, rows, numeric=(0, 1, 2, 3))
    for reason, n in found.attrs["lost"].items():
        session.note(f"{n} point{'' if n == 1 else 's'} not in the table: {reason}.")
    if rows:
        one = [
            f"{k} {found[f'dialect_{k}'].iloc[0] or BIRTH}" for k in (x, y) if k in CHOICES and k not in mixed
        ]
        session.note(f"Dialect of the print: {'; '.join(one)}." if one else "")
    told = [f"{k}: {registry.numbers[k].dialect}" for k in (x, y) if k in registry.numbers]
    session.note(f"House dialect of {'; of '.join(told)}." if told else "")


def _withdraw(series: str) -> None:
    with st.popover("Withdraw", icon=":material/inventory_2:"):
        session.note(f"{series} leaves the plots; its points stay in the book.")
        with_reason(f"withdraw:{series}", f"Withdraw {series}", lambda why: _gone(series, why))


def _gone(series: str, why: str) -> str:
    session.book().withdraw("published", series, why=why, by=session.handle())
    return f"{series} is withdrawn; its points stay in the book"


def _sheet(more: bool) -> None:
    st.page_link(
        st.session_state["pages"]["shelf"], label="Load a sheet of points", icon=":material/upload:",
        query_params={"add": "sheet"},
    )  # fmt: skip
    session.note(
        f"A file published.csv has a line for each point{' of any series' if more else ''}, with the columns "
        "series, citation, x, x_value, x_dialect, y, y_value, y_dialect; a number's key stands under x and y."
    )
