"""Numbers, the form of a new number or of another version of an own one; refusals stand at their fields."""

import streamlit as st

from labbook.app import numbers_proof, numbers_suggest, session
from labbook.app.numbers_cells import cells_of
from labbook.book import queries
from labbook.book.asking import Question
from labbook.book.clock import local
from labbook.book.registry_rows import versions_of
from labbook.registry.group import Registry
from labbook.registry.own_numbers import FIELDS

LABELS = {
    "key": "key *", "symbol": "symbol", "name": "name *", "formula": "formula *",
    "compares": "compares *", "source": "source *", "example": "worked example *", "answer": "its answer *",
}  # fmt: skip
EXAMPLES = {
    "key": "Mg", "symbol": "as the key", "name": "magnetic number",
    "formula": "m_mag * B / (8 * pi * mu * b**3 * omega)", "compares": "magnetic to viscous torque",
    "source": "a paper, a book, or: own definition", "answer": "4.31",
    "example": "m_mag = 4.2 mA.m2, B = 5 mT, mu = 1 Pa.s, b = 2.5 mm, f = 2 Hz",
}  # fmt: skip
HELP = {
    "key": "A short plain name for columns, axes and files.",
    "formula": "Keys as listed under Quantities, with + - * / ** and brackets, numbers and pi.",
    "example": "A value with its unit for each input, from the source or worked by hand.",
    "answer": "What the formula must give for the example, with as many digits as you know.",
}
SAVED, DRAFT = "numbers:saved", "numbers:draft"
ROWS = (("key", "symbol", "name"), ("formula",), ("compares", "source"), ("example", "answer"))
PROVED = ("formula", "example", "answer")
WIDTHS = {ROWS[0]: [22, 22, 56], ROWS[3]: [72, 28]}


def part() -> None:
    """The form, what is known of its formula while it is typed, and suggestions."""
    registry = session.registry()
    editing = session.address("number")
    if editing and editing not in registry.own and not _withdrawn(session.state_of_book(), editing):
        session.say_refused(f"number {editing!r}: not one of the group's own, so it is not edited here.")
        editing = ""
    place = f"number:{editing or 'new'}"
    news = _news(place, registry, editing)
    form, live = st.columns([56, 44], gap="medium")
    with form:
        session.note(
            f"Another version of {editing}: earlier ones stay, and it is derived again for every run."
            if editing in registry.own else "A number of the group's own: a column of every run at once."
        )  # fmt: skip
        cells = _fields(place, registry, editing)
        _save(place, cells, unread=news)
    with live:
        if cells["formula"]:
            st.session_state.pop(SAVED, None)
        _saved()  # here, where it moves no field
        numbers_proof.show(cells)
    numbers_suggest.show(_key(place, "formula"))


@st.cache_data(max_entries=64, show_spinner=False)
def _withdrawn(state: str, key: str) -> str:
    """Who withdrew an own number, when and why; '' where no such number ever was."""
    versions = session.book().ask(versions_of, "number", key)
    if not versions:
        return ""
    last = versions[0]
    return f"{last['by']} withdrew it at {local(last['at']):%Y-%m-%d %H:%M}, because: {last['why']}"


def _news(place: str, registry: Registry, editing: str) -> bool:
    """Say that the number was withdrawn; True the first time, when nobody can have read it yet."""
    mark = f"{place}:withdrawn"
    if not editing or editing in registry.own:
        st.session_state.pop(mark, None)
        return False
    told = _withdrawn(session.state_of_book(), editing)
    session.say_refused(f"{editing} is no longer in the registry: {told}. What is typed here stays; saving "
                        "it makes it a number again.")  # fmt: skip
    first = not st.session_state.get(mark, False)
    st.session_state[mark] = True
    return first


def _key(place: str, column: str) -> str:
    return f"{place}:{st.session_state.get(f'version:{place}', 0)}:{column}"


def _fields(place: str, registry: Registry, editing: str) -> dict[str, str]:
    """The fields as rows of the form; returns what is typed in them."""
    start = st.session_state.get(DRAFT, {}) if not editing else {"key": editing}
    if editing in registry.own:
        start = cells_of(registry.own[editing])
    refused = _still_refused(place)
    for row in ROWS:
        for spot, column in zip(st.columns(WIDTHS.get(row, len(row)), gap="small"), row, strict=True):
            with spot:
                fixed = editing in registry.own and column == "key"
                _field(_key(place, column), column, start.get(column, ""), fixed)
                if column in refused:
                    session.say_refused(refused[column])
    cells = {column: _typed(_key(place, column)) for column in FIELDS}
    key = cells["key"]
    if key in registry.own and not editing:
        session.note(f"{key} stands in the registry, version {registry.versions[key]}: this makes "
                     "another version of it.")  # fmt: skip
    if key in registry.own or editing:  # a reason typed before somebody withdrew the number stays too
        star = " *" if key in registry.own else ""
        st.text_input(f"reason{star}", key=_key(place, "why"),
                      placeholder="why it changes, kept in the ledger")  # fmt: skip
        cells["why"] = _typed(_key(place, "why"))
        if "why" in refused:
            session.say_refused(refused["why"])
    for column, sentence in refused.items():
        if column not in (*FIELDS, "why"):
            session.say_refused(sentence)
    if not editing:  # a look at another part or page must not cost what was typed
        st.session_state[DRAFT] = cells
    return cells


def _still_refused(place: str) -> dict[str, str]:
    """What was refused at the last attempt, less what has been typed anew since."""
    tried = st.session_state.get(f"tried:{place}", {})
    changed = {column for column, text in tried.items() if _typed(_key(place, column)) != text}
    if changed & set(PROVED):  # these are refused for what they say together
        changed |= set(PROVED)
    return {column: text for column, text in session.refused(place).items() if column not in changed}


def _field(key: str, column: str, start: str, fixed: bool) -> None:
    if key not in st.session_state:
        st.session_state[key] = start
    st.text_input(LABELS[column], key=key, placeholder=EXAMPLES[column], help=HELP.get(column),
                  disabled=fixed)  # fmt: skip


def _typed(key: str) -> str:
    return str(st.session_state.get(key) or "").strip()


def _save(place: str, cells: dict[str, str], *, unread: bool) -> None:
    """The button; saving shows how far the runs are derived. Unread news want a second touch."""
    if not st.button("Save the number", type="primary", key=f"{place}:save") or unread:
        return
    book, key = session.book(), cells["key"]
    runs = book.ask(queries.count, Question(state="all"))
    bar, done = st.progress(0.0, text=f"proving {key or 'it'}"), [0]

    def step(n):
        done[0] += n
        bar.progress(min(done[0] / max(runs, 1), 1.0), text=f"deriving {done[0]} of {runs} runs")

    def act():
        before = session.state_of_book()
        given = {column: text for column, text in cells.items() if column != "why"}
        why = cells.get("why") or None
        version = session.book().define_number(by=session.handle(), why=why, progress=step, **given)
        st.session_state[SAVED] = (key, version, session.state_of_book() != before)
        st.session_state[f"version:{place}"] = st.session_state.get(f"version:{place}", 0) + 1
        st.session_state.pop(DRAFT, None)
        session.set_address(number=None)

    st.session_state[f"tried:{place}"] = cells
    session.attempt(act, place)
    st.rerun()


def _columns(key: str) -> tuple[str, ...]:
    """What a table of its runs shows: whose they are, its inputs and the number."""
    return ("at", "swimmer", "fluid", *session.registry().number(key).inputs, key)


def forget_saved() -> None:
    """The form was left: what was saved there is old news."""
    st.session_state.pop(SAVED, None)


def _saved() -> None:
    """What was saved last, with the ways to its runs; it leaves when another formula is typed."""
    saved = st.session_state.get(SAVED)
    if saved is None:
        return
    key, version, changed = saved
    if not changed:
        st.info(f"{key}: nothing would change", icon=":material/info:")
        return
    n = session.book().ask(queries.key_counts, (key,))[key]
    have = f"{n} kept run{'s have' if n != 1 else ' has'} it"
    st.success(f"{key} is in the registry, version {version}; {have}", icon=":material/check:")
    pages = st.session_state["pages"]
    with st.container(horizontal=True, gap="medium", vertical_alignment="center"):
        if n:
            asked = {"range": f"{key}:-inf:inf", "columns": ",".join(_columns(key))}
            st.page_link(pages["runs"], label="Runs with it", icon=":material/table_rows:",
                         query_params=asked)  # fmt: skip
            st.page_link(pages["trends"], label="on Trends", icon=":material/scatter_plot:",
                         query_params={"y": key})  # fmt: skip
        st.button("in the list", icon=":material/list:", type="tertiary", key="numbers:listed",
                  on_click=session.set_address, kwargs={"part": "numbers", "number": key})  # fmt: skip
