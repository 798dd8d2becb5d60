"""Loading sheets from the page: all or nothing, every bad row listed, warnings confirmed by one touch."""

import tempfile
from pathlib import Path

import streamlit as st

from labbook.app import session
from labbook.book.records import KINDS, LOADING_ORDER, SHEETS
from labbook.errors import LabbookError, Refusal, Refusals, Unconfirmed
from labbook.exchange import sheets

PLACE = "shelf:load"
MOST_ROWS = 200


def page() -> None:
    """Choose files, load them, and what was refused."""
    st.html('<h2 style="margin:0 0 0.4rem 0">Load sheets</h2>')
    session.note(
        f"A workbook, or CSV files named {', '.join(f'{s}.csv' for s in SHEETS)}: choose all files of a "
        "folder at once. They are taken whole or not at all; rows that the book holds already add nothing."
    )
    with st.expander("What the sheets hold"):
        session.table(
            ("sheet", "columns, the required ones first"),
            [(k.sheet, ", ".join([*k.required, *(c for c in k.columns if c not in k.required)]))
             for k in KINDS.values()],
        )  # fmt: skip
        session.note("First row: key [unit]. Cells: 12.4, 12.4(3), 12.4 +- 0.3, or with a unit of their own.")
    turn = st.session_state.get(PLACE, 0)  # a loaded set of files leaves, and an empty place takes over
    files = st.file_uploader("Sheets", type=["csv", "xlsx", "xlsm"], accept_multiple_files=True,
                             key=f"{PLACE}:files:{turn}", label_visibility="collapsed")  # fmt: skip
    if not files:
        st.session_state.pop(f"{PLACE}:found", None)
        return
    names = ", ".join(sorted(f.name for f in files))
    found = st.session_state.get(f"{PLACE}:found")
    waiting = isinstance(found, Unconfirmed)
    if st.button("It is right, load it" if waiting else "Load", type="primary", key=f"{PLACE}:go"):
        _load(files, names, confirm=waiting)
        st.rerun()
    if found is not None:
        _say(found)


def _load(files, names: str, confirm: bool) -> None:
    """One attempt, with its progress; what it found is kept for the next run of the page."""
    st.session_state.pop(f"{PLACE}:found", None)
    try:
        tables = _read(files)
        total = 2 * sum(n for _, n in sheets.counted(tables)) or 1
        bar, done = st.progress(0.0, text=f"loading {names}"), [0]

        def step(what, n):
            done[0] += n
            bar.progress(min(done[0] / total, 1.0), text=f"{what}: {min(done[0], total)} of {total} steps")

        loaded = session.book().load_tables(
            tables, names, by=session.handle(), confirm=confirm, progress=step
        )
    except LabbookError as error:
        st.session_state[f"{PLACE}:found"] = error
        return
    st.session_state[PLACE] = st.session_state.get(PLACE, 0) + 1
    again = f"; {loaded.derived_again} runs were derived again" if loaded.derived_again else ""
    session.keep_message(f"{names}: {loaded}{again}")


def _read(files) -> list[sheets.Table]:
    """The sheets of the uploaded files, by way of a folder of their own that is gone afterwards."""
    tables = []
    with tempfile.TemporaryDirectory(prefix="labbook-") as folder:
        for file in files:
            path = Path(folder) / Path(file.name).name
            path.write_bytes(file.getvalue())
            tables += sheets.read_tables(path)
    return sorted(tables, key=lambda t: LOADING_ORDER.index(t.kind))


def _say(found: LabbookError) -> None:
    if isinstance(found, Unconfirmed):
        st.warning(f"{len(found.warnings)} cells look far off; nothing is written yet.")
        session.table(("what was found",), [(w,) for w in found.warnings[:MOST_ROWS]])
        return
    findings = found.findings if isinstance(found, Refusals) else [found]
    n = len(findings)
    session.say_refused(f"Nothing was loaded: {n} thing{'s' if n != 1 else ''} to mend.")
    if all(isinstance(f, Refusal) for f in findings):
        session.table(
            ("row", "column", "typed", "reason", "what would do"), [_row(f) for f in findings[:MOST_ROWS]]
        )
    else:
        session.table(("reason",), [(str(f),) for f in findings])
    if n > MOST_ROWS:
        session.note(f"and {n - MOST_ROWS} more")


def _row(finding: Refusal) -> tuple[str, ...]:
    where, comma, column = finding.field.rpartition(", ")
    typed = "" if finding.typed is None else str(finding.typed)
    place = (where, column) if comma else (column, "")
    return (*place, typed, finding.reason, finding.remedy)
