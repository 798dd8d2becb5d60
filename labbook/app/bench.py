"""Bench: log a trial in under thirty seconds, with its numbers, its place on the plot, and today's trials."""

import streamlit as st

from labbook.api import Book
from labbook.app import bench_plan, bench_track, cautions, live, series, session, today
from labbook.book.bench_queries import counts_of_book, kinds_chosen, summary_of
from labbook.book.cautions import at_the_bench
from labbook.book.queries import recent
from labbook.book.records import DRIVES
from labbook.registry.quantities import QUANTITIES

SET = ("f", "theta0", "B", "T")
SEEN = ("U", "A_tip")
MORE = ("I_coil", "h0", "T_end", "h_wall", "D_tank")
TEXTS = ("series", "video", "at")
EXAMPLES = {
    "f": "0.50 Hz", "theta0": "12 deg", "B": "4.2 mT", "T": "22.4 degC", "U": "0.079(4) mm/s",
    "A_tip": "5.8(2) mm", "I_coil": "1.50 A", "h0": "2.0 mm", "T_end": "22.6 degC", "h_wall": "30 mm",
    "D_tank": "80 mm", "series": "a label for a sweep", "video": "file or address",
    "at": "now, or 2026-03-01T14:32",
}  # fmt: skip
LABELS = {
    "f": "f frequency", "theta0": "θ₀ angle", "B": "B flux", "T": "T fluid",
    "U": "U speed, head first positive", "A_tip": "A_tip tail tip, peak to peak", "T_end": "T at the end",
    "at": "time", "series": "series", "video": "video",
}  # fmt: skip
CHOICES = ("swimmer", "fluid", "rig")
PLACE = "bench"


def page() -> None:
    """The page."""
    book = session.book()
    if not book.ask(counts_of_book)["swimmer"] or not book.ask(counts_of_book)["fluid"]:
        _empty(book)
        return
    _take_over()
    bench_plan.row()
    if st.session_state.get("bench:as-series"):
        series.grid(_choices(book))
    else:
        left, right = st.columns([46, 54], gap="medium")
        with left:
            cells, track = _form(book)
        with right:
            live.panel(cells | track.cells)
            bench_track.chart(track)
    today.table()


def _empty(book: Book) -> None:
    """An empty book shows the three things to do first."""
    st.header("An empty book: three things to do first")
    st.markdown(
        "1. On **Shelf**, add a *fluid* batch and its viscosity readings.\n"
        "2. On **Shelf**, add the *material* batch and a *swimmer* built from it; a *rig* if you have one.\n"
        "3. Come back here and log the first trial.\n\n"
        "Or load a whole shelf folder: `labbook load BOOK FOLDER`. "
        "To look around first, `labbook demo` opens an invented group's year."
    )
    if st.button("To the shelf", type="primary"):
        session.go("shelf")


def _take_over() -> None:
    """Set fields before they are drawn: emptied after logging, or filled from an earlier run."""
    if st.session_state.pop("bench:seen-logged", False):
        for key in (*SEEN, "note"):  # what was seen belongs to the trial that is logged
            st.session_state[f"bench:{key}"] = ""
    cells = st.session_state.pop("again", None)
    if cells is None:
        return
    for key in (*CHOICES, *SET, *SEEN, *MORE, *TEXTS, "note", "drive"):
        st.session_state[f"bench:{key}"] = cells.get(key, "") or None
    session.forget(PLACE)


def _choices(book: Book) -> dict[str, str]:
    """Swimmer, fluid and rig, last ones first, and one line of what the book knows of them."""
    chosen = {}
    for column, name in zip(st.columns(3), CHOICES, strict=True):
        codes = book.ask(recent, name)
        key = f"bench:{name}"
        if st.session_state.get(key) not in codes:
            st.session_state[key] = codes[0] if codes and name != "rig" else _usual_rig(book, codes)
        with column:
            chosen[name] = st.selectbox(name.capitalize(), codes, key=key, placeholder="none") or ""
            _refusal(name)
    session.note(book.ask(summary_of, chosen["swimmer"], chosen["fluid"]))
    cautions.fold(at_the_bench(*book.ask(kinds_chosen, chosen["fluid"], chosen["rig"])))
    return chosen


def _usual_rig(book: Book, codes: list[str]) -> str | None:
    return codes[0] if codes else None


def _form(book: Book) -> tuple[dict[str, str], bench_track.OnBench]:
    """The fields: the cells as typed, and the track that waits for the trial."""
    cells: dict[str, str] = dict(_choices(book))
    _fields(SET, cells, 4)
    _fields(SEEN, cells, 2)
    track = bench_track.offer(cells)
    with st.expander("more: current, walls, drive, series, time, planned sheet"):
        _fields(MORE, cells, 3)
        _fields(TEXTS, cells, 3)
        cells["drive"] = st.selectbox(
            "drive", DRIVES, index=None, key="bench:drive", placeholder="as usual for this swimmer"
        ) or ""  # fmt: skip
        bench_plan.drop()
    waiting = _waiting(cells)
    live.warnings(cells | track.cells, waiting)
    cells["note"] = st.text_input("Note", key="bench:note", placeholder="anything odd about this trial") or ""
    _refusal("note")
    _log(book, cells, bool(waiting), track)
    return cells, track


def _waiting(cells: dict[str, str]) -> list[str]:
    """The warnings that wait for a confirming touch; cells changed since are warned about anew."""
    if session.warned(PLACE) and st.session_state.get("bench:warned-of") != _but_note(cells):
        session.forget(PLACE)
    return session.warned(PLACE)


def _but_note(cells: dict[str, str]) -> dict[str, str]:
    return {k: v for k, v in cells.items() if k != "note"}


def _fields(keys: tuple[str, ...], cells: dict[str, str], columns: int) -> None:
    """Text inputs in bench order, each refused at its own place."""
    for start in range(0, len(keys), columns):
        row = keys[start : start + columns]
        for column, key in zip(st.columns(columns), row, strict=False):
            with column:
                label = LABELS.get(key) or f"{QUANTITIES[key].symbol} {QUANTITIES[key].name}"
                cells[key] = st.text_input(label, key=f"bench:{key}", placeholder=EXAMPLES[key]) or ""
                _refusal(key, cells)


def _refusal(key: str, cells: dict[str, str] | None = None) -> None:
    """What is refused in this field: as typed so far, or by the last attempt to log."""
    sentence = live.refused_in(key, cells) if cells is not None else session.refused(PLACE).get(key)
    if sentence is None and key in session.refused(PLACE) and not (cells or {}).get(key):
        sentence = session.refused(PLACE)[key]
    if sentence:
        session.say_refused(sentence)


def _log(book: Book, cells: dict[str, str], confirmed: bool, track: bench_track.OnBench) -> None:
    first, second, last = st.columns([3, 3, 5], vertical_alignment="center")
    label = "It is right, log it" if confirmed else "Log trial"
    if first.button(label, type="primary", key="bench:log", width="stretch"):
        given = {k: v for k, v in cells.items() if v}
        token = session.one_use_token(PLACE)
        codes: list[str] = []
        done = session.attempt(
            lambda: codes.append(
                book.record(by=session.handle(), token=token, confirm=confirmed, **given)
            ),
            PLACE,
        )  # fmt: skip
        st.session_state["bench:warned-of"] = _but_note(cells)
        if done:
            session.spend_token(PLACE)
            st.session_state["bench:last"] = codes[0]
            st.session_state["bench:seen-logged"] = True
            more = bench_track.attach(book, codes[0], track) + bench_plan.ticked(given, codes[0])
            session.keep_message(f"{codes[0]} is logged: {cells['swimmer']} in {cells['fluid']}, {cells['f']}{more}")
        st.rerun()
    if second.button("Series …", key="bench:to-series", width="stretch"):
        st.session_state["bench:as-series"] = True
        st.rerun()
    code = st.session_state.get("bench:last")
    if code:
        with last, st.container(key="lb-last"):
            st.page_link(st.session_state["pages"]["runs"], label=f"last: {code}, open or amend",
                         query_params={"run": code})
    bench_track.refused()
    general = {k: v for k, v in session.refused(PLACE).items() if k not in cells}
    for sentence in general.values():
        session.say_refused(sentence)
