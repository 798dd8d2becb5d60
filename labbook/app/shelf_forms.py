"""Forms of the shelf: add or amend one record, add a reading; refusals at the field, one confirming touch."""

from collections.abc import Callable, Mapping
from datetime import date

import streamlit as st

from labbook.app import cautions, session
from labbook.app.shelf_fields import AT_RUN, CHOOSES, COLUMNS, EXAMPLES, LABELS, ONLY_WITH, READ_OF
from labbook.book.cautions import ADDED
from labbook.book.ledger_pages import newest_line
from labbook.book.records import KINDS
from labbook.book.shelf_pages import OnShelf, every_code, offered
from labbook.registry.quantities import QUANTITIES

WARN = "It is right, save it"


def add_record(kind: str) -> None:
    """The form of a new fluid, material, swimmer or rig."""

    def save(cells, confirm):
        known = session.book().ask(every_code, kind)
        code = session.book().stock(kind, by=session.handle(), confirm=confirm, **_filled(cells))
        session.set_address(item=code, add=None)
        if code in known:
            session.keep_message(f"{code} stood on the shelf already, just so: nothing was added")
        else:
            session.keep_message(f"{code} is on the shelf")

    left, right = st.columns([68, 32], gap="medium")
    with left:
        _form(kind, f"add:{kind}", save, "Add to the shelf", {}, across=3)
    with right:
        cautions.show(ADDED[kind])


def amend_record(item: OnShelf) -> None:
    """The form of a record that is on the shelf, filled with what stands there; the reason is required."""

    def save(cells, confirm):
        changed = {k: v for k, v in cells.items() if v != item.cells.get(k, "") and k != "why"}
        before = session.state_of_book()
        session.book().stock(
            item.kind, by=session.handle(), confirm=confirm, why=cells["why"], code=item.code, **changed
        )
        if session.state_of_book() == before:
            session.keep_message(f"{item.code}: nothing would change", ":material/info:")
        else:
            session.keep_message(f"{item.code} is amended; {runs_again()}")

    start = {k: v for k, v in item.cells.items() if k != "code"}
    _form(item.kind, f"amend:{item.kind}:{item.code}", save, "Amend", start, reason=True)


def fill_reading(item: OnShelf, cells: Mapping[str, str]) -> None:
    """Put cells into the fields of the reading's form; for callbacks."""
    place = f"read:{item.kind}:{item.code}"
    for column, text in cells.items():
        st.session_state[f"{place}:{_version(place)}:{column}"] = text


def add_reading(item: OnShelf) -> None:
    """The form of a new reading of a fluid or material."""

    def save(cells, confirm):
        code = session.book().stock(
            "reading", by=session.handle(), confirm=confirm, of=item.code, **_filled(cells)
        )  # fmt: skip
        session.keep_message(f"reading {code} of {item.code} is in the book; {runs_again()}")

    begin = {"on": date.today().isoformat()}
    _form("reading", f"read:{item.kind}:{item.code}", save, "Add the reading", begin, of=item.kind)


def with_reason(place: str, label: str, act: Callable[[str], str]) -> None:
    """A reason and a button; `act` takes the reason and returns what to say when it is done."""

    def send(version):
        why = st.session_state.get(f"{place}:{version}:why", "")
        if version == _version(place) and session.attempt(lambda: session.keep_message(act(why)), place):
            _next(place)

    version = _version(place)
    with st.form(f"form:{place}", border=False):
        st.text_input("Reason", key=f"{place}:{version}:why", placeholder="kept in the ledger")
        for sentence in session.refused(place).values():
            session.say_refused(sentence)
        st.form_submit_button(label, on_click=send, args=(version,))


def runs_again() -> str:
    """What the newest ledger line says about runs: '148 runs were derived again'."""
    line = session.book().ask(newest_line)
    n = line.n_runs if line else 0
    return f"{n} run{'s were' if n != 1 else ' was'} derived again" if n else "no run was derived again"


# ---- one form for all


def _form(kind, place, save, label, start, reason=False, of="", across=2) -> None:
    version = _version(place)

    def key(column):
        return f"{place}:{version}:{column}"

    chosen = _choices(kind, place, key, start, of, amending=reason)
    columns = [c for c in COLUMNS[kind] if _offered(c, chosen, start) and not (reason and c == "code")]
    wanted = [*CHOOSES.get(kind, ()), *columns, *(["why"] if reason else [])]

    def send(confirm):
        _send(place, version, {c: _typed(key(c)) for c in wanted}, save, confirm)

    with st.form(f"form:{place}", border=False):
        for row in range(0, len(columns), across):
            for spot, column in zip(st.columns(across), columns[row : row + across], strict=False):
                with spot:
                    _field(kind, column, key(column), start.get(column, ""), chosen)
                    _refusal(place, column)
        if reason:
            st.text_input("why", key=key("why"), placeholder="the reason, kept in the ledger")
            _refusal(place, "why")
        for column, sentence in session.refused(place).items():
            if column not in wanted:
                session.say_refused(sentence)
        waiting = session.warned(place)
        for sentence in waiting:
            st.warning(sentence)
        with st.container(horizontal=True):
            st.form_submit_button(
                label, type="secondary" if waiting else "primary", on_click=send, args=(False,)
            )
            if waiting:
                st.form_submit_button(WARN, type="primary", on_click=send, args=(True,))


def _choices(kind, place, key, start, of, amending) -> dict[str, str]:
    """What decides which fields follow, chosen by touch before them."""
    chosen = {}
    for column in CHOOSES.get(kind, ()):
        words = READ_OF[of] if of else KINDS[kind].words[column]
        if kind == "reading" and len(words) == 1:
            st.session_state[key(column)] = words[0]
            chosen[column] = words[0]
            continue
        if column == "section" and chosen["form"] == "undulating" and not start.get(column):
            continue
        if key(column) not in st.session_state:
            usual = words[0] if column != "section" or not amending else None
            st.session_state[key(column)] = start.get(column) or usual
        chosen[column] = st.segmented_control(
            {"key": "what was measured"}.get(column, column), words, key=key(column), format_func=_word
        ) or ""  # fmt: skip
        _refusal(place, column)
    return chosen


def _word(word: str) -> str:
    return (
        f"{QUANTITIES[word].symbol} {QUANTITIES[word].name.removesuffix(AT_RUN)}"
        if word in QUANTITIES
        else word
    )


def _offered(column, chosen, start) -> bool:
    if column not in ONLY_WITH or start.get(column):
        return True
    return bool(ONLY_WITH[column] & set(chosen.values()))


def _field(kind, column, key, value, chosen) -> None:
    row = KINDS[kind]
    if column in row.refers:
        codes = session.book().ask(offered, row.refers[column])
        codes = codes if not value or value in codes else [value, *codes]
        st.selectbox(LABELS[column], codes, index=codes.index(value) if value else None, key=key,
                     placeholder="none")  # fmt: skip
        return
    example = EXAMPLES.get(chosen.get("key", "") if column == "value" else column, "")
    if isinstance(example, dict):
        example = example.get(chosen.get("key", ""), "") if column == "how" else example.get(kind, "")
    if key not in st.session_state:
        st.session_state[key] = value
    st.text_input(_label(kind, column, chosen), key=key, placeholder=example)


def _label(kind, column, chosen) -> str:
    needed = " *" if column in KINDS[kind].required else ""
    if column == "value" and chosen.get("key"):
        return f"{_word(chosen['key'])}{needed}"
    if column in KINDS[kind].spreads:
        return f"u({QUANTITIES[KINDS[kind].spreads[column]].symbol}) {LABELS[column]}"
    if column in QUANTITIES:
        name = LABELS.get(column) or QUANTITIES[column].name.removesuffix(AT_RUN)
        return f"{QUANTITIES[column].symbol} {name}{needed}"
    return LABELS.get(column, column) + needed


def _refusal(place: str, column: str) -> None:
    sentence = session.refused(place).get(column)
    if sentence:
        session.say_refused(sentence)


def _typed(key: str) -> str:
    return str(st.session_state.get(key) or "").strip()


def _filled(cells: Mapping[str, str]) -> dict[str, str]:
    return {k: v for k, v in cells.items() if v}


def _send(place, version, cells, save, confirm) -> None:
    """Attempt the act once for each filling of the form; a confirmation holds for its own cells."""
    if version != _version(place):
        return
    asked = st.session_state.get(f"asked:{place}") == cells
    if session.attempt(lambda: save(cells, confirm and asked), place):
        _next(place)
    st.session_state[f"asked:{place}"] = cells


def _version(place: str) -> int:
    return st.session_state.get(f"version:{place}", 0)


def _next(place: str) -> None:
    """The act is done: fresh, empty fields, and the old ones answer no second click."""
    st.session_state[f"version:{place}"] = _version(place) + 1
