"""The Plan page's fields: swimmer, target and drive in one row, the rest folded, a tail still to be built."""

from collections.abc import Mapping

import streamlit as st

from labbook.app import session
from labbook.app.plan_answers import Answered, codes
from labbook.app.plan_asked import TAIL_CELLS, Asked, write
from labbook.app.shelf_fields import LABELS as SHELF_LABELS
from labbook.book.block_spread import section_of
from labbook.book.plan_inverse import SIZES
from labbook.book.plan_setting import Plan
from labbook.book.records import DRIVES, FORMS, SECTIONS
from labbook.registry.quantities import QUANTITIES
from labbook.registry.typed import Typed, printed

ROW = ("swimmer", "Sp", "f", "theta0", "B", "T", "rig")
WIDTHS = (1.35, 1.1, 0.85, 1.2, 1.0, 1.2, 1.1, 1.05)
FOLDED = ("I_coil", "h0", "h_wall", "D_tank")
LABELS = {
    "Sp": "target Sp",
    "f": "or at f",
    "theta0": "θ₀ angle",
    "B": "B flux",
    "T": "T fluid",
    "I_coil": "I_coil current",
    "h0": "h₀ heave",
    "h_wall": "h_wall, to the wall",
    "D_tank": "D_tank, bore",
    "E": "E, in place of a batch",
    "L_tail": "L_tail tail length",
    "b_long": "b_long, long semi-axis",
}
OF_HELIX = ("R_helix", "pitch")
BUILD = "build"
LONGEST_AT_FIELD = 90  # letters: a longer sentence stands under the whole row


def fields(
    asked: Asked, answered: Answered, best: str, said: Mapping[str, str], doubts: Mapping[str, str]
) -> None:
    """The row, what is folded, and the tail to build; each refused at its field, else right under the row.

    best: the target where none is typed, in words; said, doubts: sentences by field, refused and doubtful.
    """
    left, state = dict(said), answered.key[0]
    plan = answered.plan
    columns = st.columns(WIDTHS)
    with columns[0]:
        _swimmer(plan.swimmer.code, codes(state, "swimmer"))
    for column, name in zip(columns[1:-2], ROW[1:-1], strict=True):
        with column:
            _text(name, best if name == "Sp" else _usual(plan, name))
            _refused(name, left)
            if name in doubts:
                session.caution(doubts[name])
    with columns[-2]:
        _choice("rig", "Rig", codes(state, "rig"), plan.cells.get("rig", "none"))
        _refused("rig", left)
    with columns[-1], st.container(key="lb-plan-more"):
        _more(asked, plan, codes(state, "fluid"))
    for name in (*ROW, "swimmer"):
        _refused(name, left, at_field=False)
    building = _tail(asked, plan, left, codes(state, "material"))
    for name, sentence in left.items():
        where = "" if building or name not in TAIL_CELLS else " It can be given under 'a tail to build'."
        session.say_refused(sentence + where)


def _refused(name: str, left: dict[str, str], at_field: bool = True) -> None:
    """Say what was refused here, once; a long sentence has no room in a narrow column."""
    if name in left and (not at_field or len(left[name]) <= LONGEST_AT_FIELD):
        session.say_refused(left.pop(name))


# ---- widgets


def _swimmer(code: str, offered: list[str]) -> None:
    offered = offered if code in offered else [code, *offered]
    st.session_state["plan:swimmer"] = code
    st.selectbox("Swimmer", offered, key="plan:swimmer", on_change=_another)


def _another() -> None:
    """Another swimmer: what changed the one before it goes."""
    session.set_address(**dict.fromkeys(TAIL_CELLS))
    write("swimmer", "plan:swimmer")


def _text(name: str, placeholder: str) -> None:
    key = f"plan:{name}"
    st.session_state[key] = session.address(name)
    label = LABELS.get(name) or _label(name)
    st.text_input(label, key=key, placeholder=placeholder, on_change=write, args=(name, key))


def _label(name: str) -> str:
    return f"{QUANTITIES[name].symbol} {SHELF_LABELS.get(name) or QUANTITIES[name].name}"


def _choice(name: str, label: str, words, usual: str) -> None:
    """A choice that is left open: then it is as usual, which the placeholder says."""
    key, now = f"plan:{name}", session.address(name)
    st.session_state[key] = now if now in words else None
    st.selectbox(label, words, index=None, key=key, placeholder=usual, on_change=write, args=(name, key))


def _usual(plan: Plan, name: str) -> str:
    """What holds where nothing is typed."""
    if name == "B" and plan.cells.get("I_coil"):
        return f"by {plan.cells['I_coil']}"
    return plan.cells.get(name) or ("e.g. 1 Hz" if name == "f" else "none")


def _more(asked: Asked, plan: Plan, fluids: list[str]) -> None:
    given = sum(k in (*FOLDED, "drive") for k, _ in asked.cells) + len(asked.fluids)
    with st.popover(f"More: {given}" if given else "More", width="stretch"):
        _choice("drive", "drive", DRIVES, plan.drive or "as usual for this swimmer")
        for name in FOLDED:
            _text(name, _usual(plan, name))
        st.session_state["plan:fluids"] = [f for f in asked.fluids if f in fluids]
        st.multiselect(
            "Fluids",
            fluids,
            key="plan:fluids",
            placeholder="all that are not retired",
            on_change=write,
            args=("fluid", "plan:fluids"),
        )


def _tail(asked: Asked, plan: Plan, left: dict[str, str], materials: list[str]) -> bool:
    """The switch, the line that says what the plan goes by, and the columns of a swimmer that differ."""
    on = bool(asked.changed) or session.address(BUILD) == "on"
    st.session_state["plan:build"] = on
    switch, said = st.columns([0.24, 0.76], vertical_alignment="center")
    with switch:
        st.toggle("A tail to build", key="plan:build", on_change=_build)
    with said:
        session.note("; ".join(plan.notes))
    if not on:
        return False
    with st.container(key="lb-plan-tail", border=True):
        session.note(f"Starts from {plan.swimmer.code}: what is left empty stays as it is there.")
        wanted = [k for k in _columns_of(plan) if k in TAIL_CELLS]
        for start in range(0, len(wanted), 6):
            row = wanted[start : start + 6]
            for column, name in zip(st.columns(6), row, strict=False):
                with column:
                    _tail_field(name, plan, materials)
                    if name in left:
                        session.say_refused(left.pop(name))
    return True


def _build() -> None:
    session.set_address(build="on" if st.session_state["plan:build"] else None)
    if not st.session_state["plan:build"]:
        session.set_address(**dict.fromkeys(TAIL_CELLS))


def _columns_of(plan: Plan) -> list[str]:
    """The columns of a swimmer that its form and section have, and those that are typed."""
    helix = OF_HELIX if plan.swimmer.texts["form"] == "helix" else ()
    sizes = SIZES[section_of(plan.swimmer)]
    found = ["form", "section", "material", "E", "L_body", "L_tail", *sizes, *helix, "b", "b_long", "m_mag"]
    return list(dict.fromkeys([*found, *(k for k in TAIL_CELLS if session.address(k))]))


def _tail_field(name: str, plan: Plan, materials: list[str]) -> None:
    swimmer = plan.swimmer
    if name in ("form", "section"):
        _choice(name, name, FORMS if name == "form" else SECTIONS, swimmer.texts[name] or "none")
    elif name == "material":
        made_of = plan.shelf.materials.get(swimmer.texts["material_id"])
        _choice(name, "material batch", materials, made_of.code if made_of else "none")
    else:
        entry = swimmer.typed.get(name)
        _text(name, printed(name, Typed(*entry)) if entry else "none")
