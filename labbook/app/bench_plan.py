"""Planned runs on Bench: a short list; a touch fills the form with a line, logging that run ticks it off."""

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace

import streamlit as st

from labbook.app import session
from labbook.errors import LabbookError, Refusal
from labbook.exchange.plan_sheets import planned_lines
from labbook.registry.quantities import QUANTITIES
from labbook.registry.typed import read

LINES = "bench:planned"  # tuple of Line: they live in this window, and in the sheet that they came from
IN_HAND = "bench:planned-line"
SAID = "bench:planned-said"
SHEET = "bench:planned-sheet"
SAME_F = 0.05  # a run within this share of what was planned is the planned one: common practice, no source
MOST = 50
SET_TOO = ("theta0", "h0")  # what tells two lines in one fluid at one frequency apart
COPIED = ":material/content_copy:"
SHEET_STYLE = """<style>
.st-key-lb-planned { max-height: 6.4rem; overflow-y: auto; } /* the form keeps its place above the fold */
.st-key-lb-planned button { min-height: 40px; }
</style>"""


@dataclass(frozen=True)
class Line:
    """One planned run: its cells as they would be typed, and the code of the run logged from it, or ''."""

    cells: Mapping[str, str]
    code: str = ""

    @property
    def words(self) -> str:
        """'sedge-05 in sil5000-a, 0.182 Hz'."""
        return f"{self.cells['swimmer']} in {self.cells['fluid']}, {self.cells['f']}"


def lines() -> tuple[Line, ...]:
    """The planned runs of this window, those done too."""
    return st.session_state.get(LINES, ())


def put(text: str, name: str) -> int:
    """Let a planned sheet's lines stand on Bench, behind those that wait there; returns how many they are."""
    found = [Line(cells) for cells in planned_lines(text, name)]
    waiting = [line for line in lines() if not line.code]
    if len(waiting) + len(found) > MOST:
        raise Refusal(
            "plan",
            name,
            f"has {len(found)} lines, and {len(waiting)} wait on Bench",
            f"at most {MOST} in all",
        )
    st.session_state[LINES] = (*waiting, *found)
    st.session_state.pop(IN_HAND, None)
    return len(found)


def row() -> None:
    """The lines across the top of Bench: a touch fills the form, those done are ticked off with their run."""
    if not lines():
        return
    done = sum(bool(line.code) for line in lines())
    one = len({line.cells["swimmer"] for line in lines()}) == 1
    st.html(SHEET_STYLE)
    with st.container(key="lb-planned", horizontal=True, gap="small", vertical_alignment="center"):
        whose = f" of {lines()[0].cells['swimmer']}" if one else ""
        st.markdown(f"**Planned{whose}** · {done} of {len(lines())} logged", width="content")
        for i, line in enumerate(lines()):
            _button(i, line, one)
        st.page_link(
            st.session_state["pages"]["plan"],
            label="what is next",
            icon=":material/arrow_forward:",
            query_params=st.session_state.get("plan:address", {}),
            width="content",
        )
        st.button(
            "", icon=":material/close:", key="bench:planned:clear", on_click=_clear, help="Take the list away"
        )


def _button(i: int, line: Line, one: bool) -> None:
    own = [line.cells[k] for k in SET_TOO if k in line.cells] if _varies() else []
    words = ", ".join([line.words.partition(" in ")[2] if one else line.words, *own])
    if line.code:
        st.button(
            f"{i + 1} · {line.code}", key=f"bench:planned:{i}", icon=":material/check_box:", disabled=True
        )
        return
    in_hand = st.session_state.get(IN_HAND) == i
    st.button(
        f"{i + 1} · {words}",
        key=f"bench:planned:{i}",
        on_click=_fill,
        args=(i,),
        icon=":material/edit:" if in_hand else ":material/check_box_outline_blank:",
    )


def _varies() -> bool:
    """Whether the lines differ in more than fluid and frequency."""
    return any(len({line.cells.get(k) for line in lines()}) > 1 for k in SET_TOO)


def _fill(i: int) -> None:
    """Put a line's settings into the form; what is to be seen stays empty."""
    st.session_state["again"] = dict(lines()[i].cells)
    st.session_state[IN_HAND] = i
    session.keep_message(f"Line {i + 1} stands in the form: type T and what was seen", COPIED)


def _clear() -> None:
    for key in (LINES, IN_HAND, SAID):
        st.session_state.pop(key, None)


def drop() -> None:
    """The place for a planned sheet; what is refused stands under it, and what waits on Bench stays."""
    turn = st.session_state.get(SHEET, 0)  # a sheet that was read leaves, and an empty place takes over
    with st.container(key="lb-dropzone-planned"):
        file = st.file_uploader(
            "or drop a planned sheet (plan.csv)", type=["csv"], key=f"{SHEET}:{turn}", max_upload_size=4
        )
    if file is not None and st.session_state.get(f"{SHEET}:read") != file.file_id:
        st.session_state[f"{SHEET}:read"] = file.file_id
        st.session_state.pop(SAID, None)
        try:
            n = put(_text(file), file.name)
        except LabbookError as error:
            st.session_state[SAID] = str(error).splitlines()[:6]
        else:
            st.session_state[SHEET] = turn + 1
            session.keep_message(f"{file.name}: {n} planned run{'s' if n > 1 else ''} on Bench")
            st.rerun()
    for sentence in st.session_state.get(SAID, ()) if file is not None else ():
        session.say_refused(sentence)


def _text(file) -> str:
    try:
        return file.getvalue().decode("utf-8-sig")
    except UnicodeDecodeError:
        raise Refusal("plan", file.name, "is not UTF-8 text", "save it as CSV UTF-8") from None


def ticked(cells: Mapping[str, str], code: str) -> str:
    """Tick off the line that the run that was logged stands for, if any; returns words for the message."""
    fits = [i for i, line in enumerate(lines()) if not line.code and is_run_of(cells, line)]
    if not fits:
        return ""
    in_hand = st.session_state.pop(IN_HAND, None)
    i = in_hand if in_hand in fits else fits[0]
    st.session_state[LINES] = tuple(replace(x, code=code) if j == i else x for j, x in enumerate(lines()))
    left = sum(not line.code for line in lines())
    return (
        f"; planned line {i + 1} is done, {left} left"
        if left
        else f"; planned line {i + 1} is done, the last one"
    )


def is_run_of(cells: Mapping[str, str], line: Line) -> bool:
    """Whether a run is the one that a line plans: its swimmer and fluid, f and amplitude within SAME_F."""
    if any(cells.get(k) != line.cells[k] for k in ("swimmer", "fluid")):
        return False
    return all(_near(key, cells.get(key), line.cells.get(key)) for key in ("f", *SET_TOO))


def _near(key: str, typed: str | None, planned: str | None) -> bool:
    if not planned:
        return True
    if not typed:
        return False
    values = [read(key, text, QUANTITIES[key].unit).value for text in (typed, planned)]
    return abs(math.log(values[0] / values[1])) <= SAME_F
