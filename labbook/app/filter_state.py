"""A page's filter between its address and its widgets: who speaks, and what the other is told."""

import json
import math
from datetime import datetime

import streamlit as st

from labbook.app import session
from labbook.book import addresses, queries
from labbook.book.asking import Question
from labbook.book.limits import limits, written_limit
from labbook.errors import Refusal
from labbook.registry.group import Registry

# the keys that a range is offered for, the ones asked for most first
_QUANTITIES = ("f", "U", "theta0", "A_tip", "B", "T", "mu", "nu", "E", "lam", "L_tail", "L_body", "h_wall")
FIRST = "Sp"


def ranged(registry: Registry) -> tuple[str, ...]:
    """The keys that a range is offered for."""
    return (*dict.fromkeys((FIRST, "Re_omega", "St", *registry.numbers)), *_QUANTITIES)


def write(asked: Question) -> None:
    """Put a question into the page's address."""
    session.set_address(**addresses.parameters(asked))


@st.cache_data(max_entries=4, show_spinner=False)
def known(state: str) -> dict[str, list[str]]:
    """What a filter may name in this state of the book."""
    return session.book().ask(queries.choices)


def cache_key(asked: Question) -> str:
    """A text that is the same for equal questions."""
    return json.dumps(addresses.parameters(asked))


def in_address(registry: Registry) -> tuple[Question, list[str]]:
    """The question in the page's address, and one sentence for each part of it that was not understood."""
    given = {name: st.query_params.get_all(name) for name in addresses.PARAMETERS}
    asked, said = addresses.read_question(given, known(session.state_of_book()), registry)
    return asked, [f"In the address, {sentence}" for sentence in said]


def in_widgets(place: str, before: Question, registry: Registry) -> tuple[Question, list[str]]:
    """The question that the widgets ask, and one sentence for each part that somebody took away since."""
    asked = from_widgets(place, before)
    given = addresses.parameters(asked)
    rest, said = addresses.read_question(given, known(session.state_of_book()), registry)
    return (rest if said else asked), [f"In the filter, {sentence}" for sentence in said]


def touch(place: str) -> None:
    st.session_state[f"{place}:touched"] = True


def clear(place: str) -> None:
    """Back to every kept run."""
    write(Question())
    st.session_state.pop(f"{place}:said", None)


def key_of(place: str, name: str) -> str:
    return f"{place}:filter:{name}"


def into_widgets(place: str, asked: Question, registry: Registry) -> None:
    """Fill the widgets from a question where they do not ask it already."""
    state, told = st.session_state, cache_key(asked)
    if state.get(key_of(place, "range_key"), FIRST) not in ranged(registry):  # withdrawn while it stood there
        state[key_of(place, "range_key")] = FIRST
        show_limits(place)
    if state.get(f"{place}:seen") == told and key_of(place, "regimes") in state:
        return
    state[f"{place}:seen"], state[f"{place}:ranges"] = told, dict(asked.ranges)
    state[key_of(place, "regimes")] = list(asked.regimes)
    for name, field in addresses.CHOSEN.items():
        state[key_of(place, name)] = list(getattr(asked, field))
    for name in ("since", "until"):
        text = getattr(asked, name)
        state[key_of(place, name)] = datetime.fromisoformat(text).date() if text else None
    state[key_of(place, "text")] = asked.text or ""
    state[key_of(place, "state")] = asked.state
    if asked.ranges and state.get(key_of(place, "range_key")) not in asked.ranges:
        state[key_of(place, "range_key")] = next(iter(asked.ranges))
    show_limits(place)


def from_widgets(place: str, before: Question) -> Question:
    """The question that the widgets ask; a moment in the address stays one until its date is changed."""
    state = st.session_state
    dates = {}
    for name in ("since", "until"):
        day, text = state.get(key_of(place, name)), getattr(before, name)
        same = day is not None and text is not None and datetime.fromisoformat(text).date() == day
        dates[name] = text if same else day and day.isoformat()
    asked = Question(
        regimes=tuple(state.get(key_of(place, "regimes"), ())),
        ranges=dict(state.get(f"{place}:ranges", {})),
        **{field: tuple(state.get(key_of(place, name), ())) for name, field in addresses.CHOSEN.items()},
        **dates,
        text=(state.get(key_of(place, "text")) or "").strip() or None,
        state=state.get(key_of(place, "state")) or "kept",
    )
    state[f"{place}:seen"] = cache_key(asked)
    return asked


def show_limits(place: str) -> None:
    """Fill the two fields with the limits of the chosen key."""
    state = st.session_state
    span = state.get(f"{place}:ranges", {}).get(state.get(key_of(place, "range_key"), FIRST))
    for end, value in zip(("low", "high"), span or (math.nan, math.nan), strict=True):
        state[key_of(place, end)] = written_limit(state.get(key_of(place, "range_key"), FIRST), value)
    state.pop(f"{place}:limits", None)


def set_limits(place: str) -> None:
    """Take the two fields as the chosen key's range; what cannot be read is said and changes nothing."""
    state = st.session_state
    key = state[key_of(place, "range_key")]
    try:
        span = limits(key, state[key_of(place, "low")], state[key_of(place, "high")])
    except Refusal as refusal:
        state[f"{place}:limits"] = str(refusal)
        return
    state.pop(f"{place}:limits", None)
    ranges = {k: v for k, v in state.get(f"{place}:ranges", {}).items() if k != key}
    state[f"{place}:ranges"] = ranges | ({key: span} if span else {})
    touch(place)


def drop_range(place: str, key: str) -> None:
    st.session_state[f"{place}:ranges"] = {
        k: v for k, v in st.session_state.get(f"{place}:ranges", {}).items() if k != key
    }
    show_limits(place)
    touch(place)
