"""The Plan page's inverse question: which size, modulus or viscosity has the target at one frequency."""

import numpy as np
import streamlit as st

from labbook.app import session
from labbook.app.plan_answers import Aim, Answered, sizes
from labbook.app.plan_asked import Asked, frequency, write
from labbook.app.plan_shown import remarks, say
from labbook.book.plan_inverse import batches_near, keys_of
from labbook.book.planning import best_first
from labbook.errors import Refusal
from labbook.registry.quantities import QUANTITIES
from labbook.registry.written import shown

USUAL_F = "1 Hz"
NEAREST = 4  # batches of the shelf that are named


def question(answered: Answered, asked: Asked, aim: Aim) -> None:
    """The fields of the question and its answer."""
    plan = answered.plan
    st.html('<h3 class="lb-plan">Which size puts the target at one frequency?</h3>')
    if aim.Sp is None:
        session.note("A target Sp is needed first.")
        return
    keys = keys_of(plan)
    size = asked.size if asked.size in keys else keys[0]
    if asked.size and asked.size not in keys:
        session.say_refused(f"In the address, size cannot be {asked.size!r}: one of {', '.join(keys)}.")
    first, second, here = st.columns([0.32, 0.26, 0.42], vertical_alignment="bottom")
    with first:
        st.session_state["plan:size"] = size
        st.selectbox(
            "which",
            keys,
            key="plan:size",
            on_change=write,
            args=("size", "plan:size"),
            format_func=lambda k: (
                f"{QUANTITIES[k].symbol} {QUANTITIES[k].name.partition(' at the')[0].partition(',')[0]}"
            ),
        )
    with second:
        st.session_state["plan:size_f"] = asked.size_f
        st.text_input(
            f"has Sp {aim.Sp:.3g} at f",
            key="plan:size_f",
            placeholder=asked.f or USUAL_F,
            on_change=write,
            args=("size_f", "plan:size_f"),
        )
    f = _frequency(asked.size_f or asked.f or USUAL_F)
    if f is not None:
        _answer(answered, size, f, aim.Sp, here)


def _frequency(text: str) -> float | None:
    try:
        return frequency(text)
    except Refusal as refusal:
        session.say_refused(str(refusal))
        return None


def _answer(answered: Answered, size: str, f: float, Sp: float, here) -> None:
    plan = answered.plan
    table, refusal = sizes(answered.key, size, f, Sp, plan)
    if refusal is not None:
        session.say_refused(str(refusal))
        return
    ordered = best_first(table)
    rows = [
        [
            row["fluid"],
            three(size, row[size]),
            shown("Sp", row["Sp"], row["u_Sp"]),
            shown("Re_omega", row["Re_omega"]),
            shown("U", row["U_model"], row["u_U_model"]),
            row["verdict"],
        ]
        for row in ordered.to_dict("records")
    ]
    session.table(
        ["fluid", QUANTITIES[size].symbol, "Sp", "Re_ω", "U expected", "verdict"], rows, numeric=(1, 2, 3, 4)
    )
    say(remarks(ordered))
    with here:
        now = three(size, float(table["now"].iloc[0]))
        steep = abs(float(np.nanmedian(table["slope"])))
        session.note(
            (f"Now {now}. " if now else "") + f"1 % of {QUANTITIES[size].symbol} moves Sp by {steep:.2g} %."
        )
        if size == "E" and np.isfinite(table["E"]).any():
            near = batches_near(plan, float(np.nanmedian(table["E"])))[:NEAREST]
            session.note(
                "batches on the shelf, the nearest first: "
                + ", ".join(f"{c} {shown('E', E)}" for c, E in near)
            )


def three(key: str, value: float) -> str:
    """A size to three digits, in its usual unit."""
    return "" if np.isnan(value) else shown(key, float(f"{value:.3g}"))
