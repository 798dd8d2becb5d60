"""Ledger: newest first, filters in the address, pages of lines, before and after, the chain's state."""

import sqlite3
from contextlib import closing

import pytest

from labbook import Book
from labbook.book.chain import how_many, ranges
from labbook.book.ledger_pages import ledger_page


def test_lines_stand_newest_first_with_before_after_and_why(open_page, demo_book):
    page = open_page(demo_book, "ledger")
    words = page.words()
    # the demo's own three amendments, the last of them the thermometer's
    assert (
        words.index("thermometer read again")
        < words.index("belongs to the recount")
        < words.index("was forgotten")
    )
    assert "21.9 degC" in words and "<del>" in words
    assert "the chain holds" in words


def test_a_filter_is_an_address(open_page, demo_book):
    page = open_page(demo_book, "ledger", act="load")
    assert "seeds_demo" in page.words() and "belongs to the recount" not in page.words()
    page.go(by="sable")
    assert "belongs to the recount" not in page.words()
    page.go(by="nobody", act="load")
    assert "'nobody'" in page.said()[0] and "seeds_demo" in page.words()


def test_a_choice_goes_into_the_address(open_page, demo_book):
    page = open_page(demo_book, "ledger", page="3")
    page.at.selectbox(key="ledger:act").set_value("load")
    page.run()
    assert page.at.query_params["act"] == "load" and "page" not in page.at.query_params
    page.press("All")
    assert "act" not in page.at.query_params


def test_a_code_finds_what_touched_the_run(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        code = book.runs(swimmer="reed-03", columns=("f",))["code"].iloc[0]
        book.stock("swimmer", code="reed-03", d="1.00(1) mm", why="measured again", by="knot")
    page = open_page(demo_copy, "ledger", code=code)
    assert "measured again" in page.words() and "seeds_demo" in page.words()
    assert "belongs to the recount" not in page.words()
    page.go(code="R-9999")
    assert "No line of the ledger fits" in page.words()


def test_a_long_ledger_has_pages_and_loses_no_line(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        before = book.ask(ledger_page, page=1)[1]
        for n in range(60):
            book.stock("material", code=f"m-{n}", by="knot")
        total, seen, number = before + 60, [], 0
        while len(seen) < total:
            number += 1
            lines, counted = book.ask(ledger_page, page=number)
            assert counted == total and lines
            seen += [line.id for line in lines]
    assert len(seen) == total and seen == sorted(seen, reverse=True)
    page = open_page(demo_copy, "ledger")
    assert f"lines 1 to 25 of {total}" in page.words()
    page.press("Older")
    assert page.at.query_params["page"] == "2" and f"lines 26 to 50 of {total}" in page.words()


def test_a_subject_is_a_link_to_it(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        book.stock("reading", of="steel-1", key="E", value="205(3) GPa", on="2026-11-01", by="knot")
        book.retire("rig", "tank-1", why="sold", by="knot")
    links = open_page(demo_copy, "ledger").links()
    assert links["retire rig **tank-1**"] == "kind=rig&item=tank-1"
    assert "kind=material&item=steel-1" in links.values()
    assert any(q.startswith("run=R-") for q in links.values())


def test_a_changed_line_is_named(open_page, demo_copy):
    with closing(sqlite3.connect(demo_copy)) as raw:
        for (name,) in raw.execute("SELECT name FROM sqlite_master WHERE type = 'trigger'").fetchall():
            raw.execute(f"DROP TRIGGER {name}")
        raw.execute("UPDATE ledger SET why = 'never mind' WHERE id = 3")
        raw.commit()
    page = open_page(demo_copy, "ledger")
    assert "line 3 does not follow" in page.said()[0]


def test_an_empty_ledger_teaches(open_page, tmp_path):
    Book.new(tmp_path / "empty.db").close()
    assert "leaves one line here" in "".join(
        str(e.value) for e in open_page(tmp_path / "empty.db", "ledger").at.markdown
    )


@pytest.mark.parametrize(
    "codes", [[], ["R-0001"], ["R-0001", "R-0002", "R-0003", "R-0007"], ["A", "B-2", "B-3"]]
)
def test_ranges_are_counted_as_they_were_drawn_together(codes):
    assert how_many(ranges(codes)) == len(codes)


def test_texts_from_the_book_are_escaped(open_page, demo_copy):
    with Book.open(demo_copy) as book:
        book.stock("material", code="<u>m</u>", note="<img src=x>", by="<b>me</b>")
    words = open_page(demo_copy, "ledger").words()
    assert "&lt;img src=x&gt;" in words and "<img" not in words and "<b>me" not in words
