"""Numbers, published: the form of a point, the series with their citations, withdrawing them, links."""

import html
import math
import re

import pytest

from labbook import Book
from labbook.book.asking import Question
from labbook.book.published_points import all_series, points, series_table
from labbook.book.queries import count, ledger_lines
from labbook.registry.group import at_birth

# invented; printed with f where the house has omega
TYPED = {"series": "pond-2019", "citation": "Pond & Weir, Invented Letters 3, 14 (2019)", "x_value": "2.00(10)",
         "x_dialect": "rate:f", "y_value": "0.0120(6)"}  # fmt: skip
SPENT = ("x_value", "y_value", "note")


@pytest.fixture
def page(open_page, demo_copy):
    return open_page(demo_copy, "numbers", part="published")


def key(column, turn=0):
    return f"point:{turn if column in SPENT else 0}:{column}"


def typed(page, turn=0, **cells):
    for column, text in cells.items():
        page.at.text_input(key=key(column, turn)).set_value(text)
    return page.run()


def value(page, column, turn=0):
    return page.at.text_input(key=key(column, turn)).value


def ask(path, *question):
    with Book.open(path) as book:
        return book.ask(*question)


def words(page):
    return html.unescape(page.words())


def test_the_demos_series_stand_with_citation_and_points(page, demo_copy):
    said = words(page)
    for row in ask(demo_copy, series_table):
        assert f"<b>{row['series']}</b>" in said and row["citation"] in said
        assert f"{row['y']} against {row['x']}, {row['points']} points" in said
    # 1.39 with f is 1.39 (2 pi)^(1/4) = 2.2007 with omega, 0.083/(2 pi) = 0.01321; u 0.03 x 1.583 and 0.006/(2 pi)
    cells = re.findall(r"<td[^>]*>([^<]*)</td>", said)
    at = cells.index("1.39(3)")
    assert cells[at - 2 : at + 3] == [
        "2.20(5)",
        "0.0132(10)",
        "1.39(3)",
        "0.083(6)",
        "read off a printed figure",
    ]
    assert "Dialect of the print: Sp rate:f; U_scaled rate:f." in said
    assert "Sp coefficient:spheroid_asymptotic; U_scaled labbook's own." in said
    assert "House dialect of Sp: length: L_tail; rate: omega" in said and "nan" not in cells


def test_the_table_follows_the_groups_house_dialect(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        book.adopt_dialect("Sp", {"rate": "f"}, why="as in our papers", by="wren")
    said = words(open_page(demo_copy, "numbers", part="published"))
    cells = re.findall(r"<td[^>]*>([^<]*)</td>", said)
    at = cells.index("1.39(3)")
    assert cells[at : at + 3] == ["1.39(3)", "0.0132(10)", "1.39(3)"], "house and print are one now"
    assert "House dialect of Sp: " in said and "rate: f" in said


def test_each_pair_links_to_its_plot_and_sheets_to_the_shelf(page):
    queries = [link.proto.query_string for link in page.at.get("page_link")]
    assert queries.count("x=Sp&y=U_scaled") == 2 and queries.count("add=sheet") == 1


def test_a_point_is_added_and_its_series_goes_on(page, demo_copy):
    typed(page, **TYPED).press("Add the point")
    assert page.said() == [] and "A point of pond-2019 is added." in page.at.success[0].value
    mine = ask(demo_copy, points, "Sp", "U_scaled", None, "pond-2019").iloc[0]
    assert mine["Sp"] == pytest.approx(2.0 * (2 * math.pi) ** 0.25, rel=1e-12)
    assert mine["citation"] == TYPED["citation"]
    # what belongs to the series stays, what belongs to the point is asked for again
    assert [value(page, c, 1) for c in SPENT] == ["", "", ""]
    assert [value(page, c) for c in ("series", "citation", "x_dialect")] == [
        TYPED[c] for c in ("series", "citation", "x_dialect")
    ]
    typed(page, 1, x_value="3.00(10)", y_value="0.0100(5)").press("Add the point")
    assert len(ask(demo_copy, points, "Sp", "U_scaled", None, "pond-2019")) == 2
    assert ask(demo_copy, count, Question(state="all")) == 920
    assert "U_scaled against Sp, 2 points" in words(page)


def test_the_same_point_again_is_told_apart(page, demo_copy):
    typed(page, **TYPED).press("Add the point")
    typed(page, 1, x_value=TYPED["x_value"], y_value=TYPED["y_value"]).press("Add the point")
    assert "has this point already" in page.at.success[0].value
    assert len(ask(demo_copy, points, "Sp", "U_scaled", None, "pond-2019")) == 1


@pytest.mark.parametrize(
    ("change", "said"),
    [
        ({"series": ""}, "series: is missing"),
        ({"citation": ""}, "citation: is missing"),
        ({"x_value": ""}, "x_value: is missing"),
        ({"y_value": "0.01 m/s"}, "y_value '0.01 m/s'"),
        ({"x_dialect": "rate:Hz"}, "x_dialect 'Hz': is not an option; one of omega, f"),
        ({"x_dialect": "f"}, "x_dialect 'Sp=f': cannot be read"),
        ({"x_dialect": "house"}, "x_dialect 'house': is the group's choice"),
        ({"L_tail": "24 kg"}, "L_tail '24 kg'"),
        ({"series": "marsh-2014"}, "one series, one citation"),
    ],
)  # fmt: skip
def test_a_bad_cell_is_refused_at_its_field_and_keeps_what_was_typed(page, demo_copy, change, said):
    before = ask(demo_copy, series_table)
    typed(page, **TYPED | change).press("Add the point")
    (sentence,) = page.said()
    assert said in sentence
    for column, text in (TYPED | change).items():
        assert value(page, column) == text
    assert ask(demo_copy, series_table) == before
    # typed anew, the sentence goes, and so does what stood in its way
    typed(page, **{c: TYPED.get(c, "") for c in change})
    assert page.said() == []
    page.press("Add the point")
    assert "pond-2019 is added" in page.at.success[0].value


def test_the_refusal_stands_right_below_its_field(page):
    typed(page, **TYPED | {"y_value": "much"}).press("Add the point")
    below = [b.proto.body for b in page.at.get("html")]
    at = next(i for i, text in enumerate(below) if "y_value" in text and "lb-refused" in text)
    assert "U_scaled is read" in below[at + 1], "between the fields of y and the formula of y"


def test_two_numbers_must_differ_and_one_without_dialects_has_none(page, demo_copy):
    page.at.selectbox(key=key("y")).set_value("Sp").run()
    typed(page, **TYPED).press("Add the point")
    assert "is the number of x already" in page.said()[0]
    page.at.selectbox(key=key("y")).set_value("wall").run()
    assert page.at.text_input(key=key("y_dialect")).disabled and page.said() == []
    page.press("Add the point")
    assert ask(demo_copy, series_table)[1]["y"] == "wall"


def test_a_dialect_is_read_back_as_its_formula(page):
    first = page.at.latex[0].value
    assert "\\omega" in first and "1/4" in first
    typed(page, x_dialect="rate:f,power:1")
    assert "\\omega" not in page.at.latex[0].value and "1/4" not in page.at.latex[0].value
    assert "Sp is read with ζ_n of cylinder_finite as" in words(page)
    typed(page, x_dialect="coefficient:mu")
    assert "Sp is read as" in words(page) and "\\mu" in page.at.latex[0].value
    # a swimmer's lengths stand between this print and the house
    lengths = next(e for e in page.at.expander if e.label == "Lengths of its swimmer")
    assert lengths.proto.expanded and "Without them Sp cannot be restated." in words(page)


def test_lengths_are_stored_and_used(page, demo_copy):
    typed(page, **TYPED | {"x_dialect": "length:L_body", "L_body": "30 mm", "L_tail": "24 mm"})
    page.press("Add the point")
    mine = ask(demo_copy, points, "Sp", "U_scaled", None, "pond-2019").iloc[0]
    assert mine["Sp"] == pytest.approx(2.0 * 24 / 30, rel=1e-12)


def test_what_is_typed_outlives_a_look_at_another_part(page):
    typed(page, **TYPED)
    page.go(part="quantities")
    page.go(part="published")
    assert {c: value(page, c) for c in TYPED} == TYPED


def test_a_series_is_withdrawn_with_a_reason(page, demo_copy):
    page.press("Withdraw tarn-2017")
    assert "why: is missing" in page.said()[0] and "tarn-2017" in ask(demo_copy, all_series)
    page.fill("withdraw:tarn-2017", why="the axes were misprinted").press("Withdraw tarn-2017")
    assert "tarn-2017 is withdrawn" in page.at.success[0].value and page.said() == []
    assert list(ask(demo_copy, all_series)) == ["marsh-2014"]
    assert "<b>tarn-2017</b>" not in words(page)
    line = ask(demo_copy, ledger_lines).iloc[0]
    assert (line["act"], line["subject"], line["by"]) == ("void", "tarn-2017", "wren")


def test_points_without_a_value_in_the_house_dialect_are_told(page, demo_copy, open_page):
    typed(page, **TYPED | {"x_dialect": "length:L_body"}).press("Add the point")
    assert "1 point not in the table: no Sp in this dialect (needs L_tail)." in words(page)
    assert words(page).count("not in the table") == 1, "under its own series alone"


def test_a_series_of_two_pairs_is_one_series(demo_copy, open_page):
    with Book.open(demo_copy) as book:
        book.stock("published", **TYPED, x="Sp", y="U_scaled", by="wren")
        book.stock("published", **TYPED, x="Sp", y="stride", by="wren")
    said = words(open_page(demo_copy, "numbers", part="published"))
    assert said.count("<b>pond-2019</b>") == 1
    assert "U_scaled against Sp, 1 point<" in said and "stride against Sp, 1 point<" in said


def test_an_empty_book_says_what_to_do(tmp_path, open_page):
    Book.new(tmp_path / "empty.db").close()
    page = open_page(tmp_path / "empty.db", "numbers", part="published")
    assert "No published point yet" in words(page)
    assert list(at_birth().numbers) == page.at.selectbox(key=key("x")).options
