"""The range of x that a slope is taken over: two fields, kept in the address as 'slope=0.8:1.6'."""

import math

import streamlit as st

from labbook.app import session

NAME = "slope"
ENDS = ("low", "high")
WIDTH = 96  # pixels: both beside each other
OPEN = (0.0, math.inf)  # an end that is not given


def between() -> tuple[float, float] | None:
    """The range in the address, None where there is none or it cannot be read."""
    return _read(session.address(NAME))


def slope_range(x: str) -> None:
    """The two fields; what cannot be read stands there with the reason, and changes nothing."""
    low, _, high = session.address(NAME).partition(":")
    refused = st.session_state.get(_key("refused"), "")
    for end, text in zip(ENDS, (low, high), strict=True):
        if not refused:
            st.session_state[_key(end)] = text
        label = f"slope from {x}" if end == "low" else "to"
        st.text_input(label, key=_key(end), placeholder="any", width=WIDTH, on_change=_typed)
    if refused or (session.address(NAME) and between() is None):
        session.say_refused(refused or f"In the address, slope cannot be {session.address(NAME)!r}.")


def _typed() -> None:
    low, high = (st.session_state[_key(end)].strip().replace(",", ".") for end in ENDS)
    text = f"{low}:{high}" if low or high else ""
    if text and _read(text) is None:
        written = f"{low or 'any'} to {high or 'any'}"
        st.session_state[_key("refused")] = f"{written} is no range: two numbers, the lower first."
        return
    st.session_state.pop(_key("refused"), None)
    session.set_address(**{NAME: text or None})


def _read(text: str) -> tuple[float, float] | None:
    parts = text.split(":")
    if len(parts) != 2 or not any(part.strip() for part in parts):
        return None
    try:
        low, high = (float(part) if part.strip() else end for part, end in zip(parts, OPEN, strict=True))
    except ValueError:
        return None
    return (low, high) if low < high else None


def _key(end: str) -> str:
    return f"trends:{NAME}:{end}"
