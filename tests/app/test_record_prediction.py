"""What theory says on a run's record: speeds and ratio, model and doubts, the picture of the beat, the narrow line."""

import json
import math
from html import unescape

import pytest
from streamlit.dataframe_util import convert_arrow_bytes_to_pandas_df

from labbook.api import Book
from labbook.book.asking import Question
from labbook.registry.written import shown, written


@pytest.fixture
def page(open_page, demo_book):
    return lambda code: open_page(demo_book, "runs", run=code)


def html(page):
    return unescape("\n".join([*page.texts(), *(m.value for m in page.at.markdown)]))


class Picture:
    """The beat as the page sends it."""

    def __init__(self, sent):
        self.spec = json.loads(sent.spec)
        self.names = {part["name"] for part in self.spec["layer"]}
        self._sent = {d.name: d.data.data for d in sent.datasets}

    def rows(self, name):
        """The rows behind a layer, which Streamlit sends beside the specification."""
        data = next(part for part in self.spec["layer"] if part["name"] == name)["data"]
        return convert_arrow_bytes_to_pandas_df(self._sent[data["name"]])

    def length(self, name):
        bar = self.rows(name).iloc[0]
        return bar["high"] - bar["low"]


def picture(page):
    """The beat, None where there is none."""
    found = [c.proto for c in page.at.get("vega_lite_chart") if '"envelope"' in c.proto.spec]
    return Picture(found[0]) if found else None


def sheets(target, form):
    """The sheets of kept runs of a form, newest first."""
    with Book.open(target) as book:
        found = book.frame(Question(), keys=(), texts=("code", "form"), spread=False)
        return [book.sheet(code) for code in found[found["form"] == form]["code"].iloc[::-1][:20]]


def measured_tail(target):
    found = (s for s in sheets(target, "flexible tail") if s.track is None)
    return next(s for s in found if s.values["U_ratio"] is not None and s.values["A_tip"] is not None)


def test_both_speeds_stand_in_the_unit_that_was_typed_with_their_ratio(page, demo_book):
    sheet = measured_tail(demo_book)
    text, unit = html(page(sheet.texts["code"])), sheet.typed["U"][1]
    for key in ("U", "U_model"):
        assert f'>{shown("U", sheet.values[key], sheet.u[key], unit)}</td>' in text
    assert f'>{written(sheet.values["U_ratio"], sheet.u["U_ratio"])}</td>' in text
    assert "Small-angle theory of an elastic tail" in text and sheet.prediction.source in text


def test_the_beat_has_the_measured_excursion_beside_the_predicted_one(page, demo_book):
    sheet = measured_tail(demo_book)
    beat, unit = picture(page(sheet.texts["code"])), sheet.typed["A_tip"][1]
    told = set(beat.rows("texts")["text"])
    assert f"measured {shown('A_tip', sheet.values['A_tip'], sheet.u['A_tip'], unit)}" in told
    assert f"predicted {shown('A_tip', sheet.prediction.A_tip, None, unit)}" in told
    ratio = beat.length("measured_tip") / beat.length("predicted_tip")
    assert ratio == pytest.approx(sheet.values["A_tip"] / sheet.prediction.A_tip, rel=1e-9)
    end = beat.rows("envelope").iloc[-1]
    # the theory's envelope ends at its own tip; drawn to a hundredth of a pixel at both ends
    assert end["high"] - end["low"] == pytest.approx(beat.length("predicted_tip"), abs=0.03)
    along = beat.rows("tail")["x"]
    per_metre = (along.iloc[-1] - along.iloc[0]) / sheet.values["L_tail"]
    assert beat.length("measured_tip") / per_metre == pytest.approx(sheet.values["A_tip"], rel=1e-3)  # to scale
    assert any(p["name"] == "phase" and p["bind"]["input"] == "range" for p in beat.spec["params"])


def test_a_run_whose_values_come_from_a_track_keeps_the_units_of_the_person(page, demo_book):
    with Book.open(demo_book) as book:
        found = [s for s in book.sheets(Question()) if s.track and s.values["U_ratio"] and "A_tip" in s.track.replaced]
    sheet = found[0]
    opened = page(sheet.texts["code"])
    unit = sheet.track.replaced["U"][1]
    assert f">{shown('U', sheet.values['U_model'], sheet.u['U_model'], unit)}</td>" in html(opened)
    assert all(text.split()[-1] in ("mm", "um", "cm", "µm") for text in picture(opened).rows("texts")["text"])


def test_without_a_measured_tip_the_prediction_stands_alone(page, demo_book):
    sheet = next(s for s in sheets(demo_book, "flexible tail") if s.values["U_model"] is not None and s.values["A_tip"] is None)
    opened = page(sheet.texts["code"])
    beat = picture(opened)
    assert "predicted_tip" in beat.names and "measured_tip" not in beat.names
    assert "no tip excursion was measured" in html(opened)


@pytest.mark.parametrize(("form", "said"), [
    ("helix", "Resistive-force theory of a helix"), ("undulating", "Scaling of swimming animals"),
    ("rigid tail", "Scallop theorem: a rigid tail"), ("hinged", "Scallop theorem: a body with one hinge"),
])  # fmt: skip
def test_other_forms_have_their_sentence_and_no_beat(page, demo_book, form, said):
    sheet = sheets(demo_book, form)[0]
    opened = page(sheet.texts["code"])
    text = html(opened)
    assert said in text and picture(opened) is None
    for doubt in sheet.prediction.doubts:
        assert doubt[1:] in text
    if form in ("rigid tail", "hinged"):
        assert "measured over predicted" not in text  # no ratio to nothing


def test_what_is_missing_for_a_prediction_is_said(page, demo_book):
    sheet = next(s for s in sheets(demo_book, "flexible tail") if s.values["theta0"] is None)
    opened = page(sheet.texts["code"])
    assert "No prediction: needs theta0: it was not typed." in html(opened) and picture(opened) is None


@pytest.mark.parametrize(("drive", "more"), [
    ("clamped_heave", {"h0": "1.0 mm"}), ("pivoted_angle", {"theta0": "0.2 rad"}), ("free_head_torque", {"B": "5 mT"}),
])  # fmt: skip
def test_every_drive_of_a_tail_has_its_beat(open_page, demo_copy, drive, more):
    with Book.open(demo_copy) as book:
        code = book.record(swimmer="reed-01", fluid="syrup-a", drive=drive, f="0.2 Hz", T="22 degC", **more, by="wren")
        sheet = book.sheet(code)
    assert sheet.values["U_model"] is not None
    beat = picture(open_page(demo_copy, "runs", run=code))
    assert ("head" in beat.names) == drive.startswith("free")
    along, envelope = beat.rows("tail")["x"], beat.rows("envelope")
    per_metre = (along.iloc[-1] - along.iloc[0]) / sheet.values["L_tail"]
    width = (envelope["high"] - envelope["low"]) / per_metre
    assert width.iloc[-1] == pytest.approx(sheet.prediction.A_tip, abs=0.03 / per_metre)
    if drive == "clamped_heave":  # the base moves by what was set
        assert width.iloc[0] / 2 == pytest.approx(1.0e-3, abs=0.02 / per_metre)


def test_a_narrow_panel_has_one_line(open_page, demo_book):
    sheet = measured_tail(demo_book)
    text = html(open_page(demo_book, "trends", run=sheet.texts["code"]))
    assert f"Measured over predicted speed: {written(sheet.values['U_ratio'], sheet.u['U_ratio'])}" in text
    assert "What theory says" not in text
    lacking = next(s for s in sheets(demo_book, "flexible tail") if s.values["theta0"] is None)
    assert "No prediction: needs theta0: it was not typed" in html(open_page(demo_book, "trends", run=lacking.texts["code"]))
    stuck = sheets(demo_book, "rigid tail")[0]
    text = html(open_page(demo_book, "trends", run=stuck.texts["code"]))
    assert "Theory predicts 0 " in text and "gets nowhere in Stokes flow" in text


def test_the_ratio_is_of_the_speeds_above_it(demo_book):
    sheet = measured_tail(demo_book)
    assert math.isclose(sheet.values["U_ratio"], sheet.values["U"] / sheet.values["U_model"], rel_tol=1e-12)
