"""The parts of a run's sheet that are read: facts, what was resolved, numbers, pictures, ledger lines."""

import html

import pandas as pd
import streamlit as st

from labbook.app import session
from labbook.app.record_budget import CHECK, budgets_of, part_in_words
from labbook.app.record_track import replaced
from labbook.book import queries
from labbook.book.curves import viscosity_frames
from labbook.book.reduced_cells import in_short
from labbook.book.run_sheet import RunSheet, moment_in_words
from labbook.charts.axes import written_formula
from labbook.charts.drawings import swimmer_drawing
from labbook.charts.fluid_chart import viscosity_chart
from labbook.registry.catalogue import Number
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES
from labbook.registry.typed import REDUCED
from labbook.registry.written import shown, written

RESOLVED = {"mu": "mu_from", "rho": "rho_from", "lam": "lam_from", "E": "E_from"}
FOLLOWING = ("nu", "EI", "a", "zeta_n", "zeta_t")  # shown under what they follow from
TEXTS = ("rig", "drive", "series", "video", "note")
ESSENTIAL = ("Sp", "U_scaled", "stride", "Re_omega", "St", "Re", "f_ratio")


@st.cache_data(max_entries=64, show_spinner=False)
def sheet_of(state: str, code: str) -> RunSheet:
    """Everything about one run in this state of the book."""
    return session.book().sheet(code)


@st.cache_data(max_entries=32, show_spinner=False)
def curves_of(state: str, fluid: str) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Readings and fitted curves of a fluid."""
    return session.book().ask(viscosity_frames, fluid)


@st.cache_data(max_entries=64, show_spinner=False)
def _shape(state: str, swimmer: str) -> dict:
    return session.book().ask(queries.swimmer_shape, swimmer)


@st.cache_data(max_entries=64, show_spinner=False)
def _ledger(state: str, code: str) -> list[dict]:
    return session.book().ask(queries.ledger_lines, code=code).to_dict("records")


def symbol(key: str) -> str:
    """The symbol of a key as printed."""
    row = session.registry().numbers.get(key) or QUANTITIES.get(key)
    return {"T_end": "T at the end"}.get(key, key) if row is None else row.symbol


def as_typed(entry: list) -> str:
    """A typed quantity as it was written, with the unit that its column's header gave."""
    text, unit = entry[0], entry[1]
    if entry[4] == REDUCED:  # nobody wrote it
        return written(entry[2], entry[3], unit)
    return (
        text
        if not text[-1:] or not (text[-1].isdigit() or text[-1] in ").") or unit == "1"
        else f"{text} {unit}"
    )


def fact(sheet: RunSheet, key: str) -> str:
    """A quantity of the run as it was typed, or as its track says it; empty where there is neither."""
    if key not in sheet.typed:
        return ""
    return value(sheet, key) if sheet.typed[key][4] == REDUCED else as_typed(sheet.typed[key])


def _marked(sheet: RunSheet, key: str) -> str:
    """The marks of a fact; beside a reduced one stands what was typed."""
    marks, before = list(sheet.marks.get(key, [])), replaced(sheet, key)
    if before is not None:
        marks += [f"typed {before}" if before else "nothing was typed"]
    return ", ".join(marks)


def facts(sheet: RunSheet) -> None:
    """What was typed, as typed; where no uncertainty was typed, and none comes from the rig, it says so."""
    rows = [(f"{symbol(key)}", _name(key), fact(sheet, key), _marked(sheet, key)) for key in sheet.typed]
    rows += [("", name, sheet.texts[name], "") for name in TEXTS if sheet.texts[name]]
    session.table(("", "", "as typed", ""), rows, numeric=(2,))


def _name(key: str) -> str:
    name = QUANTITIES[key].name if key in QUANTITIES else "fluid temperature at the end"
    return {"U": "speed, head first positive"}.get(key, name)


def resolved(sheet: RunSheet) -> None:
    """What the fluid and the material were on the day, and from which readings."""
    rows = []
    for key, said in RESOLVED.items():
        if sheet.values[key] is None:
            if key in sheet.why_absent and key != "lam":
                rows.append((symbol(key), "–", sheet.why_absent[key]))
            continue
        _, _, source = sheet.sentences.get(said, "").partition(": ")
        marks = sheet.marks.get(key, [])
        rows.append(
            (symbol(key), value(sheet, key), ", ".join([source, *marks]) if source else ", ".join(marks))
        )
    rows += [
        (symbol(k), value(sheet, k), QUANTITIES[k].name) for k in FOLLOWING if sheet.values[k] is not None
    ]
    session.table(("", "resolved", "from"), rows, numeric=(1,))


def value(sheet: RunSheet, key: str) -> str:
    """A value with its uncertainty as a page writes it; empty where absent."""
    typed = sheet.typed.get(key)
    if typed and typed[4] == REDUCED:  # in the unit that the person uses
        typed = sheet.track.replaced.get(key) if sheet.track else None
    return shown(key, sheet.values[key], sheet.u[key], typed[1] if typed else None)


def viscosity(sheet: RunSheet, place: str) -> None:
    """The fluid's readings and fits with the run's temperature marked."""
    if sheet.values["T"] is None:
        return
    run = (sheet.values["T"], sheet.values["mu"], sheet.u["mu"])
    spec = _viscosity_spec(session.state_of_book(), sheet.texts["fluid"], run, session.is_dark())
    if spec is not None:
        st.vega_lite_chart(spec=spec, theme=None, width="stretch", key=f"{place}:viscosity")


# a chart costs a tenth of a second to build, so what is kept over reruns is its finished specification
@st.cache_data(max_entries=64, show_spinner=False)
def _viscosity_spec(state: str, fluid: str, run: tuple, dark: bool) -> dict | None:
    readings, curves = curves_of(state, fluid)
    if readings.empty and curves.empty:
        return None
    marked = dict(zip(("T", "mu", "u_mu"), run, strict=True))
    return viscosity_chart(readings, curves, marked, dark, height=230).to_dict()


def picture(sheet: RunSheet, place: str, width: int = 460) -> None:
    """The swimmer to scale."""
    spec = _picture_spec(session.state_of_book(), sheet.texts["swimmer"], session.is_dark(), width)
    st.vega_lite_chart(spec=spec, theme=None, width="content", key=f"{place}:swimmer")


@st.cache_data(max_entries=64, show_spinner=False)
def _picture_spec(state: str, swimmer: str, dark: bool, width: int) -> dict:
    return swimmer_drawing(_shape(state, swimmer), dark, width=width).to_dict()


def numbers(sheet: RunSheet) -> None:
    """Each number with formula, value, own and shared part, regime and marks; or why it is absent."""
    head = ("number", "formula", "value", "u own", "u shared", "regime and marks")
    cells = "".join(f"<th{' class=n' if 2 <= i <= 4 else ''}>{name}</th>" for i, name in enumerate(head))
    registry = session.registry()
    cautions = {k: b.caution for k, b in budgets_of(session.state_of_book(), sheet.texts["code"]).items()}
    there = [n for n in registry.numbers.values() if sheet.values[n.key] is not None]
    rows = "".join(_number_row(sheet, n, registry, cautions.get(n.key, "")) for n in there)
    rows += "".join(_absent_row(sheet, n) for n in registry.numbers.values() if sheet.values[n.key] is None)
    st.html(f'<table class="lb"><thead><tr>{cells}</tr></thead><tbody>{rows}</tbody></table>')


def _number_row(sheet: RunSheet, row: Number, registry: Registry, caution: str) -> str:
    key, held = row.key, [registry.regimes[name] for name in sheet.regimes if name in registry.regimes]
    bands = [r.name for r in held if any(band.number == key for band in r.bands)]
    said = "".join(f'<span class="lb-tag">{html.escape(b)}</span>' for b in bands)
    marks = [*sheet.marks.get(key, []), *([f"{caution}; {CHECK}"] if caution else [])]
    said += html.escape(", ".join(marks))
    spreads = (part_in_words(u[key], sheet.values[key]) for u in (sheet.u_own, sheet.u_shared))
    parts = "".join(f'<td class="n">{spread}</td>' for spread in spreads)
    formula, value_ = written_formula(row.parsed.tree), written(sheet.values[key], sheet.u[key])
    return (
        f"<tr>{_named(row)}<td>{html.escape(formula)}</td>"
        f'<td class="n"><b>{html.escape(value_)}</b></td>{parts}<td>{said}</td></tr>'
    )


def _absent_row(sheet: RunSheet, row: Number) -> str:
    formula = html.escape(written_formula(row.parsed.tree))
    why = html.escape(sheet.why_absent.get(row.key, ""))
    return f'<tr style="opacity:0.72">{_named(row)}<td>{formula}</td><td colspan="4">absent: {why}</td></tr>'


def _named(row: Number) -> str:
    name, symbol_ = html.escape(row.name), html.escape(row.symbol)
    if row.symbol == written_formula(row.parsed.tree):  # its formula is its symbol, and stands beside it
        return f"<td><b>{name}</b></td>"
    return f'<td><b>{symbol_}</b><br><span style="font-size:0.78rem;opacity:0.75">{name}</span></td>'


def essentials(sheet: RunSheet) -> None:
    """A few facts and numbers for a narrow panel."""
    typed = [
        (symbol(k) + (", reduced" if sheet.typed[k][4] == REDUCED else ""), fact(sheet, k))
        for k in ("f", "theta0", "B", "T", "U", "A_tip")
        if k in sheet.typed
    ]
    session.table(("as typed", ""), typed, numeric=(1,))
    found = [(symbol(k), value(sheet, k)) for k in ESSENTIAL if sheet.values[k] is not None]
    session.table(("number", ""), found, numeric=(1,))


def ledger(code: str) -> None:
    """The ledger lines that wrote the run or derived it again, newest first."""
    lines = _ledger(session.state_of_book(), code)
    rows = [
        (
            moment_in_words(line["at"]),
            line["by"],
            line["act"],
            line["subject"],
            changes(line),
            line["why"] or "",
        )
        for line in lines
    ]
    session.table(("when", "who", "act", "of", "before → after", "why"), rows)


def changes(line: dict) -> str:
    """'f: 0.5 Hz → 0.6 Hz; note: – → odd' of a ledger line; a first entry or a load is only named."""
    before, after = line["before"] or {}, line["after"] or {}
    if line["act"] == "load":
        return ", ".join(f"{n} {kind}s" for kind, n in after.get("added", {}).items())
    if not before:
        return ", ".join(
            f"{k} {v}" for k, v in after.items() if v and k in ("swimmer", "fluid", "f", "U", "T")
        )
    sides = ((k, *(in_short(k, side[k]) if side.get(k) else "–" for side in (before, after))) for k in {**before, **after})
    return "; ".join(f"{k}: {was} → {now}" for k, was, now in sides)
