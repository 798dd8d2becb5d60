"""The readings that a run's viscosity was resolved from, as typed, with the way to their batch."""

import streamlit as st

from labbook.app import session
from labbook.book.run_sheet import RunSheet
from labbook.book.shelf_pages import OnShelf, ReadingLine, on_shelf
from labbook.registry.quantities import QUANTITIES


@st.cache_data(max_entries=16, show_spinner=False)
def _batch(state: str, fluid: str) -> OnShelf | None:
    return next((item for item in session.book().ask(on_shelf, "fluid") if item.code == fluid), None)


def readings_behind(sentence: str, batch: OnShelf) -> list[ReadingLine]:
    """The kept readings of the set that a viscosity's sentence names by its date; an undated one has the batch's."""
    made = batch.cells.get("made")

    def named(on: str | None) -> bool:
        return f"of {on}" in sentence if on else "without date" in sentence

    found = [r for r in batch.kept("mu", "nu") if named(r.on or made)] if "reading" in sentence else []
    return sorted(found, key=lambda r: (r.T is None, r.T or 0.0, r.code))


def show(sheet: RunSheet) -> None:
    """Each reading of the set: value and temperature as typed, code; below them the link to the batch."""
    batch = _batch(session.state_of_book(), sheet.texts["fluid"])
    found = readings_behind(sheet.sentences.get("mu_from", ""), batch) if batch else []
    if not found:
        return
    rows = [(QUANTITIES[r.key].symbol, r.value_text, r.T_text, r.how, r.code) for r in found]
    session.table(("", "readings of that set", "T", "how", "reading"), rows, numeric=(1, 2))
    st.page_link(st.session_state["pages"]["shelf"], label=f"{batch.code} on the shelf", icon=":material/link:",
                 query_params={"kind": "fluid", "item": batch.code})  # fmt: skip
