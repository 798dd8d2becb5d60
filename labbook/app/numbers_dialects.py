"""Numbers, dialects: a number's choices, the published ones on one worked case, the house's since when."""

import html
import math
from collections.abc import Mapping, Sequence

import streamlit as st

from labbook.app import numbers_house, session
from labbook.book import addresses
from labbook.book.clock import local
from labbook.book.registry_effects import history
from labbook.registry.dialect_words import (
    case_words,
    dialect_words,
    option_words,
    value_in,
)
from labbook.registry.dialects import (
    AT_BIRTH,
    CHOICES,
    DIALECTS,
    Choices,
    completed,
    formula_of,
    written_choices,
)
from labbook.registry.formula import parse
from labbook.registry.group import Registry
from labbook.registry.latex import formula_latex
from labbook.registry.quantities import QUANTITIES

FIRST = "Sp"
RULE = '<hr style="margin:0.4rem 0;border:none;border-top:1px solid rgba(128,128,128,0.25)">'


@st.cache_data(max_entries=8, show_spinner=False)
def _history(state: str) -> dict[str, list[dict]]:
    return session.book().ask(history, "house")


def part() -> None:
    """The dialects of the number in the address."""
    registry = session.registry()
    number = _chosen(registry)
    session.note(
        "A dialect is a definition that some papers use for the same number. Any stored value can be "
        "restated to it; ranges and regimes are always read in the group's house dialect."
    )
    left, right = st.columns([57, 43], gap="medium")
    with left:
        _choices(number, registry)
    with right:
        numbers_house.change(number, registry)
    _published(number, registry)
    st.html(f"{RULE}<b>The house dialect of every number</b>")
    _houses(registry, _history(session.state_of_book()))


def _chosen(registry: Registry) -> str:
    """The number in the address, and the box that chooses it."""
    number = session.address("number", FIRST)
    if number not in AT_BIRTH:
        session.say_refused(f"number {number!r}: no number of this key has dialects; {FIRST} is shown.")
        number = FIRST
    st.session_state["dialects:number"] = number

    def choose():
        session.set_address(number=st.session_state["dialects:number"])

    st.selectbox(
        "Number", list(AT_BIRTH), key="dialects:number", on_change=choose, width=340,
        format_func=lambda k: f"{k}  {registry.numbers[k].name}", label_visibility="collapsed",
    )  # fmt: skip
    return number


def _choices(number: str, registry: Registry) -> None:
    """Each choice's options with what they mean; the house's is told."""
    house = registry.choices(number)
    rows = [
        (
            name if i == 0 else "",
            str(option),
            option_words(name, option),
            "house" if option == house[name] else "",
        )
        for name, options in CHOICES[number].items()
        for i, option in enumerate(options)
    ]
    session.table(("choice", "option", "means", ""), rows)
    if number == "Sp":
        session.note("length changes the length factor only: coefficients keep L_tail.")


def _published(number: str, registry: Registry) -> None:
    """The published rows with the same worked case in each, the house's first."""
    rows = [row for row in DIALECTS if row.of == number]
    st.html(f"{RULE}<b>In print</b>")
    if not rows:
        session.note("No published dialect of it is in the registry.")
        return
    session.note(f"The same worked case in each: {case_words(rows[0])} (SI). It is restated, not measured.")
    house = registry.choices(number)
    at_home = [row for row in rows if completed(number, row.choices) == house]
    source = registry.numbers[number].source if house == AT_BIRTH[number] else "the group's own choice"
    source = at_home[0].source if at_home else source
    _row("the group's house dialect", number, house, source, value_in(rows[0], house))
    for row in rows:
        chosen = completed(number, row.choices)
        if chosen != house:
            words = written_choices(number, chosen, house)
            words += ", as at birth" if chosen == AT_BIRTH[number] else ""
            address = addresses.dialect_texts({number: chosen}, registry)
            _row(words, number, chosen, row.source, row.answer, address)


def _row(
    words: str, number: str, choices: Choices, source: str, value: float, address: Sequence[str] = ()
) -> None:
    """A dialect: formula, choices and source, the worked case in it, and where to see the runs in it."""
    formula, told, answer, links = st.columns([22, 46, 10, 22], vertical_alignment="center")
    formula.latex(formula_latex(parse(formula_of(number, choices), QUANTITIES).tree), width="content")
    told.html(f'<div><b>{html.escape(words)}</b></div><div class="lb-note">{html.escape(source)}</div>')
    answer.html(f'<div style="text-align:right">{"–" if math.isnan(value) else f"{value:.5g}"}</div>')
    if address:
        with links, st.container(horizontal=True, gap="small"):
            _link("trends", "on Trends", {"x": number, addresses.DIALECT: address})
            _link("runs", "on Runs", {addresses.DIALECT: address})


def _link(page: str, label: str, parameters: Mapping[str, str | Sequence[str]]) -> None:
    st.page_link(st.session_state["pages"][page], label=label, query_params=parameters)


def _houses(registry: Registry, told: Mapping[str, list[dict]]) -> None:
    """What each number's house dialect is, and since when."""
    rows = []
    for number in AT_BIRTH:
        versions = told.get(number, [])
        since, why = "with labbook", ""
        if versions:
            since, why = f"{local(versions[0]['at']):%Y-%m-%d}, {versions[0]['by']}", versions[0]["why"] or ""
        away = written_choices(number, registry.choices(number))
        rows.append(
            (number, dialect_words(registry.choices(number)), "" if away == "house" else away, since, why)
        )
    session.table(("number", "house dialect", "departs from birth in", "since when", "why"), rows)
