"""Numbers, while a formula is typed: the proof, its worked example, and its value and slopes on one run."""

import math

import streamlit as st

from labbook.app import session
from labbook.app.record_parts import sheet_of
from labbook.book import queries
from labbook.book.asking import Question
from labbook.charts.axes import written_unit
from labbook.errors import Refusal, Refusals
from labbook.registry.formula import Formula
from labbook.registry.latex import formula_latex, symbol_latex
from labbook.registry.own_numbers import read_answer, read_example
from labbook.registry.proving import Proof, Sensitivity, proof, sensitivities
from labbook.registry.quantities import QUANTITIES, RESOLVED_KEYS
from labbook.registry.written import shown, written

NEWEST = 40  # runs that are offered to try a formula on
TRIED = "numbers:tried"
VOCABULARY = {key: QUANTITIES[key] for key in RESOLVED_KEYS}


def show(cells: dict[str, str]) -> None:
    """Everything that is known of the typed formula so far."""
    if not cells["formula"]:
        session.note("Leave the formula's field and see here: whether it is a pure number, its value on one "
                     "of your runs, and how much each input moves it.")  # fmt: skip
        return
    found = proof(cells["formula"], VOCABULARY)
    if found.formula is not None:
        st.latex(_defined(cells["symbol"] or cells["key"], found.formula), width="content")
    if not found.is_pure:
        session.say_refused(f"{found.sentence}.")
        return
    st.html('<div style="font-size:0.95rem"><b>a pure number</b></div>')
    _worked(cells, found)
    _on_a_run(found.formula)


def _defined(symbol: str, formula: Formula) -> str:
    """symbol = formula, the formula alone while the symbol is none."""
    try:
        return f"{symbol_latex(symbol)} = {formula_latex(formula.tree)}"
    except Refusal:
        return formula_latex(formula.tree)


def _worked(cells: dict[str, str], found: Proof) -> None:
    """Which inputs the worked example still lacks, and whether it gives its answer."""
    try:
        values = read_example(cells["example"], found.keys) if cells["example"] else {}
    except (Refusal, Refusals) as refused:
        session.note(f"Worked example: {_first(refused)}")
        return
    missing = [key for key in found.keys if key not in values]
    if missing:
        session.note(f"The worked example still needs {', '.join(_needed(key) for key in missing)}.")
        return
    try:
        answer, tolerance = read_answer(cells["answer"])
        value = float(found.formula.value(values))
    except (Refusal, ArithmeticError, TypeError, ValueError):
        session.note("The worked example has all its inputs.")
        return
    if math.isclose(value, answer, rel_tol=tolerance):
        session.note("The worked example gives its answer.")
    else:
        session.say_refused(f"The worked example gives {value:.6g}, not {cells['answer']}.")


def _first(refused: Refusal | Refusals) -> str:
    return str(refused.findings[0] if isinstance(refused, Refusals) else refused)


def _needed(key: str) -> str:
    row = QUANTITIES[key]
    unit = f" [{row.unit}]" if row.unit != "1" else ""
    return f"{key}{unit}" + (f" (or what it follows from: {row.formula})" if row.formula else "")


# ---- on one run


@st.cache_data(max_entries=64, show_spinner="Looking for runs with all inputs")
def _runs_with(state: str, keys: tuple[str, ...]) -> tuple[int, dict[str, str]]:
    """How many kept runs have all these keys, and the newest of them: code -> what to call it."""
    asked = Question(ranges={key: (-math.inf, math.inf) for key in keys})
    n = session.book().ask(queries.count, asked)
    table = session.book().frame(asked, keys=(), texts=("code", "swimmer", "fluid"), newest=NEWEST)
    return n, {row.code: f"{row.code}: {row.swimmer} in {row.fluid}" for row in table.itertuples()}


def _on_a_run(formula: Formula) -> None:
    state = session.state_of_book()
    n, newest = _runs_with(state, formula.keys)
    have = f"{n} kept run{'s have' if n != 1 else ' has'}" if n else "No kept run has"
    session.note(f"{have} all its inputs.")
    code = _chosen(formula.keys, newest)
    if not code:
        return
    try:
        sheet = sheet_of(state, code)
        rows = sensitivities(formula, sheet.values, sheet.u)
    except Refusal as refusal:
        session.say_refused(f"{code}: {refusal.reason}" + (f"; {refusal.remedy}." if refusal.remedy else "."))
        return
    value = float(formula.value({key: sheet.values[key] for key in formula.keys}))
    u = math.sqrt(sum(row.contribution**2 for row in rows if not math.isnan(row.contribution)))
    st.html(f'<div style="font-size:1.25rem"><b>{written(value, u)}</b></div>')
    _table(rows, sheet, value)
    session.note("Inputs are taken as independent here; once added, shared causes are counted once.")


def _chosen(keys: tuple[str, ...], newest: dict[str, str]) -> str:
    """The code of the run that a formula of these keys is tried on: the one before, where it fits."""
    # a box of its own for these keys: a browser keeps what the box of one key shows
    state, box = st.session_state, f"numbers:try:{','.join(keys)}"
    if box not in state:
        before = state.get(TRIED)
        state[box] = before if before in newest else next(iter(newest), None)
    chosen = st.selectbox(
        "Try it on a run: one of the newest, or type a code", list(newest), index=None,
        format_func=lambda code: newest.get(code, code), accept_new_options=True, key=box,
        placeholder="R-0012",
    )  # fmt: skip
    code = (chosen or "").partition(":")[0].strip()  # a label that is offered no more comes back whole
    state[TRIED] = code
    return code


def _table(rows: list[Sensitivity], sheet, value: float) -> None:
    """How the number answers to each input, the one that adds most to its uncertainty first."""
    ordered = sorted(rows, key=lambda row: math.inf if math.isnan(row.contribution) else -row.contribution)
    session.table(
        ("input", "on this run", "d ln y/d ln x", "u from it"),
        [
            (QUANTITIES[row.key].symbol, _input(sheet, row.key), _exponent(row.relative_slope),
             _adds(row.contribution, value))
            for row in ordered
        ],
        numeric=(1, 2, 3),
    )  # fmt: skip


def _input(sheet, key: str) -> str:
    """A value as it was typed, else in its usual unit."""
    typed = sheet.typed.get(key)
    text = shown(key, sheet.values[key], sheet.u[key], typed[1] if typed else None)
    unit = QUANTITIES[key].unit
    return text.replace(f" {unit}", f" {written_unit(unit)}") if text.endswith(f" {unit}") else text


def _exponent(slope: float) -> str:
    if not math.isfinite(slope):
        return "–"
    return f"{round(slope, 4) + 0.0:g}"


def _adds(contribution: float, value: float) -> str:
    """The part of the number's standard uncertainty that comes from one input, relative where that can be."""
    if math.isnan(contribution):
        return "no u known"
    if not contribution:
        return "0"
    return f"{100 * contribution / abs(value):.2g} %" if value else f"{contribution:.2g}"
