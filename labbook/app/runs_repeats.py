"""Repeats on Runs: a part that folds open below the table with the groups of runs set up alike."""

import pandas as pd
import streamlit as st

from labbook.app import filters, session
from labbook.book import queries
from labbook.book.asking import Question
from labbook.book.repeat_groups import RepeatGroups, narrowed, repeat_groups
from labbook.book.trend_tables import repeats_table
from labbook.errors import Refusal
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES

KEY, NAME, OF = "runs:repeats", "repeats", "of"  # of the fold, in the session and in the address
TITLE = "Repeats: runs set up alike, and whether they scatter more than their bars say"
FIRST = "U"
MEASURED = ("U", "A_tip")
PICK = "Touch a line for its runs."
# its tools would lie over the words above it
SHEET = """<style>.st-key-lb-runs-repeats [data-testid="stElementToolbar"] { display: none; }</style>"""
ROW, TALL = 40, 10  # pixels; lines in sight


def folded(state: str, asked: Question, registry: Registry) -> None:
    """The fold where this is called; what is in it is worked out once it is open."""
    st.session_state[KEY] = session.address(NAME) == "on"
    fold = st.expander(TITLE, key=KEY, icon=":material/repeat:", on_change=_remember)
    if not st.session_state[KEY]:
        return
    with fold:
        of = _choose(registry)
        try:
            groups = _groups(state, filters.cache_key(asked), of, asked)
        except Refusal as refusal:
            session.say_refused(str(refusal))
            return
        more = f" {PICK}" if len(groups.table) else ""
        session.note(groups.in_words() + more)
        if len(groups.table):
            picked = _table(groups, filters.cache_key(asked))
            if picked is not None:
                _runs_of(groups.table.iloc[picked], asked)


def _remember() -> None:
    session.set_address(**{NAME: "on" if st.session_state[KEY] else None})


def _choose(registry: Registry) -> str:
    """What is compared: what was measured, or a number made of it."""
    offered = [*MEASURED, *registry.numbers]
    named = session.address(OF, FIRST)
    of = named if named in offered else FIRST
    st.session_state[f"{KEY}:{OF}"] = of
    st.selectbox("scatter of", offered, key=f"{KEY}:{OF}", on_change=_chosen, width=320,
                 format_func=lambda key: _named(key, registry))  # fmt: skip
    if named != of:
        session.say_refused(f"In the address, {OF} cannot be {named!r}; {of} is shown.")
    return of


def _named(key: str, registry: Registry) -> str:
    row = registry.numbers.get(key) or QUANTITIES[key]
    return f"{row.symbol}  {row.name}"


def _chosen() -> None:
    of = st.session_state[f"{KEY}:{OF}"]
    session.set_address(**{OF: of if of != FIRST else None})


@st.cache_resource(max_entries=24, show_spinner="Looking for repeats …")
def _groups(state: str, told: str, of: str, _asked: Question) -> RepeatGroups:
    return session.book().ask(repeat_groups, _asked, of)


def _table(groups: RepeatGroups, told: str) -> int | None:
    """The groups, those first that scatter most over their u; the place in the frame of the line touched.

    told: the question: a line touched in another answer means another group.
    """
    header, *lines = repeats_table(groups)
    order = groups.table["p"].fillna(2.0).argsort(kind="stable").to_numpy()
    frame = pd.DataFrame(lines, columns=header).iloc[order]
    numbers = {name: groups.table[column].to_numpy()[order]
               for name, column in (("n", "n"), ("over stated u", "over_stated"), ("p", "p"))}  # fmt: skip
    frame = frame.assign(**numbers)
    formats = {"over stated u": "%.2f", "p": "%.2g"}
    config = {k: st.column_config.NumberColumn(k, format=f) for k, f in formats.items()}
    st.html(SHEET)
    with st.container(key="lb-runs-repeats"):
        chosen = st.dataframe(
            frame, hide_index=True, column_config=config, row_height=ROW, key=f"{KEY}:{hash((groups.key, told))}",
            height=ROW * (min(len(frame), TALL) + 1) + 3, on_select="rerun", selection_mode="single-row",
        )  # fmt: skip
    rows = chosen["selection"]["rows"]
    return int(order[rows[0]]) if rows and rows[0] < len(order) else None


def _runs_of(group: pd.Series, asked: Question) -> None:
    """The runs of a group to open, and the filter for them alone."""
    alone = narrowed(asked, group)
    with st.container(horizontal=True):
        for code in group["codes"]:
            st.button(code, key=f"{KEY}:open:{code}", on_click=_open, args=(code,))
        n = session.book().ask(queries.count, alone)
        # a run set up alike may lack the value, or a setting that this group has not
        which = f"these {n} runs" if n == len(group["codes"]) else f"all {n} runs with these settings"
        st.button(f"Show {which} alone in the table", icon=":material/filter_alt:", key=f"{KEY}:alone",
                  on_click=filters.write, args=(alone,))  # fmt: skip


def _open(code: str) -> None:
    session.set_address(run=code)
