"""The uncertainty budget of one run: bars for a chosen number, the advice, a Monte Carlo check on request."""

import math
import re

import streamlit as st

from labbook.app import session
from labbook.book.budgets import Budget, Simulated, budgets, simulate
from labbook.book.run_sheet import RunSheet
from labbook.charts.budget_chart import budget_chart, share_in_words
from labbook.registry.monte_carlo import COVERAGE_FACTOR, DRAWS
from labbook.registry.quantities import QUANTITIES
from labbook.registry.written import written

FIRST = "Sp"  # the number shown first, where the run has it
CHECK = "check by Monte Carlo"


@st.cache_data(max_entries=64, show_spinner=False)
def budgets_of(state: str, code: str) -> dict[str, Budget]:
    """The budget of every number of a run in this state of the book."""
    return session.book().ask(budgets, code)


@st.cache_data(max_entries=64, show_spinner="Drawing the inputs and deriving the number from each draw …")
def _simulated(state: str, code: str, number: str) -> Simulated:
    return session.book().ask(simulate, code, number)


@st.cache_data(max_entries=64, show_spinner=False)
def _spec(state: str, code: str, number: str, dark: bool) -> dict:
    one = budgets_of(state, code)[number]
    rows = [{"name": _named(c), "own": c.own, "share": c.share} for c in one.contributions]
    return budget_chart(rows, dark).to_dict()


def _named(contribution) -> str:
    """'D tube outer diameter', and whose it is where others share it."""
    row = QUANTITIES.get(contribution.source)
    name = f"{row.symbol} {contribution.name}" if row is not None else contribution.name
    return name if contribution.own else f"{contribution.belongs}: {name}"


def part_in_words(u: float | None, value: float) -> str:
    """A part of the uncertainty to two digits; what rounding left of nothing is 0."""
    if u is None or not math.isfinite(u):
        return ""
    if u < 1e-12 * abs(value):
        return "0"
    text = f"{u:.2g}"
    return f"{float(text):.0f}" if "e+" in text else text.replace("e-0", "e-")


def show(sheet: RunSheet, place: str, *, narrow: bool = False) -> None:
    """The budget of a number that the reader chooses; a run without any number says so.

    narrow: bars and advice alone, for a panel beside a chart.
    """
    code, state = sheet.texts["code"], session.state_of_book()
    found = budgets_of(state, code)
    st.markdown("**Where the uncertainty comes from**")
    if not found:
        session.note(f"{code} has no number, so there is nothing to share out: each number says what it lacks.")
        return
    number = _choice(found, place, narrow)
    one = found[number]
    if not one.contributions:
        session.note("No input of this number carries an uncertainty.")
        return
    st.html(f'<div class="lb-note" style="opacity:1">{_totals(one)}</div>')
    spec = _spec(state, code, number, session.is_dark())
    st.vega_lite_chart(spec=spec, theme=None, width="stretch", key=f"{place}:budget:{number}")
    session.note(f"{_capital(one.advice)}.")
    if one.caution:
        session.caution(f"{one.caution}; {CHECK}")
    if not narrow:
        _check(state, code, one, place)


def _choice(found: dict[str, Budget], place: str, narrow: bool) -> str:
    numbers = session.registry().numbers
    keys = list(found)
    return st.selectbox(
        "Budget of",
        keys,
        index=keys.index(FIRST) if FIRST in keys else 0,
        format_func=lambda k: numbers[k].symbol if narrow else _title(numbers[k]),
        key=f"{place}:budget-of",
        label_visibility="collapsed",
    )


def _title(number) -> str:
    return number.name if number.symbol == number.name else f"{number.symbol} {number.name}"


def _totals(one: Budget) -> str:
    """'2.90(3) u 0.025 from own 0.0029 and shared 0.025', in the house's notation."""
    own, shared, u = (part_in_words(u, one.value) for u in (one.u_own, one.u_shared, one.u))
    return f"<b>{written(one.value, one.u)}</b>&ensp;u {u} from own {own} and shared {shared}"


# ---- Monte Carlo on request


def _check(state: str, code: str, one: Budget, place: str) -> None:
    asked = f"{place}:simulated"
    with st.container(horizontal=True, gap="small", vertical_alignment="center"):
        if st.button(CHECK.capitalize().replace("monte carlo", "Monte Carlo"), key=f"{place}:simulate"):
            st.session_state[asked] = (code, one.number)
        session.note(f"Draws every measured input {_spaced(DRAWS)} times, derives the number from each draw.")
    if st.session_state.get(asked) == (code, one.number):
        _result(_simulated(state, code, one.number))


def _result(found: Simulated) -> None:
    sample, u = found.sample, found.u
    ends = (found.value - COVERAGE_FACTOR * u, found.value + COVERAGE_FACTOR * u)
    # the mean and the u of draws are left out: a divisor near zero makes them those of its few wildest draws
    rows = [
        ("first order", interval_in_words(*ends, u)),
        ("Monte Carlo (JCGM 101:2008)", interval_in_words(sample.low, sample.high, u)),
    ]
    session.table(("", "95 % interval"), rows, numeric=(1,))
    if sample.undefined:
        lacking = f"{_spaced(sample.undefined)} of {_spaced(sample.draws)} draws"
        lost = share_in_words(sample.undefined / sample.draws)
        session.note(f"{lacking} ({lost}) have no result and are left out.")
    else:
        session.note(f"Each of the {_spaced(sample.draws)} draws has a result.")
    if found.warning:
        session.warn([f"{_capital(found.warning)}."])
    else:
        session.note("First order is borne out: both ends agree within half a unit of the first digit of u.")


def interval_in_words(low: float, high: float, u: float) -> str:
    """'2.85 to 2.95': both ends to a digit more than u has in the house's notation."""
    return " to ".join(re.sub(r"\(\d+\)", "", written(end, u / 10)) for end in (low, high))


def _capital(sentence: str) -> str:
    return sentence[:1].upper() + sentence[1:]


def _spaced(count: int) -> str:
    return f"{count:,}".replace(",", "\u202f")
