"""Bench's lower part: today's trials, newest first; pick one to open or to start again with one change."""

from datetime import datetime

import pandas as pd
import streamlit as st

from labbook.app import session
from labbook.app.record_parts import fact
from labbook.book.asking import Question
from labbook.book.bench_queries import cells_again
from labbook.book.run_sheet import RunSheet
from labbook.registry.written import written

SHOWN = 12
COPIED = ":material/content_copy:"
NUMBERS = ("Sp", "Re_omega", "St")


@st.cache_data(show_spinner=False, max_entries=20)
def _sheets(state: str, since: str) -> list[RunSheet]:
    book = session.book()
    found = book.sheets(Question(since=since, state="all"), newest=60)
    return found if len(found) >= SHOWN else book.sheets(Question(state="all"), newest=SHOWN)


def table() -> None:
    """The trials of today, and the latest ones before where today has few."""
    day = datetime.now().astimezone().date().isoformat()
    found = _sheets(session.state_of_book(), day)
    if not found:
        return
    today = [s for s in found if s.texts["at"][:10] == day]
    void = sum(s.texts["state"] == "void" for s in today)
    trials = f"{len(today)} trial{'s' if len(today) != 1 else ''}, {void} void"
    st.markdown(f"**Today** · {trials}" + (", and the latest before" if len(today) < len(found) else ""))
    frame = pd.DataFrame([_row(s, day) for s in found])
    picked = st.dataframe(
        frame, hide_index=True, on_select="rerun", selection_mode="single-row", key="bench:today",
        height=min(38 + 36 * len(frame), 440), row_height=36,
    )  # fmt: skip
    rows = picked["selection"]["rows"]
    if rows and rows[0] < len(found):
        _acts(found[rows[0]])
    else:
        st.caption("Tick a line to open it, or to start again from it with one change.")


def _row(sheet: RunSheet, day: str) -> dict[str, str]:
    texts = sheet.texts
    at = texts["at"][11:16] if texts["at"][:10] == day else texts["at"][:16].replace("T", " ")
    typed = {k: fact(sheet, k) for k in ("f", "U")}
    numbers = {k: written(sheet.values[k], sheet.u[k]) for k in NUMBERS}
    return {
        "run": texts["code"], "at": at, "by": texts["by"], "swimmer": texts["swimmer"], "fluid": texts["fluid"],
        **typed, **numbers, "regime": ", ".join(sheet.regimes),
        "note": (f"void: {texts['why']}" if texts["state"] == "void" else texts["note"]) or "",
    }  # fmt: skip


def _acts(sheet: RunSheet) -> None:
    code = sheet.texts["code"]
    first, second, _ = st.columns([2, 3, 6])
    if first.button(f"Open {code}", width="stretch"):
        session.go("runs", run=code)
    if second.button("Again, with one change", width="stretch"):
        st.session_state["again"] = session.book().ask(cells_again, code)
        session.keep_message(f"The settings of {code} stand in the form: change one, type what was seen", COPIED)
        st.rerun()
