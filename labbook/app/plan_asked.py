"""What the Plan page is asked: its address as cells and choices, so that a copied link plans the same."""

import re
from dataclasses import dataclass

import streamlit as st

from labbook.app import session
from labbook.book.plan_swimmer import E_CELL, SWIMMER_CELLS
from labbook.errors import Refusal
from labbook.registry.typed import read

RUN_CELLS = ("theta0", "B", "T", "rig", "I_coil", "h0", "drive", "h_wall", "D_tank")
TAIL_CELLS = (*SWIMMER_CELLS, E_CELL)
TOP, TARGET = "top", "target"
PLANES = ("Sp,Re_omega", "Sp,theta0")  # gaps that are offered beside that of the swimmer's form
MOST, USUAL = 50, 5
_PLANE = re.compile(r"[A-Za-z]\w*,[A-Za-z]\w*")


@dataclass(frozen=True)
class Asked:
    """The page's address as texts, as they were typed.

    swimmer: '' for the last used; cells: (column, text) of a run or of a changed swimmer; fluids: codes, none
    for all; Sp, f: what is aimed at; how: by what the next runs are chosen, a plane 'x,y', TOP or TARGET, ''
    for the plane of the swimmer's form; within: (key, from, to) of a part of the plane; size, size_f: the
    inverse question.
    """

    swimmer: str = ""
    cells: tuple[tuple[str, str], ...] = ()
    fluids: tuple[str, ...] = ()
    Sp: str = ""
    f: str = ""
    how: str = ""
    n: int = USUAL
    strict: bool = False
    within: tuple[tuple[str, str, str], ...] = ()
    size: str = ""
    size_f: str = ""

    @property
    def changed(self) -> tuple[tuple[str, str], ...]:
        """The cells that make another swimmer of it."""
        return tuple((k, v) for k, v in self.cells if k in TAIL_CELLS)


def asked() -> tuple[Asked, list[str]]:
    """What the address asks, and a sentence for each part of it that was not understood."""
    said = []
    given = {k: text for k, text in st.query_params.to_dict().items() if text.strip()}
    cells = tuple((k, given[k].strip()) for k in (*RUN_CELLS, *TAIL_CELLS) if k in given)
    how = given.get("next", "")
    if how and how not in (TOP, TARGET) and not _PLANE.fullmatch(how):
        said.append(f"In the address, next cannot be {how!r}: two keys as {PLANES[0]}, {TOP} or {TARGET}.")
        how = ""
    n, text = USUAL, given.get("n", "")
    if text:
        n = int(text) if text.isdecimal() and len(text) < 4 else 0
        if not 1 <= n <= MOST:
            said.append(f"In the address, n cannot be {text!r}: 1 to {MOST}; {USUAL} are proposed.")
            n = USUAL
    strict = given.get("strict", "")
    if strict not in ("", "on"):
        said.append(f"In the address, strict cannot be {strict!r}: on, or left out.")
    within, wrong = _within()
    found = Asked(
        given.get("swimmer", "").strip(),
        cells,
        tuple(dict.fromkeys(st.query_params.get_all("fluid"))),
        given.get("Sp", "").strip(),
        given.get("f", "").strip(),
        how,
        n,
        strict == "on",
        within,
        given.get("size", ""),
        given.get("size_f", "").strip(),
    )
    return found, [*said, *wrong]


def _within() -> tuple[tuple[tuple[str, str, str], ...], list[str]]:
    found, said = [], []
    for text in st.query_params.get_all("within"):
        parts = text.split(":")
        if len(parts) == 3 and parts[0].isidentifier():
            found.append((parts[0], parts[1].strip(), parts[2].strip()))
        else:
            said.append(f"In the address, within cannot be {text!r}: a key and its limits, as Sp:1:3.")
    return tuple(found), said


def sperm_number(text: str) -> float:
    """A target as typed; Refusal for what is no number above zero."""
    try:
        value = read("pure", text).value
    except Refusal:
        value = 0.0
    if value <= 0.0:
        raise Refusal("Sp", text, "is no sperm number", "a number above 0, as 2")
    return value


def frequency(text: str) -> float:
    """A frequency as typed, in Hz."""
    return read("f", text, "Hz").value


def write(name: str, key: str) -> None:
    """Put what stands in a widget into the address; for callbacks."""
    value = st.session_state[key]
    session.set_address(**{name: value.strip() if isinstance(value, str) else value or None})
