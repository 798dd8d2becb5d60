"""The filter row: which runs a page shows, kept in its address, so that a copied link asks the same."""

import json
import math
from dataclasses import replace
from datetime import date

import numpy as np
import streamlit as st

from labbook.app import session
from labbook.book import addresses, queries
from labbook.book.asking import Question
from labbook.book.limits import in_limit_unit, limit_unit, limits, range_in_words, written_limit
from labbook.charts.histogram import histogram
from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS
from labbook.registry.quantities import QUANTITIES
from labbook.registry.regimes import REGIMES

# the keys that a range is offered for, the ones asked for most first
RANGED = (*NUMBERS, "f", "U", "theta0", "A_tip", "B", "T", "mu", "nu", "E", "lam", "L_tail", "L_body", "h_wall")
PLURAL = {"fluid": "Fluids", "swimmer": "Swimmers", "material": "Materials", "person": "People",
          "series": "Series"}  # fmt: skip


def question() -> tuple[Question, list[str]]:
    """The question in the page's address, and one sentence for each part of it that was not understood."""
    given = {name: st.query_params.get_all(name) for name in addresses.PARAMETERS}
    return addresses.read_question(given, known(session.state_of_book()))


def write(asked: Question) -> None:
    """Put a question into the page's address."""
    session.set_address(**addresses.parameters(asked))


@st.cache_data(max_entries=4, show_spinner=False)
def known(state: str) -> dict[str, list[str]]:
    """What a filter may name in this state of the book."""
    return session.book().ask(queries.choices)


@st.cache_data(max_entries=64, show_spinner=False)
def counts(state: str, asked: str, _question: Question) -> dict[str, int]:
    """Runs in each regime, the question's own regimes left aside; `asked` is what the answer is kept under."""
    return session.book().ask(queries.regime_counts, _question)


def cache_key(asked: Question) -> str:
    """A text that is the same for equal questions."""
    return json.dumps(addresses.parameters(asked))


def row(place: str, *, regimes_open: bool = False) -> Question:
    """The filter row: shows and edits the filter, writes it into the address, returns the question.

    place: keeps the widgets of two pages apart; regimes_open: the regimes stand above the row, not folded.
    """
    asked, said = question()
    touched = st.session_state.pop(f"{place}:touched", False)
    if touched:  # a widget speaks when it was just used, else the address does
        asked = _from_widgets(place, asked)
        st.session_state.pop(f"{place}:said", None)
    else:
        _into_widgets(place, asked)
        if said:  # kept, since the address is mended below and a rerun may follow at once
            st.session_state[f"{place}:said"] = said
    with st.container(key=f"lb-filter-{place}"):
        _widgets(place, asked, regimes_open)
    for sentence in st.session_state.get(f"{place}:said", ()):
        session.say_refused(f"In the address, {sentence}")
    write(asked)
    return asked


def _touch(place: str) -> None:
    st.session_state[f"{place}:touched"] = True


def _clear(place: str) -> None:
    """Back to every kept run."""
    write(Question())
    st.session_state.pop(f"{place}:said", None)


def _key(place: str, name: str) -> str:
    return f"{place}:filter:{name}"


# ---- between the address and the widgets


def _into_widgets(place: str, asked: Question) -> None:
    """Fill the widgets from the address where it says something new."""
    state, told = st.session_state, cache_key(asked)
    if state.get(f"{place}:seen") == told and _key(place, "regimes") in state:
        return
    state[f"{place}:seen"], state[f"{place}:ranges"] = told, dict(asked.ranges)
    state[_key(place, "regimes")] = list(asked.regimes)
    for name, field in addresses.CHOSEN.items():
        state[_key(place, name)] = list(getattr(asked, field))
    for name in ("since", "until"):
        text = getattr(asked, name)
        state[_key(place, name)] = date.fromisoformat(text[:10]) if text else None
    state[_key(place, "text")] = asked.text or ""
    state[_key(place, "state")] = asked.state
    if asked.ranges and state.get(_key(place, "range_key")) not in asked.ranges:
        state[_key(place, "range_key")] = next(iter(asked.ranges))
    _show_limits(place)


def _from_widgets(place: str, before: Question) -> Question:
    """The question that the widgets ask; a moment in the address stays one until its date is changed."""
    state = st.session_state
    dates = {}
    for name in ("since", "until"):
        day, text = state.get(_key(place, name)), getattr(before, name)
        same = day is not None and text is not None and text[:10] == day.isoformat()
        dates[name] = text if same else day and day.isoformat()
    asked = Question(
        regimes=tuple(state.get(_key(place, "regimes"), ())), ranges=dict(state.get(f"{place}:ranges", {})),
        **{field: tuple(state.get(_key(place, name), ())) for name, field in addresses.CHOSEN.items()},
        **dates, text=(state.get(_key(place, "text")) or "").strip() or None,
        state=state.get(_key(place, "state")) or "kept",
    )  # fmt: skip
    state[f"{place}:seen"] = cache_key(asked)
    return asked


# ---- the widgets


def _widgets(place: str, asked: Question, regimes_open: bool) -> None:
    if regimes_open:
        _regimes(place, asked)
    with st.container(horizontal=True, gap="small", vertical_alignment="center"):
        if not regimes_open:
            with st.popover(_label("Regimes", asked.regimes)):
                _regimes(place, asked)
        ranges = [range_in_words(key, *span) for key, span in asked.ranges.items()]
        opened = st.popover(_label("Range", ranges), key=f"{place}:range-popover", on_change="rerun")
        with opened:
            _ranges(place, asked, opened.open)
        options = known(session.state_of_book())
        for name, field in addresses.CHOSEN.items():
            with st.popover(_label(PLURAL[name], getattr(asked, field))):
                st.multiselect(PLURAL[name], options[name], key=_key(place, name), on_change=_touch, args=(place,),
                               placeholder="any", width=260)  # fmt: skip
        dates = [d[:10] for d in (asked.since, asked.until) if d]
        with st.popover(_label("Dates", [" to ".join(dates)] if dates else [])):
            st.date_input("since", None, key=_key(place, "since"), on_change=_touch, args=(place,), format="YYYY-MM-DD")
            st.date_input("until", None, key=_key(place, "until"), on_change=_touch, args=(place,), format="YYYY-MM-DD")
        with st.popover(_label("Text", [asked.text] if asked.text else [])):
            st.text_input("in code, note, series or video", key=_key(place, "text"), on_change=_touch, args=(place,))
        with st.popover({"kept": "Kept", "void": "Void", "all": "Kept and void"}[asked.state]):
            st.segmented_control("State", ["kept", "void", "all"], key=_key(place, "state"), required=True,
                                 on_change=_touch, args=(place,))  # fmt: skip
        if asked != Question():
            st.button("Clear", key=f"{place}:clear", type="tertiary", on_click=_clear, args=(place,))


def _label(name: str, chosen) -> str:
    if not chosen:
        return name
    return f"{name}: {chosen[0]}" if len(chosen) == 1 and len(chosen[0]) < 22 else f"{name}: {len(chosen)}"


def _regimes(place: str, asked: Question) -> None:
    found = counts(session.state_of_book(), cache_key(replace(asked, regimes=())), asked)
    st.pills("Regimes: a run must lie in every one chosen", list(REGIMES), selection_mode="multi",
             format_func=lambda name: f"{name} {found[name]}", key=_key(place, "regimes"), on_change=_touch,
             args=(place,), label_visibility="collapsed")  # fmt: skip


def _ranges(place: str, asked: Question, shown: bool) -> None:
    key = st.selectbox("Range of", RANGED, format_func=_named, key=_key(place, "range_key"),
                       on_change=_show_limits, args=(place,), width=300)  # fmt: skip
    unit = limit_unit(key)
    for column, end, word in zip(st.columns(2), ("low", "high"), ("from", "to"), strict=True):
        with column:
            st.text_input(f"{word} ({unit})" if unit else word, key=_key(place, end), placeholder="no limit",
                          on_change=_set_limits, args=(place,))  # fmt: skip
    if wrong := st.session_state.get(f"{place}:limits"):
        session.say_refused(wrong)
    if shown:
        others = replace(asked, ranges={k: span for k, span in asked.ranges.items() if k != key})
        values = _values(session.state_of_book(), key, cache_key(others), others)
        low, high = (in_limit_unit(key, v) for v in asked.ranges.get(key, (-math.inf, math.inf)))
        log = key != "T"
        chart = histogram(values, low, high, session.is_dark(), log=log, width=290)
        st.altair_chart(chart, theme=None, width="content")
        below = int((values <= 0).sum()) if log else 0
        tail = f", {below} at or below zero and not on the log axis" if below else ""
        session.note(f"{len(values)} runs with {key}{tail}")
    for key, span in asked.ranges.items():
        st.button(f"{range_in_words(key, *span)}", icon=":material/close:", key=f"{place}:drop:{key}",
                  help="Drop this range", on_click=_drop, args=(place, key))  # fmt: skip


def _named(key: str) -> str:
    row = NUMBERS.get(key) or QUANTITIES[key]
    return f"{row.symbol}  {row.name}"


@st.cache_data(max_entries=32, show_spinner=False)
def _values(state: str, key: str, asked: str, _question: Question):
    """The values of a key among the runs of a question, in the unit of its limits, absent ones left out."""
    found = session.book().frame(_question, keys=(key,), texts=(), spread=False)[key].to_numpy()
    return in_limit_unit(key, found[np.isfinite(found)])


def _show_limits(place: str) -> None:
    """Fill the two fields with the limits of the chosen key."""
    state = st.session_state
    span = state.get(f"{place}:ranges", {}).get(state.get(_key(place, "range_key"), RANGED[0]))
    for end, value in zip(("low", "high"), span or (math.nan, math.nan), strict=True):
        state[_key(place, end)] = written_limit(state.get(_key(place, "range_key"), RANGED[0]), value)
    state.pop(f"{place}:limits", None)


def _set_limits(place: str) -> None:
    """Take the two fields as the chosen key's range; what cannot be read is said and changes nothing."""
    state = st.session_state
    key = state[_key(place, "range_key")]
    try:
        span = limits(key, state[_key(place, "low")], state[_key(place, "high")])
    except Refusal as refusal:
        state[f"{place}:limits"] = str(refusal)
        return
    state.pop(f"{place}:limits", None)
    ranges = {k: v for k, v in state.get(f"{place}:ranges", {}).items() if k != key}
    state[f"{place}:ranges"] = ranges | ({key: span} if span else {})
    _touch(place)


def _drop(place: str, key: str) -> None:
    st.session_state[f"{place}:ranges"] = {
        k: v for k, v in st.session_state.get(f"{place}:ranges", {}).items() if k != key
    }
    _show_limits(place)
    _touch(place)
