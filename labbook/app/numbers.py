"""Numbers: the registry as a reference one can read: formulas, sources, regimes with the runs, units."""

import html
import math

import streamlit as st

from labbook.app import session
from labbook.app.numbers_strip import strip_html
from labbook.book.asking import Question
from labbook.book.queries import frame, key_counts, regime_counts
from labbook.charts.axes import written_unit
from labbook.physics.rods import HOUSE_MODEL, MODELS
from labbook.registry.catalogue import NUMBERS, Number
from labbook.registry.dialects import DIALECTS
from labbook.registry.formula import parse
from labbook.registry.latex import formula_latex, number_latex
from labbook.registry.quantities import QUANTITIES, Quantity, written_dimension
from labbook.registry.regimes import REGIMES, Regime
from labbook.registry.written import SHOWN, shown

PARTS = {"numbers": "Numbers", "regimes": "Regimes", "dialects": "Dialects of Sp", "quantities": "Quantities"}
MOST_TICKED = 5_000  # runs whose values stand as ticks: along a strip more fall together anyway


@st.cache_data(max_entries=8, show_spinner="Counting the book's runs")
def _counts(state: str) -> tuple[dict[str, int], dict[str, int]]:
    """Kept runs that have each number, and that lie in each regime."""
    book = session.book()
    return book.ask(key_counts, NUMBERS), book.ask(regime_counts, Question())


@st.cache_data(max_entries=8, show_spinner="Placing the book's runs")
def _strips(state: str, dark: bool) -> dict[str, str]:
    """Each number's strip, with a tick for each of the newest kept runs."""
    table = session.book().ask(
        frame, Question(), keys=tuple(NUMBERS), texts=(), spread=False, newest=MOST_TICKED
    )
    return {key: strip_html(key, table[key].to_numpy(), dark) for key in NUMBERS}


def page() -> None:
    """The page."""
    part = session.address("part", "numbers")
    if part not in PARTS:
        session.say_refused(f"part {part!r}: not understood; there are {', '.join(PARTS)}.")
        part = "numbers"
    st.session_state["numbers:part"] = part

    def choose():
        session.set_address(part=st.session_state["numbers:part"] or part)

    st.segmented_control("Part", list(PARTS), key="numbers:part", format_func=PARTS.get, on_change=choose,
                         label_visibility="collapsed")  # fmt: skip
    counts, held = _counts(session.state_of_book())
    match part:
        case "numbers":
            _numbers(counts, held)
        case "regimes":
            _regimes(held)
        case "dialects":
            _dialects()
        case "quantities":
            _quantities()


def _numbers(counts, held) -> None:
    drawn = _strips(session.state_of_book(), session.is_dark())
    _drag_model()
    for number in NUMBERS.values():
        st.html('<hr style="margin:0.4rem 0;border:none;border-top:1px solid rgba(128,128,128,0.25)">')
        words, picture = st.columns([54, 46], gap="medium")
        with words:
            _words(number)
        with picture:
            st.html(drawn[number.key])
            _bands(number, held)
            _runs(number, counts[number.key])
            session.note(f"takes {_inputs(number)}")
    session.note(f"Ticks: up to {MOST_TICKED} of the newest kept runs; a negative value stands by its size.")


def _drag_model() -> None:
    """Which drag model the house uses, and what no drag model has."""
    model = MODELS[HOUSE_MODEL]
    session.note(
        f"Resistive coefficients ζ_n and ζ_t follow from the house drag model {HOUSE_MODEL}: {model.name}. "
        f"{model.source}. Drag models carry no uncertainty of their own: bars show what was measured, "
        "not how well the model holds."
    )


def _words(number: Number) -> None:
    st.html(f"<b>{html.escape(number.name)}</b> <code>{html.escape(number.key)}</code>")
    st.latex(number_latex(number), width="content")
    lines = [f"Compares {number.compares}."]
    if number.not_zero:
        lines.append(f"Not defined where {number.not_zero} is consistent with 0.")
    if number.only_drives:
        lines.append(f"For the drives {' and '.join(number.only_drives)} only.")
    if number.signed:
        lines.append("Keeps the sign of U.")
    session.note(" ".join(lines))
    session.note(f"House dialect: {number.dialect}.")
    session.note(f"Source: {number.source}.")


def _inputs(number: Number) -> str:
    parts = []
    for key in number.inputs:
        row = QUANTITIES[key]
        unit = written_unit(row.unit)
        parts.append(f"{row.symbol} [{unit}]" if unit else row.symbol)
    return ", ".join(parts)


def _bands(number: Number, held) -> None:
    mine = [r for r in REGIMES.values() if r.number == number.key]
    if mine:
        session.tags([f"{r.name} {_limits(r)}: {_count(held[r.name])}" for r in mine])


def _count(n: int) -> str:
    return f"{n} run{'s' if n != 1 else ''}"


def _limits(band: Regime) -> str:
    if not math.isfinite(band.low):
        return f"{'≤' if band.high_closed else '<'} {band.high:g}"
    if not math.isfinite(band.high):
        return f"{'≥' if band.low_closed else '>'} {band.low:g}"
    return f"{band.low:g} to {band.high:g}"


def _runs(number: Number, n: int) -> None:
    if not n:
        session.note("No kept run has it yet.")
        return
    st.page_link(st.session_state["pages"]["runs"], label=f"{n} kept run{'s have' if n != 1 else ' has'} it",
                 query_params={"range": f"{number.key}:-inf:inf"})  # fmt: skip


def _regimes(held) -> None:
    session.note("A regime is a named band on one number, read on the signed value in the house dialect. "
                 "Counts are kept runs.")  # fmt: skip
    rows = [
        (r.name, NUMBERS[r.number].symbol, _interval(r), r.source, str(held[r.name]))
        for r in REGIMES.values()
    ]
    session.table(("regime", "number", "band", "source", "runs"), rows, numeric=(4,))
    with st.container(horizontal=True):
        for r in REGIMES.values():
            if held[r.name]:
                st.page_link(st.session_state["pages"]["runs"], label=r.name, icon=":material/arrow_forward:",
                             query_params={"regime": r.name})  # fmt: skip


def _interval(band: Regime) -> str:
    """The band with its limits as they are printed: closed ones belong to it."""
    symbol = NUMBERS[band.number].symbol
    low = f"{band.low:g} {'≤' if band.low_closed else '<'} " if math.isfinite(band.low) else ""
    high = f" {'≤' if band.high_closed else '<'} {band.high:g}" if math.isfinite(band.high) else ""
    if not high:
        return f"{symbol} {'≥' if band.low_closed else '>'} {band.low:g}"
    return f"{low}{symbol}{high}"


def _dialects() -> None:
    session.note("One sperm number per group, and every dialect restated on demand. All rows are the same "
                 "rod: L_tail 20 mm, d 1 mm, EI 7.36e-8 N.m², 1 Pa.s, 2 Hz, L_body 24 mm.")  # fmt: skip
    for row in DIALECTS:
        formula, words, value = st.columns([38, 46, 16], vertical_alignment="center")
        with formula:
            st.latex(formula_latex(parse(row.formula, QUANTITIES).tree))
        chosen = ", ".join(f"{k} {v}" for k, v in row.choices.items()) or "the house dialect"
        words.html(f'<div class="lb-note"><b>{html.escape(chosen)}</b><br>{html.escape(row.source)}</div>')
        value.html(f'<div style="text-align:right">{row.answer:.5g}</div>')


def _quantities() -> None:
    session.note("One key from form to file, formula and axis. Outside the plausible range a value is warned "
                 "about, not refused.")  # fmt: skip
    rows = [
        (q.key, q.symbol, q.name, written_unit(q.unit) or "1", ", ".join(q.units), _plausible(q), _from(q))
        for q in QUANTITIES.values()
    ]
    session.table(("key", "symbol", "name", "SI", "accepted units", "plausible", "from"), rows)


def _plausible(row: Quantity) -> str:
    if not math.isfinite(row.low):
        return ""
    unit = SHOWN.get(row.key) or row.unit
    low, high = (shown(row.key, v, None, unit) for v in (row.low, row.high))
    return f"{low.removesuffix(' ' + unit)} to {high}"


def _from(row: Quantity) -> str:
    if row.of != "derived":
        return row.of
    return row.formula and f"= {row.formula}" or f"derived, {written_dimension(row.dimension)}"
