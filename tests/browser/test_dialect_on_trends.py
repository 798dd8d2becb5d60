"""The Trends axis switched to another dialect: the label and the points follow, and the address carries it."""

import re
from urllib.parse import parse_qs, urlsplit

import numpy as np
import pytest
from playwright.sync_api import expect

from labbook import Book
from labbook.book.asking import Question

MARKS = """() => [...document.querySelectorAll('.st-key-lb-trend-chart path[aria-roledescription="point"]')].map(
  path => [path.getAttribute('aria-label'), path.getAttribute('transform')])"""
TITLE = "() => [...document.querySelectorAll('.st-key-lb-trend-chart text')].map(t => t.textContent).join(' ')"


def marks(tab) -> dict[str, tuple[float, str]]:
    """Run -> (pixels along x, the x that its tooltip writes)."""
    found = {}
    for label, place in tab.evaluate(MARKS):
        code = re.search(r"run: (R-\d+)", label)
        if code:
            x = re.search(r"translate\(([-\d.]+)", place)
            found[code[1]] = (float(x[1]), re.search(r"; Sp[^:]*: ([^;]*)", label)[1])
    return found


def titled(tab, words: str) -> None:
    """Wait until an axis says some words."""
    tab.wait_for_function(f"words => ({TITLE})().includes(words)", arg=words, timeout=30_000)
    tab.wait_for_timeout(300)


def off_the_line(found: dict, expected: dict[str, float]) -> float:
    """The largest distance in pixels between where the marks are and where a log axis puts the expected values."""
    codes = sorted(found)
    pixels, places = np.array([found[c][0] for c in codes]), np.log([expected[c] for c in codes])
    return float(np.abs(pixels - np.polyval(np.polyfit(places, pixels, 1), places)).max())


@pytest.fixture
def values(demo_book):
    """(Sp, Sp with mu for zeta_n) by run: physics.md section 9, (mu/zeta_n)^(1/4) times."""
    with Book.open(demo_book) as book:
        runs = book.frame(Question(), keys=("Sp", "mu", "zeta_n"), texts=("code",), spread=False).dropna()
    spoken = runs["Sp"] * (runs["mu"] / runs["zeta_n"]) ** 0.25
    return dict(zip(runs["code"], runs["Sp"], strict=True)), dict(zip(runs["code"], spoken, strict=True))


def test_a_dialect_moves_label_and_points_and_stays_in_the_address(page, served, demo_book, shot, values):
    house, spoken = values
    address = served(demo_book)
    tab = page(width=1024, height=768)
    tab.goto(f"{address}/trends")
    titled(tab, "Sp = L_tail (ζ_n ω/EI)^(1/4), house dialect")
    before = marks(tab)
    assert len(before) > 500 and off_the_line(before, house) < 0.5  # half a pixel

    tab.get_by_label("dialect of Sp").click()
    tab.get_by_role("option", name="coefficient mu").click()
    titled(tab, "Sp = L_tail (μ ω/EI)^(1/4), dialect coefficient mu")
    after = marks(tab)
    assert after.keys() == before.keys()
    assert off_the_line(after, spoken) < 0.5 < off_the_line(after, house)
    for code, (_, text) in after.items():  # as written, to the digits that it has: within 5 %
        assert float(text.split("(")[0]) == pytest.approx(spoken[code], rel=0.05)
    expect(tab.get_by_text("regimes and ranges are read in the house dialect")).to_be_visible()
    assert "working tail" not in tab.evaluate(TITLE)
    shot(tab, "trends-dialect-1024-light")
    assert parse_qs(urlsplit(tab.url).query)["dialect"] == ["Sp=coefficient:mu"]

    tab.reload()
    titled(tab, "dialect coefficient mu")
    again = marks(tab)
    assert again.keys() == after.keys()
    assert all(abs(again[c][0] - after[c][0]) < 0.01 and again[c][1] == after[c][1] for c in after)

    colleague = page(width=1600, height=1000, scheme="dark")
    colleague.goto(tab.url)
    titled(colleague, "dialect coefficient mu")
    assert {c: text for c, (_, text) in marks(colleague).items()} == {c: text for c, (_, text) in after.items()}
    shot(colleague, "trends-dialect-1600-dark")
    assert tab.problems == colleague.problems == []
