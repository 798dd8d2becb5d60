"""A point that others printed: typed on the Numbers page, seen on Trends where its dialect puts it, and no run."""

import math
import re
import shutil
import sqlite3
from contextlib import closing
from urllib.parse import parse_qs, urlsplit

import numpy as np
import pytest
from playwright.sync_api import expect
from steps import WAIT, typed

from labbook import Book
from labbook.book.asking import Question

CITATION = "Pond & Weir, Invented Letters 3, 14 (2019)"
# an invented print, with f where the house has omega
TYPED = {"series *": "pond-2019", "citation *": CITATION, "value of x *": "2.00(10)", "dialect of x": "rate:f",
         "value of y *": "0.0120(6)"}  # fmt: skip
MARKS = """() => [...document.querySelectorAll('.st-key-lb-trend-chart path[aria-roledescription="point"]')].map(
  path => [path.getAttribute('aria-label'), path.getAttribute('transform')])"""
VALUES = """() => [...document.querySelectorAll('input[aria-label="value of x *"]')].map(one => one.value)"""
WORDS = (
    "() => [...document.querySelectorAll('.st-key-lb-trend-chart text')].map(t => t.textContent).join(' ')"
)


@pytest.fixture
def book(demo_book, tmp_path):
    """A demo book of this test's own."""
    return shutil.copy(demo_book, tmp_path / "published.db")


def titled(tab, words: str) -> None:
    tab.wait_for_function(f"words => ({WORDS})().includes(words)", arg=words, timeout=WAIT)
    tab.wait_for_timeout(300)


def marks(tab) -> tuple[dict[str, tuple[float, float]], dict[tuple[str, str], tuple[float, float]]]:
    """Pixels of the runs by code, and of the published points by series and written x."""
    runs, points = {}, {}
    for label, place in tab.evaluate(MARKS):
        at = tuple(map(float, re.search(r"translate\(([-\d.]+),([-\d.]+)", place).groups()))
        if run := re.search(r"run: (R-\d+)", label):
            runs[run[1]] = at
        elif point := re.search(r"published, not a run: ([^;]+); in: .*; Sp[^:]*: ([^;]+)", label):
            points[point[1], point[2]] = at
    return runs, points


def where(runs, values, axis: int, value: float) -> float:
    """The pixel at which the axis of the runs' own marks has a value: a log axis is a straight line in it."""
    codes = sorted(runs)
    line = np.polyfit(np.log([values[c] for c in codes]), [runs[c][axis] for c in codes], 1)
    return float(np.polyval(line, math.log(value)))


def test_a_point_is_typed_drawn_restated_and_never_a_run(page, served, book, shot):
    with Book.open(book) as opened:
        frame = opened.frame(Question(), keys=("Sp", "U_scaled"), texts=("code",), spread=False).dropna()
    frame = frame[frame["U_scaled"] > 0]
    assert len(frame) > 500
    Sp, U_scaled = (dict(zip(frame["code"], frame[k], strict=True)) for k in ("Sp", "U_scaled"))
    address = served(book)
    tab = page(width=1024, height=768)
    tab.goto(f"{address}/numbers?part=published")
    for label, text in TYPED.items():
        typed(tab, label, text)

    # a bad cell is refused below its field, and everything stays
    typed(tab, "value of y *", "1.2 mm")
    tab.get_by_role("button", name="Add the point").click()
    expect(tab.get_by_text(re.compile("y_value '1.2 mm': mm is a length"))).to_be_visible(timeout=WAIT)
    expect(tab.get_by_label("citation *")).to_have_value(CITATION)
    shot(tab, "published-refused-1024-light")
    typed(tab, "value of y *", "0.0120(6)")
    tab.get_by_role("button", name="Add the point").click()
    expect(tab.get_by_text("A point of pond-2019 is added.")).to_be_visible(timeout=WAIT)
    # for an instant both the old field and the new one stand there
    tab.wait_for_function(f"() => JSON.stringify(({VALUES})()) === '[\"\"]'", timeout=WAIT)
    expect(tab.get_by_label("citation *")).to_have_value(CITATION)  # the series goes on
    shot(tab, "published-added-1024-light")

    tab.goto(f"{address}/trends")
    titled(tab, "Sp = L_tail (ζ_n ω/EI)^(1/4), house dialect")
    drawn = tab.get_by_text(re.compile(rf"^{len(frame)} of 920 runs drawn\."))
    expect(drawn).to_be_visible()
    expect(tab.get_by_text(re.compile(rf"pond-2019 \({re.escape(CITATION)}\), 1 point"))).to_be_visible()
    assert "pond-2019" in tab.evaluate(WORDS)
    runs, points = marks(tab)
    assert runs.keys() == Sp.keys() and len(points) == 12  # the demo's eleven and this one
    # f for omega makes Sp smaller by (2 pi)^(1/4) = 1.58323; u = 0.10 x 1.58323
    x, y = points["pond-2019", "3.17(16)"]
    assert x == pytest.approx(where(runs, Sp, 0, 2.0 * 1.58323), abs=0.5)  # half a pixel
    assert y == pytest.approx(where(runs, U_scaled, 1, 0.0120), abs=0.5)
    shot(tab, "published-house-1024-light")

    # a touch on it opens no run, although runs lie under it
    frame_box = tab.locator(".st-key-lb-trend-chart path[aria-label*='pond-2019']").first.bounding_box()
    tab.mouse.click(frame_box["x"] + frame_box["width"] / 2, frame_box["y"] + frame_box["height"] / 2)
    tab.wait_for_timeout(1500)
    assert "run" not in parse_qs(urlsplit(tab.url).query)
    expect(tab.get_by_text("That mark stands for several runs")).to_have_count(0)

    tab.get_by_label("dialect of U_scaled").click()
    tab.get_by_role("option", name="rate f", exact=True).click()
    titled(tab, "U/(f L_tail θ₀²), dialect rate f")
    runs, points = marks(tab)
    # U/(f L theta0^2) is 2 pi U/(omega L theta0^2), of the runs and of the print
    by_f = {code: value * 2 * math.pi for code, value in U_scaled.items()}
    assert points["pond-2019", "3.17(16)"][1] == pytest.approx(
        where(runs, by_f, 1, 0.0120 * 2 * math.pi), abs=0.5
    )
    tab.goto(f"{address}/trends?dialect=Sp%3Drate%3Af%2Cpower%3A1")
    titled(tab, "dialect rate f, power 1")
    runs, points = marks(tab)
    # zeta_n f L^4/EI: Sp^4/(2 pi) for the runs, 2.00^4 = 16 for the print, u = 4 x 0.05 x 16 = 3.2
    fourth = {code: value**4 / (2 * math.pi) for code, value in Sp.items()}
    assert points["pond-2019", "16(3)"][0] == pytest.approx(where(runs, fourth, 0, 16.0), abs=0.5)
    expect(drawn).to_be_visible()
    shot(tab, "published-dialect-1024-light")

    # where its dialect needs lengths that nobody gave, that is said
    tab.get_by_label("dialect of Sp").click()
    tab.get_by_role("option", name="length L_body", exact=True).click()
    titled(tab, "dialect length L_body")
    expect(
        tab.get_by_text(re.compile(r"6 published points not drawn: no Sp in this dialect \(needs L_body\)"))
    ).to_be_visible()

    # without them
    tab.get_by_text("published", exact=True).click()
    tab.wait_for_function(f"() => !({WORDS})().includes('tarn-2017')", timeout=WAIT)
    assert not marks(tab)[1] and parse_qs(urlsplit(tab.url).query)["published"] == ["off"]
    assert tab.problems == []
    with closing(sqlite3.connect(book)) as raw:
        assert raw.execute("select count(*) from run").fetchone() == (920,)


@pytest.mark.parametrize(("size", "scheme"), [((1024, 768), "dark"), ((1600, 1000), "light")])
def test_the_part_and_the_plot_stand_in_other_sizes_and_themes(page, served, demo_book, shot, size, scheme):
    address = served(demo_book)
    tab = page(width=size[0], height=size[1], scheme=scheme)
    tab.goto(f"{address}/numbers?part=published")
    expect(tab.get_by_text("tarn-2017", exact=True)).to_be_visible(timeout=WAIT)
    tab.get_by_text("Points in the house dialect").first.click()
    expect(tab.get_by_text("read off a printed figure")).to_be_visible()
    shot(tab, f"published-part-{size[0]}-{scheme}")
    assert tab.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth") <= 0
    tab.get_by_role("link", name="on Trends").first.click()
    titled(tab, "house dialect")
    assert len(marks(tab)[1]) == 11
    save = tab.get_by_role("button", name="Save figure").bounding_box()
    assert save["y"] + save["height"] <= size[1], "the last control stands on the screen"
    shot(tab, f"published-trends-{size[0]}-{scheme}")
    assert tab.problems == []
