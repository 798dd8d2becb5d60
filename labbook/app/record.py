"""One run on a page: its sheet, and the acts on it: amend, void, again with one change."""

import html
from collections.abc import Callable

import streamlit as st

from labbook.app import (
    record_budget,
    record_prediction,
    record_readings,
    record_track,
    session,
    track_fields,
)
from labbook.app import record_parts as parts
from labbook.book import ledger
from labbook.book.bench_queries import cells_again
from labbook.book.records import KINDS
from labbook.book.run_sheet import RunSheet, moment_in_words
from labbook.errors import Refusal

AMENDABLE = tuple(c for c in (*KINDS["run"].typed, *KINDS["run"].texts) if c not in ("code", "state", "why"))


def show(code: str, *, place: str, narrow: bool = False) -> None:
    """The sheet of one run; an unknown code is said.

    place: keeps the widgets of two pages apart; narrow: only the essentials, for a panel beside a chart.
    """
    try:
        sheet = parts.sheet_of(session.state_of_book(), code)
    except Refusal as refusal:
        session.say_refused(str(refusal))
        return
    with st.container(key=f"lb-record-{place}"):
        if narrow:
            _narrow(sheet, f"{place}:{code}")
        else:
            _whole(sheet, f"{place}:{code}")


def _narrow(sheet: RunSheet, place: str) -> None:
    code = sheet.texts["code"]
    _title(sheet)
    _void_line(sheet)
    if sheet.regimes:
        session.tags(sheet.regimes)
    parts.essentials(sheet)
    record_prediction.line(sheet)
    record_budget.show(sheet, place, narrow=True)
    st.page_link(
        st.session_state["pages"]["runs"],
        label="Open the whole sheet",
        icon=":material/open_in_full:",
        query_params={"run": code},
    )


def _whole(sheet: RunSheet, place: str) -> None:
    code = sheet.texts["code"]
    _title(sheet)
    _void_line(sheet)
    if sheet.regimes:
        session.tags(sheet.regimes)
    _acts(sheet, place)
    left, right = st.columns([42, 58], gap="medium")
    with left:
        parts.facts(sheet)
        parts.resolved(sheet)
        record_readings.show(sheet)
        parts.viscosity(sheet, place)
        record_budget.show(sheet, place)
    with right:
        parts.numbers(sheet)
        parts.picture(sheet, place)
        record_prediction.show(sheet, place)
    record_track.show(sheet, place)
    st.markdown("**Ledger**")
    parts.ledger(code)


def _title(sheet: RunSheet) -> None:
    texts = {k: html.escape(v or "") for k, v in sheet.texts.items()}
    line = f"{texts['swimmer']} in {texts['fluid']} · {moment_in_words(sheet.texts['at'])} · {texts['by']}"
    st.html(f'<div style="line-height:1.5"><b style="font-size:1.2rem">{texts["code"]}</b>&ensp;{line}</div>')


def _void_line(sheet: RunSheet) -> None:
    if sheet.texts["state"] == "void":
        session.say_refused(f"Void: {sheet.texts['why']}. It stays in the book and leaves the plots.")


# ---- acts


def _acts(sheet: RunSheet, place: str) -> None:
    chosen = st.session_state.get(f"{place}:act")
    is_void = sheet.texts["state"] == "void"
    with st.container(horizontal=True, gap="small"):
        track = () if is_void else (("track", "Replace the track" if sheet.track else "Drop a track"),)
        for act, label in (("amend", "Amend"), ("void", "Keep again" if is_void else "Void"), *track):
            st.button(
                label,
                key=f"{place}:{act}",
                on_click=_choose,
                args=(place, act),
                type="primary" if chosen == act else "secondary",
            )
        if st.button("Again, with one change", key=f"{place}:again"):
            st.session_state["again"] = session.book().ask(cells_again, sheet.texts["code"])
            said = f"The settings of {sheet.texts['code']} stand in the form: change one, type what was seen"
            session.keep_message(said, ":material/content_copy:")
            session.go("bench")
    if chosen == "amend":
        with st.container(border=True):
            _amend(sheet, place)
    elif chosen == "void":
        with st.container(border=True):
            _void(sheet, place, is_void)
    elif chosen == "track" and track:
        with st.container(border=True, key=f"lb-drop-{place}".replace(":", "-")):
            message = record_track.drop(sheet, place)
        if message:
            track_fields.done_with(place)
            _finish(place, message)


def _choose(place: str, act: str) -> None:
    """Open the fields of an act, or close them where they stand open."""
    was = st.session_state.get(f"{place}:act")
    st.session_state[f"{place}:act"] = None if was == act else act
    session.forget(place)


@st.cache_data(max_entries=32, show_spinner=False)
def _cells(state: str, code: str) -> dict[str, str]:
    return session.book().ask(lambda c: ledger.cells_of(c, ledger.run_row(c, code)))


def _amend(sheet: RunSheet, place: str) -> None:
    code = sheet.texts["code"]
    cells = _cells(session.state_of_book(), code)
    first, second, third = st.columns([3, 3, 4])
    with first:
        cell = st.selectbox(
            "Cell",
            AMENDABLE,
            format_func=lambda c: f"{c}: {cells[c]}" if c in cells else c,
            key=f"{place}:cell",
            on_change=session.forget,
            args=(place,),
        )
    with second:
        text = st.text_input(
            "New text; empty clears it",
            cells.get(cell, ""),
            key=f"{place}:new:{cell}",
            on_change=session.forget,
            args=(place,),
        )
        _refused(place, cell)
    with third:
        why = st.text_input("Why", key=f"{place}:why", placeholder="a few words for the ledger")
        _refused(place, "why")
    _others(place, (cell, "why"))

    def act(reason: str, confirm: bool) -> Callable[[], None]:
        return lambda: session.book().amend(
            code, why=reason, by=session.handle(), confirm=confirm, **{cell: text or None}
        )

    waiting = _warned(place)
    with st.container(horizontal=True, gap="small"):
        label = f"It is right, amend {code}" if waiting else f"Amend {code}"
        done = st.button(label, type="primary", key=f"{place}:do") and _attempt(act(why, waiting), place)
        if (
            sheet.logged
            and ledger.young_enough_for_typo(sheet.logged)
            and st.button(
                "It was a typo", key=f"{place}:typo", help=f"Within {ledger.TYPO_MINUTES} minutes of logging"
            )
        ):
            done = _attempt(act("typo", waiting), place)
    if done:
        _finish(place, f"{code} is amended: {cell} is now {text or 'empty'}.")


def _void(sheet: RunSheet, place: str, is_void: bool) -> None:
    code = sheet.texts["code"]
    label = f"Why is {code} to be kept after all?" if is_void else f"Why is {code} void?"
    why = st.text_input(label, key=f"{place}:why-void", placeholder="a few words for the ledger")
    _refused(place, "why")
    _others(place, ("why",))
    waiting = _warned(place)
    if not st.button(
        f"Keep {code} again" if is_void else f"Void {code}", type="primary", key=f"{place}:do-void"
    ):
        return
    by = session.handle()
    if is_void:
        done = _attempt(
            lambda: session.book().amend(code, why=why, by=by, state="kept", confirm=waiting), place
        )
    else:
        done = _attempt(lambda: session.book().void(code, why=why, by=by), place)
    if done:
        _finish(place, f"{code} is kept again." if is_void else f"{code} is void; its ledger says why.")


def _attempt(act: Callable[[], None], place: str) -> bool:
    """Try the act; where it was refused or warned about, show the page again with what was said."""
    if session.attempt(act, place):
        return True
    st.rerun()


def _finish(place: str, message: str) -> None:
    for name in [k for k in st.session_state if str(k).startswith((f"{place}:new:", f"{place}:why"))]:
        del st.session_state[name]
    st.session_state[f"{place}:act"] = None
    session.keep_message(message)
    st.rerun()


def _refused(place: str, field: str) -> None:
    if field in session.refused(place):
        session.say_refused(session.refused(place)[field])


def _others(place: str, shown: tuple[str, ...]) -> None:
    """What was refused about anything that has no field here."""
    for field, sentence in session.refused(place).items():
        if field not in shown:
            session.say_refused(sentence)


def _warned(place: str) -> bool:
    """Show what waits for one confirming touch, and say whether anything does."""
    for sentence in session.warned(place):
        st.warning(sentence, icon=":material/warning:")
    return bool(session.warned(place))
