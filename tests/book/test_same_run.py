"""The same run or reading said twice: with a time it is known, without one it is another."""

import pytest

from labbook import Book
from labbook.book.asking import Question
from labbook.book.queries import count


@pytest.fixture
def book(tmp_path):
    with Book.new(tmp_path / "same.db") as opened:
        opened.stock("fluid", code="water-a", kind="water", by="wren")
        opened.stock("swimmer", code="fin-1", form="undulating", L_body="100.0 mm", by="wren")
        yield opened


CELLS = dict(swimmer="fin-1", fluid="water-a", f="2.0 Hz", T="21.0 degC", U="80(2) mm/s", by="wren")


def test_a_run_with_its_time_is_logged_once(book):
    first = book.record(at="2026-11-29T12:00", **CELLS)
    assert book.record(at="2026-11-29T12:00", **CELLS) == first
    assert book.record(at="2026-11-29T12:00", **{**CELLS, "f": "2.1 Hz"}) != first
    assert book.ask(count, Question()) == 2


def test_a_run_without_a_time_is_never_a_duplicate(book):
    assert book.record(**CELLS) != book.record(**CELLS)


def test_a_logged_run_that_comes_again_in_a_sheet_is_known(book, tmp_path):
    book.record(at="2026-11-29T12:00", **CELLS)
    sheet = tmp_path / "runs.csv"
    sheet.write_text("swimmer,fluid,at,f [Hz],T [degC],U [mm/s]\nfin-1,water-a,2026-11-29T12:00,2.0,21.0,80(2)\n")
    assert book.load(sheet, by="wren").added["run"] == 0


def test_a_dated_reading_is_added_once_and_an_undated_one_each_time(book):
    cells = dict(of="water-a", key="mu", value="0.98(1) mPa.s", T="21.0 degC", by="wren")
    first = book.stock("reading", on="2026-11-29", **cells)
    assert book.stock("reading", on="2026-11-29", **cells) == first
    assert book.stock("reading", **cells) != book.stock("reading", **cells)


def test_without_a_temperature_the_speed_is_compared_with_all_runs(book):
    for _ in range(3):
        book.record(**CELLS)
    found = book.preview(**{**CELLS, "T": "", "U": "80(2) m/s", "by": ""})
    assert any(column == "U" for column, _ in found.warned)
