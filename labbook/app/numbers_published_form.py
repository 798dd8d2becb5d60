"""Numbers, published: the form of one point as it was printed; refusals stand at their fields."""

from collections.abc import Iterable, Sequence

import streamlit as st

from labbook.app import session
from labbook.book.published_points import AXES, choices_of
from labbook.book.records import KINDS
from labbook.errors import Refusal
from labbook.physics.rods import MODELS
from labbook.registry.dialects import CHOICES, Choices, formula_of
from labbook.registry.formula import parse
from labbook.registry.group import Registry
from labbook.registry.latex import formula_latex
from labbook.registry.quantities import QUANTITIES
from labbook.registry.swimmer_share import DIMENSIONS, exchanged

PLACE, DRAFT = "point", "point:draft"
FIRST = {"x": "Sp", "y": "U_scaled"}
LENGTHS = DIMENSIONS
LABELS = {
    "series": "series *", "citation": "citation *", "x": "x *", "y": "y *", "x_value": "value of x *",
    "y_value": "value of y *", "x_dialect": "dialect of x", "y_dialect": "dialect of y",
}  # fmt: skip
EXAMPLES = {
    "series": "pond-2019", "citation": "Pond & Weir, their journal 3, 14 (2019)", "x_value": "2.0(1)",
    "y_value": "0.0120(6)", "L_tail": "24 mm", "L_body": "30 mm", "d": "1.0 mm", "w": "3.0 mm", "t": "0.5 mm",
    "D": "3.0 mm", "d_in": "1.0 mm", "R_helix": "1.5 mm", "pitch": "6 mm", "note": "e.g. read off figure 3",
}  # fmt: skip
SPENT = ("x_value", "y_value", "note")  # what the next point of a series has of its own
TOGETHER = (("series", "citation"), ("x", "y"))  # these are refused for what they say together


def form(registry: Registry) -> None:
    """One point as typed; a series goes on with its citation, numbers, dialects and lengths."""
    with st.container(border=True):
        st.html("<b>One more point</b>")
        refused = _still_refused()
        _row([34, 66], ("series", "citation"), refused)
        needed = [number for axis in AXES if (number := _axis(axis, registry, refused))]
        with st.expander("Choices that make a dialect"):
            _choices([_text(axis) for axis in AXES])
        with st.expander("Lengths of its swimmer", expanded=bool(needed or set(LENGTHS) & set(refused))):
            session.note(
                f"Without them {' and '.join(needed)} cannot be restated."
                if needed
                else "For dialects that need them."
            )
            for start in range(0, len(LENGTHS), 3):
                _row([1] * 3, LENGTHS[start : start + 3], refused)
        _row([1], ("note",), refused)
        shown = {*LABELS, *LENGTHS, "note"}
        for column, sentence in refused.items():
            if column not in shown:
                session.say_refused(sentence)
        _add(_cells())


def _axis(axis: str, registry: Registry, refused: dict[str, str]) -> str:
    """Which number, its value, the dialect of the print and the formula that this is read as.

    Returns the number where the lengths of a swimmer stand between this dialect and the house's, else ''.
    """
    spots = st.columns([30, 28, 42], gap="small")
    options = list(registry.numbers)
    with spots[0]:
        key = _key(axis)
        if st.session_state.setdefault(key, _draft(axis, FIRST[axis])) not in options:
            st.session_state[key] = FIRST[axis]
        number = st.selectbox(LABELS[axis], options, key=key)
    with spots[1]:
        _field(f"{axis}_value")
    with spots[2]:
        has = number in CHOICES
        _field(f"{axis}_dialect", "e.g. rate:f" if has else "it has none", disabled=not has)
    for column in (axis, f"{axis}_value", f"{axis}_dialect"):  # below, where a sentence has room
        _say(refused, column)
    if not has:
        return ""
    try:
        chosen = choices_of(number, _text(f"{axis}_dialect"))
    except Refusal as wrong:
        if f"{axis}_dialect" not in refused:
            session.say_refused(str(Refusal(f"{axis}_dialect", wrong.typed, wrong.reason, wrong.remedy)))
        return ""
    _read_as(number, chosen)
    return number if exchanged(chosen, registry.choices(number)) else ""


def _read_as(number: str, chosen: Choices) -> None:
    """The formula of the dialect that is typed, with what stands behind its drag coefficient."""
    formula = formula_latex(parse(formula_of(number, chosen), QUANTITIES).tree)
    model = chosen.get("coefficient", "")
    words, drawn = st.columns([45, 55], gap="small", vertical_alignment="center")
    with words:
        session.note(f"{number} is read{f' with ζ_n of {model}' if model in MODELS else ''} as")
    drawn.latex(formula, width="content")


def _choices(numbers: Iterable[str]) -> None:
    """What each choice of some numbers may be, the one taken where nothing is typed first."""
    rows = [(number, name, ", ".join(map(str, options)))
            for number in dict.fromkeys(numbers) for name, options in CHOICES.get(number, {}).items()]  # fmt: skip
    if rows:
        session.table(("number", "choice", "options"), rows)
    session.note(
        "Written rate:f,power:1; an empty field is labbook's own definition, whatever the group's house is."
    )


def _row(widths: Sequence[int], columns: Sequence[str], refused: dict[str, str]) -> None:
    for spot, column in zip(st.columns(widths, gap="small"), columns, strict=True):
        with spot:
            _field(column)
            _say(refused, column)


def _field(column: str, example: str = "", disabled: bool = False) -> None:
    key = _key(column)
    if key not in st.session_state:
        st.session_state[key] = _draft(column)
    st.text_input(LABELS.get(column, column), key=key, placeholder=example or EXAMPLES.get(column, ""),
                  disabled=disabled)  # fmt: skip


def _say(refused: dict[str, str], column: str) -> None:
    if column in refused:
        session.say_refused(refused[column])


def _key(column: str) -> str:
    turn = st.session_state.get(f"{PLACE}:turn", 0) if column in SPENT else 0
    return f"{PLACE}:{turn}:{column}"


def _text(column: str) -> str:
    return str(st.session_state.get(_key(column)) or "").strip()


def _draft(column: str, default: str = "") -> str:
    """What was typed before a look at another page."""
    return st.session_state.get(DRAFT, {}).get(column, default)


def _cells() -> dict[str, str]:
    """What is typed; a dialect of a number that has none stands in a field that is off."""
    cells = {column: _text(column) for column in KINDS["published"].columns}
    for axis in AXES:
        if cells[axis] not in CHOICES:
            cells[f"{axis}_dialect"] = ""
    st.session_state[DRAFT] = cells
    return cells


def _still_refused() -> dict[str, str]:
    """What was refused at the last attempt, less what has been typed anew since."""
    tried = st.session_state.get(f"{PLACE}:tried", {})
    changed = {column for column, text in tried.items() if _text(column) != text}
    for columns in TOGETHER:
        changed |= set(columns) if changed & set(columns) else set()
    return {column: text for column, text in session.refused(PLACE).items() if column not in changed}


def _add(cells: dict[str, str]) -> None:
    """The button; a warning asks for one confirming touch, which another value takes back."""
    if cells != st.session_state.get(f"{PLACE}:tried"):
        st.session_state.pop(f"warned:{PLACE}", None)
    waiting = session.warned(PLACE)
    session.warn(waiting)
    if not st.button(
        "It is right, add it" if waiting else "Add the point", type="primary", key=f"{PLACE}:go"
    ):
        return
    typed = {column: text for column, text in cells.items() if text}
    before = session.state_of_book()
    st.session_state[f"{PLACE}:tried"] = cells
    if session.attempt(
        lambda: session.book().stock("published", by=session.handle(), confirm=bool(waiting), **typed), PLACE
    ):
        new = session.state_of_book() != before
        session.keep_message(
            f"A point of {typed['series']} is added." if new else f"{typed['series']} has this point already."
        )
        st.session_state[DRAFT] = {c: text for c, text in cells.items() if c not in SPENT}
        st.session_state[f"{PLACE}:turn"] = st.session_state.get(f"{PLACE}:turn", 0) + 1
    st.rerun()
