"""Ledger lines as rows on a page: when and who, the act with its link, before and after, why, runs."""

import html
from collections.abc import Sequence

import streamlit as st

from labbook.book.ledger_pages import Line
from labbook.book.reduced_cells import in_short

WIDTHS = [16, 24, 42, 18]
HEADS = ("when, who", "what was done", "before → after, and why", "runs")
TEXT = "font-size:0.9rem;line-height:1.4"
LONGEST = 400  # letters of one change before it folds
RULE = '<hr style="margin:0.15rem 0;border:none;border-top:1px solid rgba(128,128,128,0.25)">'
SAID = ("code", "of")  # stands in the line already
FEW = 6  # changes shown before the rest folds


def show(lines: Sequence[Line], place: str) -> None:
    """One row a line, newest first as given; what can be opened is a link."""
    for column, word in zip(st.columns(WIDTHS, gap="small"), HEADS, strict=True):
        column.html(f'<div class="lb-note">{word}</div>')
    for line in lines:
        with st.container(key=f"lb-line:{place}:{line.id}", gap=None):
            st.html(RULE)
            when, act, changes, runs = st.columns(WIDTHS, gap="small")
            when.html(f'<div class="lb-note">{html.escape(line.when)}<br>{html.escape(line.by)}</div>')
            with act:
                _subject(line)
            changes.html(_changes(line))
            with runs:
                _runs(line)


def _subject(line: Line) -> None:
    if line.place is None:
        st.html(f'<div style="{TEXT}">{html.escape(line.act)} {html.escape(line.kind)}<br>'
                f"{html.escape(line.subject)}</div>")  # fmt: skip
        return
    kind, code = line.place
    path, where = ("runs", {"run": code}) if kind == "run" else ("shelf", {"kind": kind, "item": code})
    what = line.subject if code == line.subject else f"{line.subject} of {code}"
    st.page_link(st.session_state["pages"][path], label=f"{line.act} {line.kind} **{plain(what)}**",
                 query_params=where)  # fmt: skip


def _changes(line: Line) -> str:
    told = [_change(c) for c in line.changes if (c[1] or c[2]) and c[0] not in SAID]
    shown = " ".join(told[:FEW])
    if len(told) > FEW:
        shown += f"<details><summary>{len(told) - FEW} more</summary>{' '.join(told[FEW:])}</details>"
    why = f'<div class="lb-note">because: {html.escape(line.why)}</div>' if line.why else ""
    return f'<div style="{TEXT}">{shown}{why}</div>'


def _change(change: tuple[str, str, str]) -> str:
    column = html.escape(change[0])
    before, after = (html.escape(in_short(change[0], text)) for text in change[1:])
    before = f"<del>{before}</del> → " if before else ""
    if len(after) > LONGEST:
        after = f"<details><summary>{after[:60]} …</summary>{after}</details>"
    return f'<span style="margin-right:0.7rem"><i>{column}</i> {before}{after or "nothing"}</span>'


def _runs(line: Line) -> None:
    if line.n_runs == 1 and line.kind != "run":
        st.page_link(
            st.session_state["pages"]["runs"], label=plain(line.runs), query_params={"run": line.runs}
        )
    elif line.n_runs > 1:
        listed = html.escape(line.runs)
        st.html(f'<details class="lb-note"><summary>{line.n_runs} runs</summary>{listed}</details>')


def plain(text: str) -> str:
    """A text from the book inside Markdown, as it stands."""
    return "".join(f"\\{c}" if c in r"\`*_{}[]()#+-.!|~$:<>" else c for c in text)
