"""One walk as a bench user: log a run, find it by regime, see it on the trend, open it, amend it, read its ledger."""

import os
import re
import shutil

import pytest
from playwright.sync_api import expect
from steps import settled

from labbook import Book
from labbook.book.asking import Question

TRIAL = {
    "f frequency": "0.110 Hz", "θ₀ angle": "12.0 deg", "B flux": "4.20 mT", "T fluid": "22.4 degC",
    "U speed": "0.0081(4) mm/s", "A_tip": "5.8(2) mm",
}  # fmt: skip


@pytest.fixture(scope="module")
def book(demo_book, tmp_path_factory):
    """A demo book of this module's own."""
    path = tmp_path_factory.mktemp("walk") / "bench.db"
    shutil.copy(demo_book, path)
    return path


def typed(page, cells: dict[str, str]) -> None:
    for label, text in cells.items():
        field = page.get_by_label(label, exact=False).first
        field.fill(text)
        field.press("Tab")
        expect(field).to_have_value(text)


def newest_code(path) -> str:
    with Book.open(path) as opened:
        return opened.frame(Question(), keys=("Sp",), texts=("code",), newest=1)["code"].iloc[0]


def test_log_find_see_open_amend(page, served, book, shot):
    address = served(book)
    tab = page(width=1024, height=768, touch=True)
    tab.goto(address)
    typed(tab, TRIAL)
    settled(tab)
    expect(tab.get_by_text("working tail").first).to_be_visible()
    shot(tab, "bench-typed-1024-light")
    tab.get_by_role("button", name="Log trial").click()
    expect(tab.get_by_text(re.compile(r"R-\d+ is logged"))).to_be_visible(timeout=20_000)
    code = newest_code(book)
    expect(tab.get_by_label("U speed", exact=False).first).to_have_value("")

    tab.get_by_role("link", name="Runs").click()
    settled(tab)
    tab.get_by_role("button", name=re.compile(r"working tail")).first.click()
    tab.wait_for_url(re.compile("regime=working"), timeout=20_000)
    cell = tab.locator("[role=gridcell]", has_text=code)
    expect(cell.first).to_be_attached(timeout=20_000)
    shot(tab, "runs-regime-1024-light")
    link = tab.url

    tab.get_by_role("link", name="Trends").click()
    expect(tab.get_by_text(re.compile(r"runs drawn")).first).to_be_visible(timeout=20_000)
    tab.goto(f"{address}/trends?run={code}")
    expect(tab.get_by_text("Open the whole sheet")).to_be_visible(timeout=20_000)
    expect(tab.get_by_text(code).first).to_be_visible()
    shot(tab, "trends-1024-light")

    other = page(width=1600, height=1000, scheme="dark")
    other.goto(f"{link}&run={code}")
    expect(other.get_by_text("0.0081(4) mm/s").first).to_be_visible(timeout=20_000)
    shot(other, "record-1600-dark")
    other.get_by_role("button", name="Amend", exact=True).click()
    field = other.get_by_label("New text; empty clears it")
    expect(field).to_have_value("0.110 Hz", timeout=20_000)
    field.fill("1.0 kg")
    why = other.get_by_label("Why", exact=True)
    why.fill("display read again")
    why.press("Tab")
    settled(other)
    other.get_by_role("button", name=f"Amend {code}").click()
    expect(other.get_by_text("kg is a mass").first).to_be_visible(timeout=20_000)
    expect(field).to_have_value("1.0 kg")
    field.fill("0.120 Hz")
    field.press("Tab")
    settled(other)
    other.get_by_role("button", name=f"Amend {code}").click()
    expect(other.get_by_text(f"{code} is amended").first).to_be_visible(timeout=20_000)

    other.goto(f"{address}/ledger?code={code}")
    expect(other.get_by_text("display read again").first).to_be_visible(timeout=20_000)
    expect(other.get_by_text("0.120 Hz").first).to_be_visible()
    shot(other, "ledger-1600-dark")
    for one in (tab, other):
        assert one.problems == []
    with Book.open(book) as opened:
        sheet = opened.sheet(code)
        assert opened.check() == []
    assert sheet.typed["f"][0] == "0.120 Hz"
    assert sheet.texts["by"] == "wren"


PAGES = {"": "Log trial", "runs": "runs, newest first", "trends": "runs drawn", "shelf": "Add", "numbers": "Sp",
         "ledger": "thermometer read again from the photograph"}  # fmt: skip


@pytest.mark.parametrize("size", [(1024, 768), (1600, 1000)])
@pytest.mark.parametrize("scheme", ["light", "dark"])
def test_every_page_stands_in_both_themes_and_sizes(page, served, book, shot, size, scheme):
    address = served(book)
    tab = page(width=size[0], height=size[1], scheme=scheme)
    for path, word in PAGES.items():
        tab.goto(f"{address}/{path}")
        expect(tab.get_by_text(re.compile(word)).first).to_be_visible(timeout=30_000)
        settled(tab)
        expect(tab.get_by_test_id("stException")).to_have_count(0)
        if os.environ.get("LABBOOK_SHOTS"):
            tab.wait_for_timeout(2500)
        shot(tab, f"{path or 'bench'}-{size[0]}-{scheme}")
        wide = tab.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth")
        assert wide <= 0, f"{path} scrolls sideways by {wide} px"
    assert tab.problems == []


def test_an_empty_book_teaches(page, served, tmp_path, shot):
    path = tmp_path / "empty.db"
    Book.new(path).close()
    tab = page()
    tab.goto(served(path))
    expect(tab.get_by_text(re.compile("three things to do first"))).to_be_visible(timeout=20_000)
    tab.get_by_role("button", name="To the shelf").click()
    expect(tab.get_by_text(re.compile("Add")).first).to_be_visible(timeout=20_000)
    assert tab.problems == []
