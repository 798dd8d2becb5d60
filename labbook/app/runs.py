"""Runs: ask by regime and range, read the answer as a table, open one run's sheet."""

import shlex
from urllib.parse import urlencode

import streamlit as st

from labbook.api import Book
from labbook.app import dialect_choices, filters, record, runs_repeats, runs_table, session
from labbook.book import addresses, queries
from labbook.book.asking import Question
from labbook.book.easing import eased
from labbook.charts.dialect_axis import HOUSE_ONLY
from labbook.exchange.outward import frame_as_csv, sheets_as_json
from labbook.registry.group import Registry

PLACE = "runs"
STEP = 200  # rows that stand in the table before "show more"


def page() -> None:
    """The page."""
    state = session.state_of_book()
    whole = _count(state, filters.cache_key(Question(state="all")), Question(state="all"))
    if not whole:
        _empty_book()
        return
    opened, registry = session.address("run"), session.registry()
    asked = filters.row(PLACE, regimes_open=not opened)
    dialects, said = dialect_choices.in_address(registry)
    for sentence in said:
        session.say_refused(sentence)
    columns = runs_table.chosen(registry)
    found = _count(state, filters.cache_key(asked), asked)
    _head(asked, found, whole, opened, columns, dialects, registry)
    if not found:
        _nothing(asked)
    else:
        _table(state, asked, columns, dialects, found, bool(opened), registry)
    if found and not opened:
        runs_repeats.folded(state, asked, registry)
    if opened:
        record.show(opened, place=PLACE)


@st.cache_data(max_entries=64, show_spinner=False)
def _count(state: str, told: str, _asked: Question) -> int:
    return session.book().ask(queries.count, _asked)


def _head(
    asked: Question, found: int, whole: int, opened: str, columns: tuple[str, ...], dialects: dict,
    registry: Registry,
) -> None:  # fmt: skip
    """The question in words with its count, the link and command that ask it again, columns and downloads."""
    with st.container(horizontal=True, gap="small", vertical_alignment="center"):
        with st.container(width="stretch"):
            only = f"; {HOUSE_ONLY}" if dialects else ""
            counts = f"{_spaced(found)} of {_spaced(whole)} runs"
            st.markdown(f"**{_escaped(asked.in_words())}**: {counts}{only}")
        runs_table.choose(columns, registry)
        runs_table.choose_dialects(columns, dialects, registry)
        with st.popover("Link", icon=":material/link:"):
            st.caption("A link that asks the same, while this app runs")
            st.code(_link(asked), language=None, wrap_lines=True)
            st.caption("The same from a terminal")
            spoken = addresses.dialect_texts(dialects, registry)
            st.code(_command(asked, spoken), language=None, wrap_lines=True)
        with st.popover("Save", icon=":material/download:", disabled=not found):
            _downloads(asked, found, columns, dialects, registry)
        if opened and st.button(f"Close {opened}", icon=":material/close:", key="runs:close"):
            runs_table.forget_selection()
            session.set_address(run=None)
            st.rerun()


def _link(asked: Question) -> str:
    given = {k: v for k, v in addresses.parameters(asked).items() if v}
    others = ("columns", addresses.DIALECT, "run")
    given |= {k: st.query_params.get_all(k) for k in others if k in st.query_params}
    base = (st.context.url or "").split("?")[0]
    return f"{base}?{urlencode(given, doseq=True)}" if given else base


def _command(asked: Question, spoken: list[str]) -> str:
    told = (f"--dialect {shlex.quote(text)}" for text in spoken)
    words = ("labbook runs", shlex.quote(str(session.book().target)), asked.as_options(), *told)
    return " ".join(word for word in words if word)


def as_csv(book: Book, asked: Question, columns: tuple[str, ...], dialects: dict, registry: Registry) -> str:
    """The columns shown, numbers in the dialects shown; a comment and a column `dialect` say so."""
    keys = runs_table.keys_of(columns, registry)
    texts = tuple(dict.fromkeys(("code", "at", *(c for c in columns if c in queries.RUN_TEXTS))))
    spoken = {n: choices for n, choices in dialects.items() if n in keys}
    table = book.frame(asked, keys=keys, texts=texts, dialects=spoken)
    told = [f"{n} in dialect {words}" for n, words in table.attrs.get("dialects", {}).items()]
    said = "; ".join([table.attrs["question"], *told, *([HOUSE_ONLY] if told else [])])
    return frame_as_csv(table, f"{book.name}: {said}")


def _downloads(
    asked: Question, found: int, columns: tuple[str, ...], dialects: dict, registry: Registry
) -> None:
    book = session.book()
    st.caption(f"{_spaced(found)} runs, SI units, full precision")
    st.download_button(
        "CSV: the columns shown, with u",
        lambda: as_csv(book, asked, columns, dialects, registry),
        f"{book.name}-runs.csv",
        "text/csv",
        on_click="ignore",
        key="runs:csv",
    )
    st.download_button(
        "JSON: everything about each run",
        lambda: sheets_as_json(book.sheets(asked, dialects=dialects)),
        f"{book.name}-runs.json",
        "application/json",
        on_click="ignore",
        key="runs:json",
    )


def _table(
    state: str, asked: Question, columns: tuple[str, ...], dialects: dict, found: int, folded: bool,
    registry: Registry,
) -> None:  # fmt: skip
    told = filters.cache_key(asked)
    if st.session_state.get("runs:asked") != told:
        st.session_state["runs:asked"], st.session_state["runs:shown"] = told, STEP
    newest = min(st.session_state["runs:shown"], found)
    runs_table.show(state, asked, told, columns, dialects, newest, folded, registry)
    if folded:
        return
    session.note(_which(newest, found))
    if newest < found and st.button(f"Show {min(STEP, found - newest)} more"):
        st.session_state["runs:shown"] = newest + STEP
        st.rerun()


def _which(newest: int, found: int) -> str:
    shown = (
        f"the newest {_spaced(newest)} of {_spaced(found)} runs"
        if newest < found
        else f"{_spaced(found)} runs"
    )
    return f"{shown}, newest first; tick a line to open it, touch a heading to sort"


def _nothing(asked: Question) -> None:
    """No run fits: say which part of the question, left out, would find some."""
    st.markdown("No run fits all of this.")
    for i, (what, n, question) in enumerate(session.book().ask(eased, asked)[:4]):
        st.button(
            f"Leave out {what}: {_spaced(n)} run{'' if n == 1 else 's'}",
            key=f"runs:ease:{i}",
            on_click=filters.write,
            args=(question,),
        )


def _empty_book() -> None:
    """An empty book shows the three things to do first."""
    st.markdown("### No run is logged yet")
    st.markdown(
        "1. **Shelf**: add a fluid with its viscosity readings.\n"
        "2. **Shelf**: add a material with its modulus, a swimmer built from it, and a rig if there is one.\n"
        "3. **Bench**: log the first trial; it appears here at once."
    )
    with st.container(horizontal=True):
        for path, label in (("shelf", "To the shelf"), ("bench", "To the bench")):
            if st.button(label, key=f"runs:go:{path}"):
                session.go(path)
    st.markdown(
        "Trials in a spreadsheet or CSV come in whole; a made-up group's year shows what a full book is like:"
    )
    st.code(f"labbook load {shlex.quote(str(session.book().target))} FOLDER\nlabbook demo", language=None)


def _spaced(n: int) -> str:
    """1204 as '1 204', with a space that does not break."""
    return f"{n:,}".replace(",", "\u202f")


def _escaped(text: str) -> str:
    for sign in "\\`*_[]<>$:":
        text = text.replace(sign, "\\" + sign)
    return text
