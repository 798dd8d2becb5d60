"""The filter row: which runs a page shows, kept in its address, so that a copied link asks the same."""

import math
from dataclasses import replace

import numpy as np
import streamlit as st

from labbook.app import session
from labbook.app.filter_state import (
    cache_key,
    clear,
    drop_range,
    in_address,
    in_widgets,
    into_widgets,
    key_of,
    known,
    ranged,
    set_limits,
    show_limits,
    touch,
    write,
)  # fmt: skip
from labbook.book import addresses, queries
from labbook.book.asking import Question
from labbook.book.limits import in_limit_unit, limit_unit, range_in_words
from labbook.charts.histogram import histogram
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES

PLURAL = {
    "fluid": "Fluids",
    "swimmer": "Swimmers",
    "material": "Materials",
    "person": "People",
    "series": "Series",
}


@st.cache_data(max_entries=64, show_spinner=False)
def counts(state: str, asked: str, _question: Question) -> dict[str, int]:
    """Runs in each regime, its own regimes left aside; `asked` is what the answer is kept under."""
    return session.book().ask(queries.regime_counts, _question)


def row(place: str, *, regimes_open: bool = False) -> Question:
    """The filter row: shows and edits the filter, writes it into the address, returns the question.

    place: keeps the widgets of two pages apart; regimes_open: the regimes stand above the row, not folded.
    """
    registry = session.registry()
    asked, said = in_address(registry)
    if st.session_state.pop(f"{place}:touched", False):  # a widget speaks when just used, else the address
        asked, said = in_widgets(place, asked, registry)
        st.session_state.pop(f"{place}:said", None)
    into_widgets(place, asked, registry)
    if said:  # kept, since the address is mended below and a rerun may follow at once
        st.session_state[f"{place}:said"] = said
    with st.container(key=f"lb-filter-{place}"):
        _widgets(place, asked, regimes_open, registry)
    for sentence in st.session_state.get(f"{place}:said", ()):
        session.say_refused(sentence)
    write(asked)
    return asked


# ---- the widgets


def _widgets(place: str, asked: Question, regimes_open: bool, registry: Registry) -> None:
    if regimes_open:
        _regimes(place, asked)
    with st.container(horizontal=True, gap="xsmall", vertical_alignment="center"):
        if not regimes_open:
            with st.popover(_label("Regimes", asked.regimes)):
                _regimes(place, asked)
        ranges = [range_in_words(key, *span) for key, span in asked.ranges.items()]
        with st.popover(_label("Range", ranges)):
            _ranges(place, asked, registry)
        options = known(session.state_of_book())
        for name, field in addresses.CHOSEN.items():
            with st.popover(_label(PLURAL[name], getattr(asked, field))):
                st.multiselect(
                    PLURAL[name],
                    options[name],
                    key=key_of(place, name),
                    on_change=touch,
                    args=(place,),
                    placeholder="any",
                    width=260,
                )
        dates = [
            f"{word} {day[:10]}" for word, day in (("since", asked.since), ("until", asked.until)) if day
        ]
        with st.popover(_label("Dates", dates)):
            st.date_input(
                "since", None, key=key_of(place, "since"), on_change=touch, args=(place,), format="YYYY-MM-DD"
            )
            st.date_input(
                "until", None, key=key_of(place, "until"), on_change=touch, args=(place,), format="YYYY-MM-DD"
            )
        with st.popover(_label("Text", [asked.text] if asked.text else [])):
            st.text_input(
                "in code, note, series or video", key=key_of(place, "text"), on_change=touch, args=(place,)
            )
        with st.popover({"kept": "Kept", "void": "Void", "all": "Kept and void"}[asked.state]):
            st.segmented_control(
                "State",
                ["kept", "void", "all"],
                key=key_of(place, "state"),
                required=True,
                on_change=touch,
                args=(place,),
            )
        if asked != Question():
            st.button(
                "",
                icon=":material/filter_alt_off:",
                help="Clear the filter",
                key=f"{place}:clear",
                on_click=clear,
                args=(place,),
            )


def _label(name: str, chosen) -> str:
    if not chosen:
        return name
    return f"{name}: {chosen[0]}" if len(chosen) == 1 and len(chosen[0]) < 22 else f"{name}: {len(chosen)}"


def _regimes(place: str, asked: Question) -> None:
    found = counts(session.state_of_book(), cache_key(replace(asked, regimes=())), asked)
    st.pills(
        "Regimes: a run must lie in every one chosen",
        list(found),
        selection_mode="multi",
        format_func=lambda name: f"{name} {found[name]}",
        key=key_of(place, "regimes"),
        on_change=touch,
        args=(place,),
        label_visibility="collapsed",
    )


def _ranges(place: str, asked: Question, registry: Registry) -> None:
    numbers = registry.numbers
    key = st.selectbox(
        "Range of",
        ranged(registry),
        format_func=lambda key: _named(numbers.get(key) or QUANTITIES[key]),
        key=key_of(place, "range_key"),
        on_change=show_limits,
        args=(place,),
        width=300,
    )
    unit = limit_unit(key)
    for column, end, word in zip(st.columns(2), ("low", "high"), ("from", "to"), strict=True):
        with column:
            st.text_input(
                f"{word} ({unit})" if unit else word,
                key=key_of(place, end),
                placeholder="no limit",
                on_change=set_limits,
                args=(place,),
            )
    if wrong := st.session_state.get(f"{place}:limits"):
        session.say_refused(wrong)
    others = replace(asked, ranges={k: span for k, span in asked.ranges.items() if k != key})
    low, high = (in_limit_unit(key, v) for v in asked.ranges.get(key, (-math.inf, math.inf)))
    spec, said = _histogram(
        session.state_of_book(), key, cache_key(others), others, low, high, session.is_dark()
    )
    st.vega_lite_chart(spec=spec, theme=None, width="content", key=f"{place}:histogram")
    session.note(said)
    for key, span in asked.ranges.items():
        st.button(
            f"{range_in_words(key, *span)}",
            icon=":material/close:",
            key=f"{place}:drop:{key}",
            help="Drop this range",
            on_click=drop_range,
            args=(place, key),
        )


def _named(row) -> str:
    return f"{row.symbol}  {row.name}"


@st.cache_data(max_entries=64, show_spinner=False)
def _histogram(state: str, key: str, told: str, _others: Question, low: float, high: float, dark: bool):
    """(specification, sentence): how a key's values are spread among the runs of a question."""
    found = session.book().frame(_others, keys=(key,), texts=(), spread=False)[key].to_numpy()
    values = in_limit_unit(key, found[np.isfinite(found)])
    log = key != "T"
    below = int((values <= 0).sum()) if log else 0
    tail = f", {below} at or below zero and not on the log axis" if below else ""
    return histogram(
        values, low, high, dark, log=log, width=290
    ).to_dict(), f"{len(values)} runs with {key}{tail}"
