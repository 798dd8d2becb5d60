"""One walk as a bench user: log a run, find it by regime, see it on the trend, open it, amend it, read its ledger."""

import re
import shutil

import pytest
from playwright.sync_api import expect

from labbook import Book

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


def settled(page) -> None:
    """Wait until the server's script has run."""
    page.wait_for_timeout(250)
    expect(page.get_by_test_id("stStatusWidget")).to_have_count(0, timeout=15_000)


def newest_code(path) -> str:
    with Book.open(path) as opened:
        return opened.frame_of_newest() if hasattr(opened, "frame_of_newest") else _newest(opened)


def _newest(opened: Book) -> str:
    from labbook.book.asking import Question

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
    expect(tab.get_by_text(re.compile(r"R-\d+ is logged"))).to_be_visible(timeout=15_000)
    code = newest_code(book)
    expect(tab.get_by_label("U speed", exact=False).first).to_have_value("")

    tab.get_by_role("link", name="Runs").click()
    settled(tab)
    tab.get_by_role("button", name=re.compile(r"working tail")).first.click()
    settled(tab)
    assert "regime=working+tail" in tab.url or "regime=working%20tail" in tab.url
    expect(tab.get_by_role("gridcell", name=code, exact=True)).to_be_attached(timeout=15_000)
    shot(tab, "runs-regime-1024-light")
    link = tab.url

    tab.get_by_role("link", name="Trends").click()
    expect(tab.get_by_text(re.compile(r"runs drawn")).first).to_be_visible(timeout=15_000)
    shot(tab, "trends-1024-light")

    other = page(width=1600, height=1000, scheme="dark")
    other.goto(f"{link}&run={code}")
    expect(other.get_by_text("0.0081(4) mm/s").first).to_be_visible(timeout=20_000)
    shot(other, "record-1600-dark")
    other.get_by_role("button", name="Amend", exact=True).click()
    expect(other.get_by_text("New text; empty clears it")).to_be_visible(timeout=15_000)
    shot(other, "amend-1600-dark")
    for one in (tab, other):
        assert one.problems == []
