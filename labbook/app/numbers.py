"""Numbers: the page's frame, its parts behind one control, and the counts that they share."""

import streamlit as st

from labbook.app import (
    numbers_dialects,
    numbers_form,
    numbers_published,
    numbers_quantities,
    numbers_reference,
    numbers_regimes,
    session,
)
from labbook.book.asking import Question
from labbook.book.queries import key_counts, regime_counts

PARTS = {
    "numbers": "Numbers", "new": "New number", "regimes": "Regimes", "dialects": "Dialects",
    "published": "Published", "quantities": "Quantities",
}  # fmt: skip


@st.cache_data(max_entries=8, show_spinner="Counting the book's runs")
def _counts(state: str) -> tuple[dict[str, int], dict[str, int]]:
    """Kept runs that have each number, and that lie in each regime."""
    book = session.book()
    return book.ask(key_counts, book.registry.numbers), book.ask(regime_counts, Question())


def page() -> None:
    """The page."""
    part = session.address("part", "numbers")
    if part not in PARTS:
        session.say_refused(f"part {part!r}: not understood; there are {', '.join(PARTS)}.")
        part = "numbers"
    st.session_state["numbers:part"] = part

    def choose():
        session.set_address(part=st.session_state["numbers:part"] or part, number=None, edit=None)

    st.segmented_control("Part", list(PARTS), key="numbers:part", format_func=PARTS.get, on_change=choose,
                         label_visibility="collapsed")  # fmt: skip
    counts, held = _counts(session.state_of_book())
    if part != "new":
        numbers_form.forget_saved()
    match part:
        case "numbers":
            numbers_reference.part(counts, held)
        case "new":
            numbers_form.part()
        case "regimes":
            numbers_regimes.part(held)
        case "dialects":
            numbers_dialects.part()
        case "published":
            numbers_published.part()
        case "quantities":
            numbers_quantities.part()
