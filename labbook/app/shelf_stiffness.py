"""The small calculator beside a material's readings: sag or ring-down of a clamped piece to E."""

import streamlit as st

from labbook.app import session
from labbook.book.bench_stiffness import SECTIONS, TESTS, cells_of_test, modulus_from_test
from labbook.book.shelf_pages import OnShelf

LABELS = {
    "d": "d diameter", "w": "w width", "t": "t thickness, bending way", "D": "D outer", "d_in": "d_in inner",
    "L": "free length", "rho_s": "density", "delta": "sag of the tip", "f1": "ring-down frequency",
}  # fmt: skip
EXAMPLES = {
    "d": "1.02(1) mm", "w": "3.00(1) mm", "t": "0.80(1) mm", "D": "2.00(1) mm", "d_in": "1.00(1) mm",
    "L": "40.0(2) mm", "rho_s": "1.08(1) g/cm3", "delta": "3.2(1) mm", "f1": "4.1(1) Hz",
}  # fmt: skip


def calculator(item: OnShelf, place: str, fill) -> None:
    """Cells of a bench test and a button; `fill(cells)` puts the result into the reading's form."""
    if not st.toggle("from a sag or ring-down test", key=f"{place}:on"):
        return
    with st.container(border=True):
        first, second = st.columns(2)
        test = first.segmented_control("test", TESTS, default=TESTS[0], key=f"{place}:test") or TESTS[0]
        section = (
            second.segmented_control("section", list(SECTIONS), default="rod", key=f"{place}:section")
            or "rod"
        )
        session.note("A piece of known section, clamped level at one end and free at the other, in air.")
        keys = cells_of_test(test, section)
        with st.form(f"form:{place}", border=False):
            for row in range(0, len(keys), 2):
                for spot, key in zip(st.columns(2), keys[row : row + 2], strict=False):
                    with spot:
                        _cell(item, place, key)
            for field, sentence in session.refused(place).items():
                if field not in keys:
                    session.say_refused(sentence)
            st.form_submit_button("Work out E", on_click=_send, args=(place, test, section, keys, fill))
        doubt = st.session_state.get(f"{place}:doubt")
        if doubt:
            st.warning(doubt)


def _cell(item: OnShelf, place: str, key: str) -> None:
    name = f"{place}:{key}"
    if name not in st.session_state:
        st.session_state[name] = item.cells.get("rho_s", "") if key == "rho_s" else ""
    st.text_input(LABELS[key], key=name, placeholder=EXAMPLES[key])
    if key in session.refused(place):
        session.say_refused(session.refused(place)[key])


def _send(place, test, section, keys, fill) -> None:
    cells = {k: st.session_state.get(f"{place}:{k}", "") for k in keys}

    def act():
        text, st.session_state[f"{place}:doubt"] = modulus_from_test(test, section, cells)
        fill({"value": text, "how": test, "note": ", ".join(f"{k} {cells[k]}" for k in keys)})

    st.session_state.pop(f"{place}:doubt", None)
    session.attempt(act, place)
