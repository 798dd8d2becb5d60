"""A number's dialect on a page: read from the address, chosen by its published name or choice by choice."""

import streamlit as st

from labbook.app import session
from labbook.book import addresses
from labbook.charts import dialect_axis
from labbook.registry.dialects import CHOICES, written_choices
from labbook.registry.group import Registry

OTHER = "other…"


def in_address(registry: Registry) -> tuple[dict[str, dict[str, object]], list[str]]:
    """Number -> every choice, where the address departs from the house; and what was not understood."""
    found, said = addresses.read_dialects(st.query_params.get_all(addresses.DIALECT), registry)
    return found, [f"In the address, {sentence}" for sentence in said]


def choose(place: str, number: str, registry: Registry, dialects, label: str, *, folded: bool = False) -> None:
    """A selectbox of a number's dialects by name, the house's first; 'other…' opens its choices one by one.

    place: keeps the widgets of two pages apart; dialects: number -> every choice, as from `in_address`;
    folded: the choices stand in a popover, where the column is narrow and short.
    """
    house = registry.choices(number)
    named = dialect_axis.dialects(number, house)
    present = dialects.get(number, house)
    words = written_choices(number, present, house)
    open_ = words not in named or st.session_state.get(_opened(place, number), False)
    key = f"{place}:dialect:{number}"
    st.session_state[key] = OTHER if open_ else words
    st.selectbox(label, (*named, OTHER), key=key, on_change=_by_name, args=(place, number))
    if not open_:
        return
    with st.popover(words, width="stretch") if folded else st.container():
        for name, options in CHOICES[number].items():
            st.session_state[f"{key}:{name}"] = present[name]
            st.selectbox(f"{number}: {name}", options, key=f"{key}:{name}", format_func=str,
                         on_change=_by_choice, args=(place, number))  # fmt: skip


def _opened(place: str, number: str) -> str:
    return f"{place}:other:{number}"


def _by_name(place: str, number: str) -> None:
    picked = st.session_state[f"{place}:dialect:{number}"]
    st.session_state[_opened(place, number)] = picked == OTHER
    if picked != OTHER:
        registry = session.registry()
        _write(number, dialect_axis.dialects(number, registry.choices(number))[picked], registry)


def _by_choice(place: str, number: str) -> None:
    # a mixture that has a name stays open: the next choice may follow
    st.session_state[_opened(place, number)] = True
    chosen = {name: st.session_state[f"{place}:dialect:{number}:{name}"] for name in CHOICES[number]}
    _write(number, chosen, session.registry())


def _write(number: str, choices: dict[str, object], registry: Registry) -> None:
    present, _ = in_address(registry)
    texts = addresses.dialect_texts(present | {number: choices}, registry)
    session.set_address(**{addresses.DIALECT: texts})
