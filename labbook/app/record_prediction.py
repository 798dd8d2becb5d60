"""What theory says of one run: predicted speed and ratio, the model with its doubts, the beat it predicts."""

import html

import numpy as np
import streamlit as st

from labbook.app import session
from labbook.book import queries
from labbook.book.run_sheet import RunSheet
from labbook.charts.beat_chart import beat_chart
from labbook.charts.beat_tips import Tip
from labbook.physics.predictions import predicted
from labbook.physics.tail_shapes import shape
from labbook.registry.quantities import QUANTITIES
from labbook.registry.typed import REDUCED
from labbook.registry.written import shown, written

# the slider under the beat is as easy to touch as any other control
SHEET = """<style>
[class*="st-key-lb-record"] .vega-bind input[type="range"] {
  box-sizing: content-box !important; width: 15rem !important;
  padding: 14px 0 !important; background-clip: content-box !important; }
[class*="st-key-lb-record"] .vega-bind label { display: flex; align-items: center; gap: 0.5rem; }
</style>"""
THICK = {"strip": "t", "tube": "D", "rod": "d"}  # the tail's thickness in the plane of bending


def show(sheet: RunSheet, place: str) -> None:
    """Measured and predicted speed, the model's sentence, source and doubts, and a tail's predicted beat."""
    said = sheet.prediction
    st.markdown("**What theory says**")
    rows = [
        ("speed measured", "U", _value(sheet, "U")),
        ("speed predicted", "U_model", _value(sheet, "U_model")),
        ("measured over predicted", "U/U_model", _value(sheet, "U_ratio")),
    ]
    session.table(("", "", ""), [row for row in rows if row[2] is not None], numeric=(2,))
    why = _why(sheet)
    if why:
        session.note(f"No prediction: {why}.")
    if sheet.prediction.source:
        told, source = html.escape(_sentence(said.says)), html.escape(said.source)
        st.html(f'<div class="lb-note">{told} <i>{source}</i></div>')
    for doubt in said.doubts:
        session.caution(f"{_sentence(doubt)}")
    spec = _spec(session.state_of_book(), sheet.texts["code"], sheet, session.is_dark())
    if spec is not None:
        st.html(SHEET)
        st.vega_lite_chart(spec=spec, theme=None, width="content", key=f"{place}:beat")
        session.note(_under(sheet))


def line(sheet: RunSheet) -> None:
    """One line for a narrow panel: measured over predicted speed, or why there is none."""
    ratio = _value(sheet, "U_ratio")
    if ratio is not None:
        session.note(
            f"Measured over predicted speed: {ratio}"
            + (", see its doubts" if sheet.prediction.doubts else "")
        )
    elif sheet.values["U_model"] is not None:
        session.note(f"Theory predicts {_value(sheet, 'U_model')}; {sheet.why_absent['U_ratio']}")
    else:
        session.note(f"No prediction: {_why(sheet)}")


def _value(sheet: RunSheet, key: str) -> str | None:
    value, u = sheet.values[key], sheet.u[key]
    if value is None:
        return None
    return shown("U", value, u, _unit(sheet, "U")) if key in QUANTITIES else written(value, u)


def _unit(sheet: RunSheet, key: str) -> str | None:
    """The unit in which a quantity was typed, also where a track took its place; None where it never was."""
    typed = sheet.typed.get(key)
    if typed and typed[4] == REDUCED:
        typed = sheet.track.replaced.get(key) if sheet.track else None
    return typed[1] if typed else None


def _why(sheet: RunSheet) -> str:
    """Why the run has no predicted speed; '' where it has."""
    return (
        "" if sheet.values["U_model"] is not None else sheet.why_absent["U_model"].removeprefix("no model: ")
    )


def _sentence(text: str) -> str:
    return f"{text[:1].upper()}{text[1:]}."


# a chart costs a tenth of a second to build, so what is kept over reruns is its finished specification
@st.cache_data(max_entries=64, show_spinner=False)
def _spec(state: str, code: str, _sheet: RunSheet, dark: bool) -> dict | None:
    """The picture of the beat; None where the model gives no shape."""
    if _sheet.prediction.A_tip is None:
        return None
    swimmer = session.book().ask(queries.swimmer_shape, _sheet.texts["swimmer"])
    known = {key: np.nan if value is None else value for key, value in _sheet.values.items()}
    found = predicted(form=swimmer["form"], drive=_sheet.texts["drive"], values=known)
    numbers = {key: float(found[key]) for key in ("head", "head_drag", "head_turn") if key in found}
    beat = shape(drive=_sheet.texts["drive"], Sp=_sheet.prediction.Sp, **numbers)
    sizes = {key: known[key] for key in ("L_tail", "b", "b_long")}
    sizes["thickness"] = known.get(THICK.get(swimmer["section"], ""), np.nan)
    told = _sheet.prediction.A_tip
    tip, u = _sheet.values["A_tip"], _sheet.u["A_tip"]
    unit, head = float(known["L_tail"] * found["tail_scale"]), numbers.get("head", 0.0)
    expected = Tip(told, f"predicted {_tip(_sheet, told, None)}")
    seen = None if tip is None else Tip(tip, f"measured {_tip(_sheet, tip, u)}", u)
    chart = beat_chart(beat, sizes, unit=unit, head=head, predicted=expected, measured=seen, dark=dark)
    return chart.to_dict()


def _tip(sheet: RunSheet, value: float, u: float | None) -> str:
    return shown("A_tip", value, u, _unit(sheet, "A_tip"))


def _under(sheet: RunSheet) -> str:
    """What the picture shows."""
    told = "Predicted beat to scale: frames of one period, the fainter the earlier, in their envelope"
    if sheet.values["A_tip"] is None:
        return f"{told}; no tip excursion was measured."
    spread = "" if sheet.u["A_tip"] is None else " with 1 u at its ends"
    return f"{told}; beside the tip its excursion peak to peak, predicted and measured{spread}."
