"""Bench's series grid: ten trials at once, pasted from a spreadsheet if you like, one save."""

import pandas as pd
import streamlit as st

from labbook.app import live, session
from labbook.book.asking import Question
from labbook.book.clock import local, now
from labbook.exchange.sheets import Table
from labbook.registry.written import written

COLUMNS = ("f", "theta0", "B", "T", "U", "A_tip", "note")
LINES = 10
PLACE = "series"


def grid(shared: dict[str, str]) -> None:
    """The grid under the shared choices, live numbers beside it, and one save."""
    label = st.text_input("Series label", key="series:label", placeholder="e.g. sweep of 1 March") or ""
    st.caption(
        "One line a trial, values with their units: 0.5 Hz, 12 deg, 4.2 mT, 22.4 degC, 0.079(4) mm/s, 5.8(2) mm. "
        "A block copied from a spreadsheet can be pasted into the first cell."
    )
    stamp = st.session_state.setdefault("series:stamp", now())
    empty = pd.DataFrame("", index=range(LINES), columns=["line", *COLUMNS], dtype="string")
    empty["line"] = [str(i + 1) for i in range(LINES)]
    left, right = st.columns([60, 40])
    with left:
        typed = st.data_editor(
            empty, num_rows="dynamic", hide_index=True, key=f"series:grid:{stamp}", row_height=36,
            height=38 + 36 * (LINES + 1),
            column_config={k: st.column_config.TextColumn(k, width="small") for k in COLUMNS}
            | {"line": st.column_config.TextColumn("", width=36, disabled=True, pinned=True)},
        )  # fmt: skip
    # a line keeps its number when another one is taken out
    lines = [
        (int(at) + 1, {k: row[k].strip() for k in COLUMNS if isinstance(row[k], str) and row[k].strip()})
        for at, row in typed.to_dict("index").items()
    ]
    with right:
        _numbers(shared, lines)
    _save(shared, label, lines, stamp)


def _numbers(shared, lines) -> None:
    """Sp and Re_omega of each line, and what is refused in it."""
    rows = []
    for i, line in lines:
        if not line:
            continue
        seen = live.preview({**shared, **line})
        bad = "; ".join(s for k, s in seen.refused.items() if k in line)
        if not bad and "f" not in line:
            bad = "f is missing"
        rows.append([
            str(i), written(seen.values.get("Sp"), seen.u.get("Sp")),
            written(seen.values.get("Re_omega"), seen.u.get("Re_omega")), bad or ", ".join(seen.regimes),
        ])  # fmt: skip
    if rows:
        session.table(["line", "Sp", "Re_ω", "regimes, or what is refused"], rows, numeric=(0, 1, 2))
    else:
        session.note("Numbers of each line appear here.")


def _save(shared, label, lines, stamp) -> None:
    for sentence in session.refused(PLACE).values():
        session.say_refused(sentence)
    waiting = session.warned(PLACE)
    for sentence in waiting:
        st.warning(sentence)
    filled = [(i, line) for i, line in lines if line]
    first, second, _ = st.columns([3, 3, 6])
    name = f"They are right, log {len(filled)}" if waiting else f"Log {len(filled)} trials"
    if first.button(name, type="primary", disabled=not filled, width="stretch"):
        _log(shared, label, filled, stamp, confirm=bool(waiting))
    if second.button("Back to one trial", width="stretch"):
        st.session_state["bench:as-series"] = False
        session.forget(PLACE)
        st.rerun()


def _log(shared, label, filled, stamp, confirm) -> None:
    fixed = {"swimmer": shared["swimmer"], "fluid": shared["fluid"], "rig": shared.get("rig", ""),
             "at": local(stamp).isoformat(), "by": session.handle(), "series": label}  # fmt: skip
    columns = [*fixed, *COLUMNS]
    rows = [(i, [*fixed.values(), *(line.get(c, "") for c in COLUMNS)]) for i, line in filled]
    sheet = Table("run", "series", columns, rows)
    loaded = []
    done = session.attempt(
        lambda: loaded.append(
            session.book().load_tables([sheet], label or "series", by=session.handle(), confirm=confirm)
        ),
        PLACE,
    )  # fmt: skip
    if done:
        codes = _codes(fixed)
        which = f" ({codes[0]} to {codes[-1]})" if len(codes) > 1 else f" ({codes[0]})" if codes else ""
        session.keep_message(f"Series {label or 'without label'}: {loaded[0]}{which}")
        st.session_state["series:stamp"] = now()
        st.session_state["bench:as-series"] = False
    st.rerun()


def _codes(fixed: dict[str, str]) -> list[str]:
    """The codes of this grid's runs, in its order: those that its person logged at its moment."""
    asked = Question(since=fixed["at"], until=fixed["at"], people=(fixed["by"],), state="all")
    return session.book().frame(asked, keys=("f",), texts=("code",))["code"].tolist()
