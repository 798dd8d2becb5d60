"""Ledger: who did what, when and why, newest first, and whether the chain still holds."""

import streamlit as st

from labbook.app import ledger_rows, session
from labbook.book.clock import local
from labbook.book.ledger_pages import PAGE, chain_state, ledger_page, people_and_acts

FILTERS = ("by", "act", "code")


@st.cache_data(max_entries=4, show_spinner="Verifying the ledger's chain")
def _chain(state: str) -> tuple[int, int | None, str]:
    return session.book().ask(chain_state)


def page() -> None:
    """The page."""
    _state()
    people, acts = session.book().ask(people_and_acts)
    if not acts:
        _teach()
        return
    chosen = _filters(people, acts)
    here = session.address("page", "1")
    here = int(here) if here.isdecimal() and 0 < len(here) < 8 else 1
    lines, total = session.book().ask(ledger_page, **chosen, page=here)
    if not lines and total:
        here = 1
        lines, total = session.book().ask(ledger_page, **chosen)
    if not lines:
        session.note(f"No line of the ledger fits {', '.join(f'{k} {v}' for k, v in chosen.items() if v)}.")
        return
    ledger_rows.show(lines, "page")
    _turn(here, total)


def _state() -> None:
    """The chain's state in one line; verified once for each state of the book, and again on demand."""
    lines, broken, at = _chain(session.state_of_book())
    words = f"{lines} line{'s' if lines != 1 else ''}"
    with st.container(horizontal=True, vertical_alignment="center"):
        if broken is None:
            session.note(
                f"{words}; the chain holds, verified at {local(at):%H:%M:%S}. Each line carries the digest "
                "of the one before."
            )
        else:
            session.say_refused(
                f"{words}; line {broken} does not follow from the one before: it, or a line before "
                "it, was changed or removed outside labbook. labbook check says more."
            )
        if st.button("Verify again", key="ledger:verify", type="tertiary"):
            _chain.clear()
            st.rerun()


def _teach() -> None:
    st.header("Nothing has been done in this book yet")
    st.write(
        "Every act leaves one line here that nobody can take back: who, when, what it was before and "
        "after, and why. Add a fluid on the shelf or log a run on the bench, and it appears."
    )


def _filters(people: list[str], acts: list[str]) -> dict[str, str]:
    """Person, act and code, from and into the address; what the ledger lacks is said and left out."""
    known = {"by": people, "act": acts}
    chosen = {k: session.address(k).strip() for k in FILTERS}
    for key, words in known.items():
        if chosen[key] and chosen[key] not in words:
            session.say_refused(
                f"{key} {chosen[key]!r}: the ledger has no such {'person' if key == 'by' else key}."
            )
            chosen[key] = ""

    def write():
        values = {k: st.session_state.get(f"ledger:{k}") or None for k in FILTERS}
        session.set_address(**values, page=None)

    for key in FILTERS:
        st.session_state[f"ledger:{key}"] = chosen[key] or (None if key != "code" else "")
    who, act, code, clear = st.columns([3, 3, 3, 1], vertical_alignment="bottom")
    who.selectbox("Person", people, index=None, key="ledger:by", placeholder="anyone", on_change=write)
    act.selectbox("Act", acts, index=None, key="ledger:act", placeholder="any", on_change=write)
    code.text_input("Run, fluid, swimmer … by code", key="ledger:code", placeholder="R-0012", on_change=write)
    clear.button(
        "All",
        key="ledger:clear",
        disabled=not any(chosen.values()),
        width="stretch",
        on_click=lambda: session.set_address(by=None, act=None, code=None, page=None),
    )
    return chosen


def _turn(here: int, total: int) -> None:
    if total <= PAGE:
        session.note(f"{total} line{'s' if total != 1 else ''} shown: all there are.")
        return
    pages = -(-total // PAGE)

    def go(n):
        session.set_address(page=str(n))

    with st.container(horizontal=True, vertical_alignment="center"):
        st.button("Newer", key="ledger:newer", disabled=here <= 1, on_click=go, args=(here - 1,))
        st.button("Older", key="ledger:older", disabled=here >= pages, on_click=go, args=(here + 1,))
        session.note(f"lines {(here - 1) * PAGE + 1} to {min(here * PAGE, total)} of {total}, newest first")
