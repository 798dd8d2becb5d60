"""One run's sheet on a page: what it shows, and the acts on it with their refusals and warnings."""

import math
import re
from html import unescape

import pytest

from labbook.api import Book
from labbook.app import record, record_budget, record_parts
from labbook.book import queries
from labbook.book.curves import viscosity_frames
from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS

RUN = "R-0500"


@pytest.fixture
def target(demo_copy):
    return demo_copy


@pytest.fixture
def page(open_page, target):
    return open_page(target, "runs", run=RUN)


def field(page, label):
    """The one text field with a label."""
    (found,) = [w for w in page.at.text_input if w.label == label]
    return found


def html(page):
    """Everything on the page that is written as HTML or Markdown."""
    return unescape("\n".join([*page.texts(), *(m.value for m in page.at.markdown)]))


def sheet(target):
    with Book.open(target) as book:
        return book.sheet(RUN)


def lines(target):
    with Book.open(target) as book:
        return book.ask(queries.ledger_lines, code=RUN).to_dict("records")


def test_the_sheet_shows_facts_as_typed_sources_and_every_number(page, target):
    run, text = sheet(target), html(page)
    for entry in run.typed.values():
        assert entry[0] in text
    for said in run.sentences.values():
        assert said.partition(": ")[2] in text
    assert "from digits" in text
    for key, number in NUMBERS.items():
        assert number.name in text
        if run.values[key] is None:
            assert f"absent: {run.why_absent[key]}"[:40] in text


def test_the_formulas_are_readable(page):
    assert "L_tail (ζ_n ω/EI)^(1/4)" in html(page)


def test_an_amendment_is_prefilled_refused_at_its_field_and_keeps_what_was_typed(page, target):
    page.press("Amend")
    assert field(page, "New text; empty clears it").value == "0.56 Hz"
    field(page, "New text; empty clears it").set_value("0.4 kg")
    field(page, "Why").set_value("misread")
    page.run()
    page.press(f"Amend {RUN}")
    assert any("kg is a mass" in s for s in page.said())
    assert field(page, "New text; empty clears it").value == "0.4 kg"
    assert field(page, "Why").value == "misread"
    assert sheet(target).typed["f"][0] == "0.56"


def test_an_amendment_without_a_reason_is_refused_at_the_reason(page):
    page.press("Amend")
    field(page, "New text; empty clears it").set_value("0.57 Hz")
    page.run()
    page.press(f"Amend {RUN}")
    assert any("why" in s for s in page.said())


def test_an_amendment_is_written_with_who_and_why_and_shown(page, target):
    page.press("Amend")
    field(page, "New text; empty clears it").set_value("0.57 Hz")
    field(page, "Why").set_value("read again from the video")
    page.run()
    page.press(f"Amend {RUN}")
    line = lines(target)[0]
    assert (line["act"], line["by"], line["why"]) == ("amend", "wren", "read again from the video")
    assert (line["before"]["f"], line["after"]["f"]) == ("0.56 Hz", "0.57 Hz")
    assert "f: 0.56 Hz → 0.57 Hz" in html(page)
    assert any(RUN in m.value for m in page.at.success)


def test_a_warning_asks_once_and_is_forgotten_when_the_text_changes(page, target):
    page.press("Amend")
    field(page, "New text; empty clears it").set_value("9000 Hz")
    field(page, "Why").set_value("a test of the warning")
    page.run()
    page.press(f"Amend {RUN}")
    assert page.at.warning
    assert sheet(target).typed["f"][0] == "0.56"
    field(page, "New text; empty clears it").set_value("8000 Hz")
    page.run()
    assert not page.at.warning  # what was confirmable is another value now
    page.press(f"Amend {RUN}")
    page.press(f"It is right, amend {RUN}")
    assert sheet(target).typed["f"][0] == "8000 Hz"
    assert "confirmed" in sheet(target).marks["f"]


def test_typo_is_one_touch_while_the_run_is_young(page, target):
    page.press("Amend")  # the demo book was made just now
    field(page, "New text; empty clears it").set_value("0.57 Hz")
    page.run()
    page.press("It was a typo")
    assert lines(target)[0]["why"] == "typo"


def test_a_run_is_voided_with_a_reason_and_kept_again(page, target):
    page.press("Void")
    page.press(f"Void {RUN}")
    assert any("why" in s for s in page.said())
    field(page, f"Why is {RUN} void?").set_value("bubble on the head")
    page.run()
    page.press(f"Void {RUN}")
    assert sheet(target).texts["state"] == "void"
    assert any("bubble on the head" in s for s in page.said())
    page.press("Keep again")
    field(page, f"Why is {RUN} to be kept after all?").set_value("it was another run")
    page.run()
    page.press(f"Keep {RUN} again")
    assert sheet(target).texts["state"] == "kept"


def test_every_cell_but_code_and_state_can_be_amended():
    assert {"f", "U", "swimmer", "fluid", "at", "note", "T_end"} <= set(record.AMENDABLE)
    assert not {"code", "state", "why"} & set(record.AMENDABLE)


@pytest.mark.parametrize(
    ("text", "unit", "shown"),
    [("0.56", "Hz", "0.56 Hz"), ("12.6(7) um/s", "um/s", "12.6(7) um/s"), ("2.62(8)", "mm", "2.62(8) mm"),
     ("1.2 +- 0.1", "mm", "1.2 +- 0.1 mm"), ("23,1 °C", "degC", "23,1 °C")],
)  # fmt: skip
def test_a_cell_without_unit_takes_its_headers(text, unit, shown):
    assert record_parts.as_typed([text, unit, 0.0, 0.0, "stated"]) == shown


@pytest.mark.parametrize(
    ("u", "value", "text"),
    [(0.0123, 1.0, "0.012"), (1e-18, 1.5, "0"), (634.0, 2e4, "630"), (6.54e-12, 5e-9, "6.5e-12"), (None, 1.0, "")],
)
def test_a_part_of_the_uncertainty_has_two_digits(u, value, text):
    assert record_budget.part_in_words(u, value) == text


def test_text_from_the_book_is_escaped(open_page, target):
    with Book.open(target) as book:
        book.amend(RUN, why="<b>why</b>", by="wren", note="<script>alert(1)</script>")
    page = open_page(target, "runs", run=RUN)
    bodies = "".join(page.texts())
    assert "<script>" not in bodies
    assert "<b>why</b>" not in bodies
    assert "&lt;script&gt;" in bodies


# ---- the curves under the small chart


def test_a_sets_curve_is_what_a_run_of_that_day_resolves_to(target):
    """The run's own stored viscosity lies on the curve of the set that its sheet names."""
    with Book.open(target) as book:
        run = book.sheet(RUN)
        readings, curves = book.ask(viscosity_frames, run.texts["fluid"])
    day = re.search(r"of (\d{4}-\d\d-\d\d)", run.sentences["mu_from"])[1]
    curve = curves[curves["set"] == day].sort_values("T")
    below = curve[curve["T"] <= run.values["T"]].iloc[-1]
    above = curve[curve["T"] >= run.values["T"]].iloc[0]
    part = (run.values["T"] - below["T"]) / max(above["T"] - below["T"], 1e-9)
    between = math.exp(math.log(below["mu"]) * (1 - part) + math.log(above["mu"]) * part)
    assert between == pytest.approx(run.values["mu"], rel=1e-4)  # a curve's bend over an eighth of a kelvin
    assert (curve["low"] < curve["mu"]).all() and (curve["mu"] < curve["high"]).all()
    assert set(readings["on"]) == set(curves["set"])
    measured = readings[readings["on"] == day]["T"]
    assert (curve["T"].min(), curve["T"].max()) == (measured.min(), measured.max())


def test_water_without_readings_has_the_published_curve(target):
    """1.0016 mPa s at 20 degC: IAPWS R12-08, as tabulated there."""
    with Book.open(target) as book:
        readings, curves = book.ask(viscosity_frames, "water-1")
    assert readings.empty
    at = curves.iloc[(curves["T"] - 293.15).abs().argmin()]
    assert at["mu"] == pytest.approx(1.0016e-3, rel=0.015)  # the nearest point is up to 0.3 K away: 0.7 %
    with Book.open(target) as book, pytest.raises(Refusal):
        book.ask(viscosity_frames, "honey")
