"""Numbers, the reference: each number with formula, meaning, source, dialects, strip and runs."""

import html

import streamlit as st

from labbook.app import numbers_own, session
from labbook.app.numbers_strip import strip_html
from labbook.book.asking import Question
from labbook.book.queries import frame
from labbook.charts.axes import written_unit
from labbook.exchange.registry_out import other_dialects, registry_csv, registry_markdown
from labbook.physics.rods import MODELS
from labbook.registry.catalogue import Number
from labbook.registry.dialects import AT_BIRTH, written_choices
from labbook.registry.group import Registry
from labbook.registry.latex import number_latex
from labbook.registry.quantities import QUANTITIES
from labbook.registry.regimes import Regime

MOST_TICKED = 5_000  # runs whose values stand as ticks: along a strip more fall together anyway
ALL = "all numbers"
RULE = '<hr style="margin:0.4rem 0;border:none;border-top:1px solid rgba(128,128,128,0.25)">'


@st.cache_data(max_entries=8, show_spinner="Placing the book's runs")
def _strips(state: str, dark: bool) -> dict[str, str]:
    """Each number's strip, with a tick for each of the newest kept runs."""
    registry = session.registry()
    table = session.book().ask(
        frame, Question(), keys=tuple(registry.numbers), texts=(), spread=False, newest=MOST_TICKED
    )
    return {key: strip_html(key, table[key].to_numpy(), dark, registry) for key in registry.numbers}


def part(counts: dict[str, int], held: dict[str, int]) -> None:
    """The reference; counts: kept runs that have each number, held: that lie in each regime."""
    registry = session.registry()
    drawn = _strips(session.state_of_book(), session.is_dark())
    only = _head(registry, counts)
    _drag_model(registry)
    for number in [registry.numbers[only]] if only else registry.numbers.values():
        st.html(RULE)
        words, picture = st.columns([54, 46], gap="medium")
        with words:
            _words(number, registry)
            if number.key in registry.own:
                numbers_own.acts(number.key)
        with picture:
            st.html(drawn[number.key])
            _bands(number, registry, held)
            session.note(f"takes {_inputs(number)}")
            _links(number, counts[number.key])
    session.note(f"Ticks: up to {MOST_TICKED} of the newest kept runs; a negative value stands by its size.")


def _head(registry: Registry, counts: dict[str, int]) -> str:
    """Which number is shown (all where '') and the whole registry as a file."""
    only = session.address("number")
    if only and only not in registry.numbers:
        session.say_refused(f"number {only!r}: the registry has no such number; all are shown.")
        only = ""
    st.session_state["numbers:only"] = only or ALL

    def choose():
        chosen = st.session_state["numbers:only"]
        session.set_address(number=None if chosen == ALL else chosen)

    def label(key):
        if key == ALL:
            return f"{ALL} ({len(registry.numbers)})"
        row = registry.numbers[key]
        return f"{row.symbol}  {row.name}{', own' if key in registry.own else ''}"

    name = session.book().name
    with st.container(horizontal=True, gap="small"):
        st.selectbox("Show", [ALL, *registry.numbers], key="numbers:only", format_func=label,
                     on_change=choose, label_visibility="collapsed", width=340)  # fmt: skip
        for word, make, ending, mime in (
            ("CSV", registry_csv, "csv", "text/csv"), ("Markdown", registry_markdown, "md", "text/markdown"),
        ):  # fmt: skip
            st.download_button(word, lambda make=make: make(registry, counts).encode(),
                               f"{name}-registry.{ending}", mime, icon=":material/download:",
                               on_click="ignore", key=f"numbers:{ending}")  # fmt: skip
    return only


def _drag_model(registry: Registry) -> None:
    """Which drag model the house uses, and what no drag model has."""
    key = registry.coefficient
    told = f"{MODELS[key].name}. {MODELS[key].source}" if key in MODELS else "ζ_n = 4πμ/ln(L_tail/a)"
    session.note(
        f"Resistive coefficients ζ_n and ζ_t follow from the house drag model {key}: {told}. "
        "Drag models carry no uncertainty of their own: bars show what was measured, "
        "not how well the model holds."
    )


def _words(number: Number, registry: Registry) -> None:
    symbol = "" if number.symbol == number.key else f"{html.escape(number.symbol)} "
    own = f" {numbers_own.tag(registry, number.key)}" if number.key in registry.own else ""
    st.html(f"<b>{html.escape(number.name)}</b> {symbol}<code>{html.escape(number.key)}</code>{own}")
    st.latex(number_latex(number), width="content")
    lines = [f"Compares {number.compares}."]
    if number.not_zero:
        lines.append(f"Not defined where {number.not_zero} is consistent with 0.")
    if number.only_drives:
        drives = "drive" if len(number.only_drives) == 1 else "drives"
        lines.append(f"For the {drives} {' and '.join(number.only_drives)} only.")
    if number.signed:
        lines.append("Keeps the sign of U.")
    told = [" ".join(lines), f"Source: {number.source}."]
    if number.dialect and number.key not in registry.own:
        told.insert(1, f"House dialect: {number.dialect}.{_departs(number, registry)}")
    if others := other_dialects(number.key, registry):
        told.append(f"Other dialects: {'; '.join(others)}.")
    st.html("".join(f'<div class="lb-note">{html.escape(line)}</div>' for line in told))


def _departs(number: Number, registry: Registry) -> str:
    """Where the group's house dialect is not the one that came with labbook."""
    if number.key not in AT_BIRTH:
        return ""
    words = written_choices(number.key, registry.choices(number.key))
    return "" if words == "house" else f" The group chose {words}."


def _inputs(number: Number) -> str:
    parts = []
    for key in number.inputs:
        row = QUANTITIES[key]
        unit = written_unit(row.unit)
        parts.append(f"{row.symbol} [{unit}]" if unit else row.symbol)
    return ", ".join(parts)


def _bands(number: Number, registry: Registry, held: dict[str, int]) -> None:
    mine = [r for r in registry.regimes.values() if number.key in r.numbers]
    if mine:
        session.tags([f"{r.name}, {_interval(r, registry)}: {_count(held[r.name])}" for r in mine])


def _interval(regime: Regime, registry: Registry) -> str:
    """The bands with their limits as they are printed: closed ones belong to it."""
    told = []
    for band in regime.bands:
        symbol = registry.numbers[band.number].symbol
        words = [symbol if word == band.number else word for word in band.words.split()]
        told.append(" ".join(words).replace("<=", "≤").replace(">=", "≥"))
    return " and ".join(told)


def _count(n: int) -> str:
    return f"{n} run{'s' if n != 1 else ''}"


def _links(number: Number, n: int) -> None:
    """The ways to the runs that have it and to its dialects."""
    if not n:
        session.note("No kept run has it yet.")
    with st.container(horizontal=True, gap="medium", vertical_alignment="center"):
        if n:
            st.page_link(
                st.session_state["pages"]["runs"], label=f"{n} kept run{'s have' if n != 1 else ' has'} it",
                icon=":material/table_rows:", query_params={"range": f"{number.key}:-inf:inf"},
            )  # fmt: skip
        if number.key in AT_BIRTH:
            st.button(
                "Dialects", icon=":material/translate:", type="tertiary",
                key=f"numbers:dialects:{number.key}", on_click=session.set_address,
                kwargs={"part": "dialects", "number": number.key},
            )  # fmt: skip
