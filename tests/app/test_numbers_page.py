"""Numbers: every row of the registry with its formula, source, bands and counts that agree with the runs."""

import csv
import html
import io
import math

import numpy as np
import pytest

from labbook import Book
from labbook.app.numbers_strip import strip_html
from labbook.exchange.registry_out import registry_csv
from labbook.registry.catalogue import NUMBERS
from labbook.registry.group import at_birth
from labbook.registry.quantities import QUANTITIES
from labbook.registry.regimes import REGIMES

# Viscous force at the frequency of the beat to the bending force, worked by hand:
# 1 Pa.s x 2 Hz x (0.02 m)^4/8e-8 N.m2 = 4
OWN = {"key": "Vf", "name": "viscous stretch", "formula": "mu * f * L_tail**4 / EI",
       "compares": "drag to bending", "source": "own definition", "example": "mu = 1 Pa.s, f = 2 Hz, L_tail = 20 mm, EI = 8e-8 N.m2",
       "answer": "4.00"}  # fmt: skip


@pytest.fixture(scope="module")
def kept(demo_book):
    with Book.open(demo_book) as book:
        return book.runs(columns=tuple(NUMBERS))


@pytest.fixture
def with_own(demo_copy):
    """The demo with a number of its own in two versions."""
    with Book.open(demo_copy) as book:
        book.define_number(**OWN, by="wren")
        book.define_number(**OWN | {"formula": "2 * mu * f * L_tail**4 / EI", "answer": "8.00"}, by="finch",
                           why="both sides of the tail")  # fmt: skip
    return demo_copy


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
        n = int(regime.holds({key: kept[key].to_numpy() for key in regime.numbers}).sum())
        assert any(f"{regime.name}, " in tag and f": {n} run" in tag for tag in words.split("lb-tag")), (
            regime.name
        )
    # the printed limits of Taylor, Nudds & Thomas, Nature 425:707 (2003)
    assert "cruising, 0.2 ≤ St ≤ 0.4:" in words and "creeping, Re_ω < 0.1:" in words


def test_published_dialects_stand_with_their_number(open_page, demo_book):
    page = open_page(demo_book, "numbers", number="De")
    words = html.unescape(page.words())
    # Reiner's number with the time of one beat; f is the only rate that papers put for omega here
    assert "Other dialects: rate f." in words and "Other dialects: length L_body" not in words
    page.press("Dialects")
    assert page.at.query_params["part"] == "dialects" and page.at.query_params["number"] == "De"


def test_one_number_alone_by_the_address(open_page, demo_book):
    page = open_page(demo_book, "numbers", number="Sp")
    assert len(page.at.latex) == 1
    page.at.selectbox(key="numbers:only").set_value("Re")
    assert page.run().at.query_params["number"] == "Re" and "Purcell" in page.words()
    page.go(number="Spermy")
    assert "'Spermy'" in page.said()[0] and len(page.at.latex) == len(NUMBERS)


def test_another_house_dialect_is_what_the_page_says(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        book.adopt_dialect("St", {"rate": "omega"}, why="as in our papers", by="wren")
    words = html.unescape(open_page(demo_copy, "numbers", number="St").words())
    assert "rate: omega" in words and "The group chose rate omega." in words
    # the other two are the one at birth (Taylor et al. 2003: f times peak to peak) and half of that
    assert "Other dialects: rate f; rate f, amplitude half." in words
    assert "The group chose" not in html.unescape(open_page(demo_copy, "numbers", number="Re").words())


def test_an_own_number_stands_in_the_list_with_its_versions(open_page, with_own):
    page = open_page(with_own, "numbers")
    assert len(page.at.latex) == len(NUMBERS) + 1
    page.go(number="Vf")
    words = html.unescape(page.words())
    assert "own, version 2" in words and "\\frac{2 \\, \\mu" in page.at.latex[0].value
    old, new = words.index("<code>mu * f * L_tail**4 / EI"), words.index("<code>2 * mu * f")
    assert new < old and "finch" in words and "because: both sides of the tail" in words
    assert [e.label for e in page.at.expander] == ["2 versions"]
    with Book.open(with_own) as book:
        n = int(book.runs(columns=("Vf",))["Vf"].notna().sum())
    assert f"{n} kept runs have it" in page.links() and n > 100


def test_withdrawing_wants_a_reason_and_takes_it_from_the_list(open_page, with_own):
    page = open_page(with_own, "numbers", number="Vf")
    page.press("Withdraw Vf")
    assert "why: is missing" in page.said()[0]
    with Book.open(with_own) as book:
        assert "Vf" in book.registry.own
    page.fill("withdraw:Vf", why="the same as Sp to the fourth").press("Withdraw Vf")
    assert "withdrawn" in page.at.success[0].value
    assert page.said() == [] and "number" not in page.at.query_params
    assert len(page.at.latex) == len(NUMBERS) and "own, version" not in page.words()
    with Book.open(with_own) as book:
        assert "Vf" not in book.registry.own and book.check() == []


def test_the_registry_can_be_kept_as_csv_and_markdown(open_page, with_own):
    page = open_page(with_own, "numbers")
    labels = [b.proto.label for b in page.at.get("download_button")]
    assert labels == ["CSV", "Markdown"]
    with Book.open(with_own) as book:
        rows = list(csv.DictReader(io.StringIO(registry_csv(book.registry, {"Vf": 3}))))
    assert [r["key"] for r in rows] == [*NUMBERS, "Vf"]


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
        text = strip_html(key, np.asarray(values, dtype=float), dark=False, registry=at_birth())
        assert text.count("<img") == 1 and "nan" not in text.split("base64")[0]
