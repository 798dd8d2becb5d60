"""The Runs table where values come from tracks: in the unit that the person types, said to be reduced, sorted by value."""

import math

import pytest

from labbook.api import Book
from labbook.app import runs_cells
from labbook.book.asking import Question
from labbook.book.track_pages import units_before

MM_MIN = 1e-3 / 60


def cells(book, key, **asked):
    """(header, values, texts) of a column, and the runs."""
    found = book.frame(Question(**asked), keys=(key,), texts=("code", "typed"))
    before = book.ask(units_before, runs_cells.reduced_runs(found))
    label, values, texts = runs_cells.numeric(found, key, key, before)
    return label, dict(zip(found["code"], values, strict=True)), {c: texts.get(v, "") for c, v in zip(found["code"], values, strict=True)}


@pytest.fixture
def book(demo_copy):
    with Book.open(demo_copy) as opened:
        yield opened


def test_a_reduced_speed_is_in_the_unit_of_what_was_typed_and_says_so(book):
    run = book.sheet("R-0916")  # typed: mm/min, by the demo's pike
    assert run.track.replaced["U"][1] == "mm/min"
    label, values, texts = cells(book, "U")
    assert label == "U", "several people, several units"
    text = texts["R-0916"]
    assert text.startswith("reduced ") and text.endswith(" mm/min") and "e-" not in text
    said = float(text.removeprefix("reduced ").partition("(")[0])
    # rounded to two digits of u at least
    assert said * MM_MIN == pytest.approx(run.values["U"], abs=0.5 * run.u["U"])
    assert values["R-0916"] == pytest.approx(run.values["U"], rel=1e-12), "the table sorts by SI"


def test_a_column_in_one_unit_has_it_in_the_header(book):
    label, _, texts = cells(book, "U", people=("pike",), swimmers=("sedge-01",))
    assert label == "U (mm/min)"
    reduced = [t for t in texts.values() if t.startswith("reduced ")]
    assert len(reduced) == 2 and not any("mm" in t for t in texts.values())


def test_no_cell_is_in_bare_si(book):
    for key, si in (("U", "m/s"), ("A_tip", "m")):
        _, _, texts = cells(book, key)
        reduced = [t for t in texts.values() if t.startswith("reduced")]
        assert len(reduced) > 20 and not any(t.endswith(f" {si}") for t in reduced), key


def test_where_nothing_was_typed_the_usual_unit_serves(book):
    book.record(swimmer="rush-05", fluid="sil12500-a", f="0.56 Hz", T="23.7 degC", at="2026-11-30T10:00")
    code = book.runs(columns=("f",))["code"].iloc[-1]
    t = [i / 20 for i in range(600)]
    rows = "".join(f"{s},{40 * s + 400 * math.sin(2 * math.pi * 0.56 * s) + 5 * math.sin(97 * s * s):.3f},{5 * math.sin(89 * s * s):.3f}\n" for s in t)
    book.attach_track(code, f"t [s],x [um],y [um]\n{rows}".encode(), "a.csv", {"axis": 0, "f": "fit"}, ("U", "f"))
    speed, f = (cells(book, key)[2][code] for key in ("U", "f"))
    # the table's usual units are mm/s and Hz; 30 s know f to 1e-4 and better
    assert speed.startswith("reduced 0.0") and speed.endswith(" mm/s")
    assert float(f.removeprefix("reduced ").partition("(")[0]) == pytest.approx(0.56, abs=1e-4) and f.endswith(" Hz")


def test_the_page_shows_it(open_page, demo_copy):
    page = open_page(demo_copy, "runs", swimmer="sedge-01", person="pike")
    drawn = page.at.dataframe[0].proto.arrow_data.styler.display_values
    assert b"reduced 0." in drawn and not page.said()
