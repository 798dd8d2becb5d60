"""Numbers, regimes: the list agrees with the runs; the editor tells what a band would do, and keeps it."""

import base64
import html
import re

import numpy as np
import pytest

from labbook import Book
from labbook.app.numbers_strip import coverage_html, hues, strip_html
from labbook.registry.group import at_birth
from labbook.registry.regime_text import read_regime
from labbook.registry.regimes import COLOURS, REGIMES

PLACE = "regimes:0:"
WHY = "to see what lies there"


@pytest.fixture(scope="module")
def kept(demo_book):
    with Book.open(demo_book) as book:
        return book.runs(columns=("Sp", "Re_omega", "St"))


@pytest.fixture
def page(open_page, demo_copy):
    """The regimes of a copy of the demo book; `book` is its path."""
    opened = open_page(demo_copy, "numbers", part="regimes")
    opened.book = demo_copy
    return opened


def typed(page, place=PLACE, **cells):
    for field, text in cells.items():
        page.at.text_input(key=f"{place}:{field}").set_value(text)
    return page.run()


def words(page):
    return html.unescape(page.words())


def registry(path):
    with Book.open(path) as book:
        return book.registry


# --- the list


def test_each_regime_stands_with_band_source_version_and_runs(page, kept):
    said = words(page)
    links = {q.proto.query_string: q.proto.label for q in page.at.get("page_link")}
    for row in REGIMES.values():
        n = int(row.holds(kept[row.number].to_numpy()).sum())
        assert row.source in said and "version 1, came with labbook" in said
        assert links[f"regime={row.name.replace(' ', '+')}"] == f"{n} run{'s' if n != 1 else ''}"
    assert "0.2 ≤ St ≤ 0.4" in said and "Re_ω < 0.1" in said
    assert "always read in the group's house dialect" in said


def test_every_row_has_its_swatch_and_its_name_beside_it(page):
    for name, hue in hues([r for r in REGIMES.values() if r.numbers == ("Sp",)]).items():
        assert re.search(rf"background:{hue};[^>]*></span><b>{name}</b>", page.words())


def test_coverage_is_said_in_words(page):
    # at birth the bands of Re_omega and Sp meet without gap or overlap; cruising stands alone (design, 2)
    said = words(page)
    assert "Together they cover every Sp, without overlap or gap." in said
    assert "0.2 ≤ St ≤ 0.4 alone is covered." in said


def test_a_gap_and_an_overlap_are_said(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        for name, band in (("floppy tail", "Sp > 5"), ("stiff tail", "Sp <= 2")):
            book.set_regime(read_regime({"name": name, "band": band, "source": "own"}), why=WHY, by="wren")
    said = words(open_page(demo_copy, "numbers", part="regimes"))
    assert "No regime covers 4 < Sp ≤ 5." in said
    assert "'stiff tail' and 'working tail' both cover 1 ≤ Sp ≤ 2." in said


def test_a_regime_on_two_numbers_has_a_place_of_its_own(open_page, demo_copy, kept):
    with Book.open(demo_copy) as book:
        cells = {"name": "slow", "band": "Sp < 1", "second": "Re_omega < 0.1", "source": "own"}
        book.set_regime(read_regime(cells), why=WHY, by="wren")
    page = open_page(demo_copy, "numbers", part="regimes")
    n = int(((kept["Sp"] < 1) & (kept["Re_omega"] < 0.1)).sum())
    assert "on two numbers" in words(page) and "Sp < 1 and Re_ω < 0.1" in words(page)
    assert page.links().get(f"{n} run{'s' if n != 1 else ''}") == "regime=slow"


# --- the editor


def test_a_band_is_tried_as_its_field_is_left(page, kept):
    typed(page, name="soft tail", band="3 <= Sp < 5")
    said = words(page)
    n = int(((kept["Sp"] >= 3) & (kept["Sp"] < 5)).sum())
    assert n > 0 and f"{n} of {len(kept)} kept runs would lie in it." in said
    assert "sperm number Sp from 3 (included) to 5 (left out)" in said
    assert "'working tail' and 'soft tail' both cover 3 ≤ Sp ≤ 4." in said
    assert registry(page.book).regimes == REGIMES  # nothing is kept yet


def test_a_second_band_is_tried_with_the_first(page, kept):
    strips = page.words().count("<img")
    typed(page, band="Sp < 1", second="Re_omega < 0.1")
    n = int(((kept["Sp"] < 1) & (kept["Re_omega"] < 0.1)).sum())
    assert f"{n} of {len(kept)} kept runs would lie in it." in words(page)
    assert page.words().count("<img") == strips + 2


def test_a_new_regime_is_kept_with_its_colour(page, kept):
    page.at.button_group(key=f"regimes-colour:{PLACE}").set_value("sky")
    typed(page, name="soft tail", band="3 ≤ Sp < 5", source="own observation", why=WHY)
    page.press("Add the regime")
    n = int(((kept["Sp"] >= 3) & (kept["Sp"] < 5)).sum())
    row = registry(page.book).regimes["soft tail"]
    assert (row.words, row.colour, row.source) == ("3 <= Sp < 5", "sky", "own observation")
    assert f"soft tail is 3 ≤ Sp < 5: 0 kept runs before, {n} now" in page.at.success[0].value
    assert page.at.query_params["edit"] == "soft tail"
    assert "sky; version 1, wren" in words(page)


def test_a_regime_is_changed_and_its_versions_are_told(open_page, demo_copy, kept):
    page = open_page(demo_copy, "numbers", part="regimes", edit="floppy tail")
    assert page.at.text_input(key="regimes:0:floppy tail:band").value == "Sp > 4"
    typed(page, "regimes:0:floppy tail", band="Sp > 5")
    before, after = (int((kept["Sp"] > v).sum()) for v in (4, 5))
    assert before != after
    assert (
        f"{after} of {len(kept)} kept runs would lie in it; {before} lie in floppy tail as it stands."
        in words(page)
    )
    assert "No regime covers 4 < Sp ≤ 5." in words(page)
    typed(page, "regimes:0:floppy tail", why=WHY)
    page.press("Change the regime")
    assert registry(demo_copy).regimes["floppy tail"].words == "Sp > 5"
    assert f"{before} kept runs before, {after} now" in page.at.success[0].value
    assert "version 2, wren" in words(page) and f"<td>{WHY}</td>" in words(page)
    # version 1 still stands below it
    assert "<td>1</td><td>with labbook</td><td>Sp > 4</td>" in words(page)


def test_changing_by_touch_from_the_list(page):
    page.at.button(key="regimes:change:cruising").click()
    page.run()
    assert page.at.text_input(key="regimes:0:cruising:band").value == "0.2 <= St <= 0.4"


@pytest.mark.parametrize(("cells", "said"), [
    ({"band": "Sp"}, "band 'Sp': has no sign"), ({"band": "4 < Sq"}, "'Sq' is no number of the registry"),
    ({"band": "Sp > 4", "second": "Sp < 9"}, "second 'Sp < 9': stands on Sp"),
    ({"name": "Cruising"}, "the regime 'cruising' stands already"), ({"band": "5 < Sp < 2"}, "is empty"),
])  # fmt: skip
def test_what_cannot_be_read_is_said_at_once_and_stays_typed(page, cells, said):
    typed(page, **cells)
    assert any(said in line for line in page.said())
    for field, text in cells.items():
        assert page.at.text_input(key=f"{PLACE}:{field}").value == text


def test_everything_missing_is_said_together_and_nothing_is_lost(page):
    typed(page, band="4 < Sp <= 10")
    assert page.said() == []  # an empty field is not wrong before the attempt
    page.press("Add the regime")
    assert len(page.said()) == 3
    assert all(any(f">{f}: is missing" in line for line in page.said()) for f in ("name", "source", "why"))
    assert page.at.text_input(key=f"{PLACE}:band").value == "4 < Sp <= 10"
    assert registry(page.book).regimes == REGIMES
    typed(page, name="x", source="own", why=WHY)
    assert page.said() == []
    page.press("Add the regime")
    assert registry(page.book).regimes["x"].words == "4 < Sp <= 10"


def test_the_same_again_is_refused(open_page, demo_copy):
    page = open_page(demo_copy, "numbers", part="regimes", edit="cruising")
    typed(page, "regimes:0:cruising", why=WHY)
    page.press("Change the regime")
    assert "nothing would change" in page.said()[0]


def test_a_regime_is_withdrawn_with_a_reason(open_page, demo_copy):
    page = open_page(demo_copy, "numbers", part="regimes", edit="cruising")
    page.press("Withdraw it")
    assert "why: is missing" in page.said()[0] and "cruising" in registry(demo_copy).regimes
    typed(page, "regimes:0:cruising", why="no fish here")
    page.press("Withdraw it")
    assert "cruising" not in registry(demo_copy).regimes
    assert "Withdrawn: cruising, by wren" in words(page) and "no fish here" in words(page)
    assert "cruising is withdrawn" in page.at.success[0].value


def test_an_unknown_regime_in_the_address_is_said(open_page, demo_copy):
    page = open_page(demo_copy, "numbers", part="regimes", edit="turbulent")
    assert "'turbulent'" in page.said()[0] and page.at.text_input(key=f"{PLACE}:name").value == ""


def test_an_empty_book_has_its_regimes_too(open_page, tmp_path):
    Book.new(tmp_path / "empty.db").close()
    page = open_page(tmp_path / "empty.db", "numbers", part="regimes")
    typed(page, band="Sp > 4")
    assert "0 of 0 kept runs would lie in it." in words(page)


# --- the strip


def drawing(text):
    return base64.b64decode(re.search(r"base64,([^\"]+)", text)[1]).decode()


def drawn(bands, chosen=""):
    rows = [read_regime({"name": n, "band": b, "source": "own", "colour": c})
            for (n, b), c in zip(bands.items(), COLOURS, strict=False)]  # fmt: skip
    return coverage_html("Sp", np.array([2.0]), False, rows, chosen)


def test_the_strip_reaches_out_to_every_limit():
    # a limit nine decades off the runs is no use on the reference's strip, and needed here
    assert "10⁹" in drawn({"a": "1 < Sp < 1e9"}) and "1" in drawn({"a": "1e-9 < Sp < 1"})


def test_hatching_and_dashes_mark_what_is_covered_twice_or_not():
    apart, over, meeting = (
        drawing(drawn({"a": "1 < Sp < 3", "b": b})) for b in ("5 < Sp < 8", "2 < Sp < 8", "3 <= Sp < 8")
    )
    assert "dasharray" in apart and "dasharray" not in over + meeting
    assert (
        over.count("<path") == 3 and meeting.count("<path") == 1
    )  # hatching and its outline beside the ticks
    shared = drawing(drawn({"a": "1 < Sp <= 3", "b": "3 <= Sp < 8"}))
    assert shared.count("<path") == 3  # one point covered twice is seen too


def test_the_chosen_band_is_outlined_and_named():
    rows = {"a": "1 < Sp < 3", "b": "2 < Sp < 8"}
    assert drawing(drawn(rows, "b")).count("<path") == drawing(drawn(rows)).count("<path") + 1
    assert ">b</span>" in drawn(rows, "b")


@pytest.mark.parametrize(
    "band", ["Sp < -1", "-2 < Sp <= 0", "-1 < Sp < 1", "Sp > 0", "Sp > 1e300", "Sp < 1e-300"]
)
@pytest.mark.parametrize("values", [[], [float("nan"), -3.0, 0.0], np.geomspace(1e-3, 1e3, 50)])
def test_any_band_can_be_drawn(band, values):
    rows = [read_regime({"name": "a", "band": band, "source": "own"}), *at_birth().regimes.values()]
    assert coverage_html("Sp", np.asarray(values), True, rows, "a").count("<img") == 1
    assert strip_html("Sp", np.asarray(values), True, at_birth()).count("<img") == 1
