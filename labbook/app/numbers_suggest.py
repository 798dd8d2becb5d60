"""Numbers, suggestions: the independent pure numbers that some chosen quantities allow."""

import streamlit as st

from labbook.app import session
from labbook.app.shelf_fields import AT_RUN
from labbook.errors import Refusal
from labbook.registry.formula import parse
from labbook.registry.latex import formula_latex
from labbook.registry.pure_groups import MOST_KEYS, Group, suggested
from labbook.registry.quantities import QUANTITIES, RESOLVED_KEYS


@st.cache_data(max_entries=64, show_spinner="Looking for pure numbers")
def _groups(state: str, keys: tuple[str, ...]) -> list[Group]:
    return suggested(keys, session.registry().numbers)


def show(formula_key: str) -> None:
    """Choose quantities, see what they allow; 'use' puts a formula into the field with this key."""
    keys = st.multiselect(
        "Or start from quantities: which pure numbers do they allow?", RESOLVED_KEYS, key="numbers:suggest",
        format_func=_label, placeholder="choose what may matter, e.g. mu, U, L_tail, EI",
        max_selections=MOST_KEYS, select_all=False,  # else Enter would take every match at once
    )  # fmt: skip
    if not keys:
        return
    try:
        groups = _groups(session.state_of_book(), tuple(keys))
    except Refusal as refusal:
        session.say_refused(str(refusal))
        return
    session.note(_words(keys, groups))
    numbers = session.registry().numbers
    for i, group in enumerate(groups):
        use, formula, words = st.columns([9, 35, 56], vertical_alignment="center")
        with formula:
            st.latex(formula_latex(parse(group.formula, QUANTITIES).tree), width="content")
        with words:
            session.note(_known(group, numbers))
        use.button("use", key=f"numbers:use:{i}:{group.formula}", help=group.formula, on_click=_use,
                   args=(formula_key, group.formula))  # fmt: skip


def _label(key: str) -> str:
    row = QUANTITIES[key]
    name = row.name.removesuffix(AT_RUN).partition(",")[0]
    return f"{key}: {name}" if row.symbol == key else f"{key} ({row.symbol}): {name}"


def _words(keys, groups: list[Group]) -> str:
    if not groups:
        return "These allow no pure number: no product of their powers is free of dimension."
    used = {key for group in groups for key, _ in group.exponents}
    n = len(groups)
    words = (f"{len(keys)} quantities, {n} independent pure number{'s' if n != 1 else ''}; "
             "every other pure number of these quantities is a product of powers of them.")  # fmt: skip
    spare = [key for key in keys if key not in used]
    return words + (f" In none of them: {', '.join(spare)}." if spare else "")


def _known(group: Group, numbers) -> str:
    """Which number of the registry a group is, and what makes it the same for all runs."""
    named = [f"{numbers[key].symbol}, {numbers[key].name}" for key in group.also]
    known = f"known: {'; '.join(named)} (up to a constant or a power)" if named else "not in the registry"
    return group.note or known


def _use(formula_key: str, formula: str) -> None:
    st.session_state[formula_key] = formula
