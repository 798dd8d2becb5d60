"""Numbers: every row of the registry with its formula, source, bands and counts that agree with the runs."""

import html
import math

import numpy as np
import pytest

from labbook import Book
from labbook.app.numbers_strip import strip_html
from labbook.registry.catalogue import NUMBERS
from labbook.registry.quantities import QUANTITIES
from labbook.registry.regimes import REGIMES


@pytest.fixture(scope="module")
def kept(demo_book):
    with Book.open(demo_book) as book:
        return book.runs(columns=tuple(NUMBERS))


def test_every_number_stands_with_formula_and_source(open_page, demo_book):
    page = open_page(demo_book, "numbers")
    words = html.unescape(page.words())
    assert len(page.at.latex) == len(NUMBERS)
    for number in NUMBERS.values():
        assert number.name in words and number.source in words and number.dialect in words


def test_the_house_drag_model_is_named_and_what_it_lacks(open_page, demo_book):
    words = open_page(demo_book, "numbers").words()
    assert "cylinder_finite" in words and "Tirado" in words
    assert "Drag models carry no uncertainty of their own" in words


def test_each_number_links_to_as_many_runs_as_have_it(open_page, demo_book, kept):
    page = open_page(demo_book, "numbers")
    shown = {q.proto.query_string: q.proto.label for q in page.at.get("page_link")}
    for key in NUMBERS:
        n = int(kept[key].notna().sum())
        if n:
            assert shown[f"range={key}%3A-inf%3Ainf"].startswith(f"{n} kept run")


def test_each_regime_counts_its_runs(open_page, demo_book, kept):
    words = html.unescape(open_page(demo_book, "numbers").words())
    for regime in REGIMES.values():
        n = int(regime.holds(kept[regime.number].to_numpy()).sum())
        assert any(f"{regime.name} " in tag and f": {n} run" in tag for tag in words.split("lb-tag")), (
            regime.name
        )
    table = html.unescape(open_page(demo_book, "numbers", part="regimes").words())
    assert "0.2 ≤ St ≤ 0.4" in table and "Re_ω < 0.1" in table and "Sp > 4" in table


def test_every_quantity_stands_with_its_units(open_page, demo_book):
    words = html.unescape(open_page(demo_book, "numbers", part="quantities").words())
    for row in QUANTITIES.values():
        assert f"<td>{row.key}</td><td>{row.symbol}</td>" in words
        assert ", ".join(row.units) in words


def test_a_bad_part_is_said(open_page, demo_book):
    page = open_page(demo_book, "numbers", part="colours")
    assert "'colours'" in page.said()[0] and len(page.at.latex) == len(NUMBERS)


def test_an_empty_book_still_reads_as_a_reference(open_page, tmp_path):
    Book.new(tmp_path / "empty.db").close()
    page = open_page(tmp_path / "empty.db", "numbers")
    assert len(page.at.latex) == len(NUMBERS)
    assert page.words().count("No kept run has it yet") == len(NUMBERS)


@pytest.mark.parametrize("values", [[], [math.nan], [0.0, -1.0], [2.0], np.geomspace(1e-3, 1e3, 50)])
def test_a_strip_can_be_drawn_of_anything(values):
    for key in NUMBERS:
        text = strip_html(key, np.asarray(values, dtype=float), dark=False)
        assert text.count("<img") == 1 and "nan" not in text.split("base64")[0]
