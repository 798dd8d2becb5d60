"""Plan in a real browser: three runs planned, one logged from the plan on Bench, the gap seen to be filled.

Where marks should stand is worked out from the ticks of the axes beside them.
"""

import math
import re
import shutil

import pytest
from playwright.sync_api import expect
from steps import WAIT, settled

from labbook import Book

SWIMMER = "sedge-05"
MAP = ".st-key-lb-plan-map"
SIZES = [((1024, 768), "light"), ((1024, 768), "dark"), ((1600, 1000), "light"), ((1600, 1000), "dark")]
# [x, y] of the marks of a layer
MARKS = """([box, layer]) => [...document.querySelectorAll(`${box} .${layer}_marks path`)].map(path => {
  const at = path.getBoundingClientRect(); return [at.x + at.width / 2, at.y + at.height / 2] })"""
# [letters, x, y] of the ticks of both axes
TICKS = """box => [...document.querySelectorAll(`${box} .role-axis-label text`)].map(text => {
  const at = text.getBoundingClientRect();
  return [text.textContent, at.x + at.width / 2, at.y + at.height / 2] })"""
# boxes of what is written on the map: names of fluids, and names along lines
WRITTEN = """([box, layer]) => [...document.querySelectorAll(`${box} .${layer}_marks text`)]
  .filter(text => text.textContent).map(text => { const at = text.getBoundingClientRect();
    return [text.textContent, at.left, at.top, at.right, at.bottom] })"""


@pytest.fixture(scope="module")
def book(demo_book, tmp_path_factory):
    return shutil.copy(demo_book, tmp_path_factory.mktemp("plan") / "plan.db")


def drawn(tab, layer: str, box: str = MAP) -> list[tuple[float, float]]:
    return [tuple(at) for at in tab.evaluate(MARKS, [box, layer])]


def open_plan(tab, address: str) -> None:
    tab.goto(address)
    tab.wait_for_selector(f"{MAP} .proposed_marks path", timeout=WAIT)
    settled(tab)


def number(text: str) -> float:
    """A tick as printed: 0.001, 10, 2×10⁻⁴ or 10⁻⁴."""
    plain = text.translate(str.maketrans("⁰¹²³⁴⁵⁶⁷⁸⁹⁻−", "0123456789--"))
    mantissa, power, exponent = (
        plain.rpartition("10") if "10-" in plain or "×10" in plain else (plain, "", "")
    )
    return float(mantissa.rstrip("×") or 1) * 10.0 ** float(exponent) if power else float(plain)


def place_of(tab, f: float, mu: float) -> tuple[float, float]:
    """Where a run of f (Hz) and mu (Pa.s) belongs on the map, from the ticks of its two logarithmic axes."""
    ticks = [(number(text), x, y) for text, x, y in tab.evaluate(TICKS, MAP)]
    lowest = max(y for _, _, y in ticks)
    across = sorted((v, x) for v, x, y in ticks if abs(y - lowest) < 3)
    up = sorted((v, y) for v, x, y in ticks if abs(y - lowest) >= 3)
    found = []
    for value, axis in ((f, across), (mu, up)):
        (low, start), (high, end) = axis[0], axis[-1]
        found.append(start + math.log(value / low) / math.log(high / low) * (end - start))
    return found[0], found[1]


def near(one, other, pixels: float = 3.0) -> bool:
    """A tick's letters are centred to a pixel, a mark to half of one."""
    return math.dist(one, other) <= pixels


def kept(tab) -> int:
    said = tab.get_by_text(re.compile(r"\d+ kept runs of flexible tail swimmers, dark")).inner_text()
    return int(re.match(r"\d+", said)[0])


def test_three_runs_are_planned_one_is_logged_and_fills_the_gap(page, served, book, shot):
    address = served(book)
    tab = page(width=1024, height=768)
    open_plan(tab, f"{address}/plan?n=3")
    items = tab.locator(".lb-next b")
    expect(items).to_have_count(3, timeout=WAIT)
    planned = [text.split(", ")[:2] for text in items.all_inner_texts()]
    before = kept(tab)
    assert len(drawn(tab, "proposed")) == 3 and not drawn(tab, "done") and not drawn(tab, "waiting")
    fluid, f = planned[0]
    with Book.open(book) as opened:
        mu = opened.runs(fluid=fluid)["mu"].iloc[-1]
    ring = drawn(tab, "proposed")[0]
    # the fluid was measured again since that run or was colder then: the ring's height is the plan's own
    assert abs(ring[0] - place_of(tab, float(f.removesuffix(" Hz")), mu)[0]) < 3
    shot(tab, "plan-proposed-1024-light")

    tab.get_by_role("button", name="To Bench").click()
    settled(tab)
    expect(tab.get_by_role("link", name="3 planned on Bench")).to_be_visible(timeout=WAIT)
    assert len(drawn(tab, "waiting")) == 3
    tab.get_by_role("link", name="3 planned on Bench").click()
    line = tab.get_by_role("button", name=f"{fluid}, {f}")
    expect(line).to_be_visible(timeout=WAIT)
    box = tab.get_by_role("button", name="Log trial").bounding_box()
    assert box["y"] + box["height"] <= 768, "Log trial stands on the screen below the list"
    line.click()
    settled(tab)
    expect(tab.get_by_label("f frequency", exact=True)).to_have_value(f)
    expect(tab.get_by_label("T fluid", exact=True)).to_have_value("")
    shot(tab, "plan-bench-1024-light")
    for label, text in {"T fluid": "20.6 degC", "U speed, head first positive": "0.0001(2) mm/s"}.items():
        field = tab.get_by_label(label, exact=True)
        field.fill(text)
        field.press("Tab")
        settled(tab)
    tab.get_by_role("button", name="Log trial").click()
    settled(tab)
    if tab.get_by_role("button", name="It is right, log it").count():
        tab.get_by_role("button", name="It is right, log it").click()
        settled(tab)
    expect(tab.get_by_text("1 of 3 logged")).to_be_visible(timeout=WAIT)
    with Book.open(book) as opened:
        run = opened.runs(kept=False).iloc[-1]
    assert (run["swimmer"], run["fluid"]) == (SWIMMER, fluid) and run["series"].startswith(f"plan {SWIMMER}")
    done = tab.get_by_role("button", name=run["code"], exact=False)
    expect(done).to_be_disabled()
    shot(tab, "plan-ticked-1024-light")

    # back on Plan: the gap has its run, which is drawn where it belongs, and others are proposed
    tab.get_by_role("link", name="what is next").click()
    tab.wait_for_selector(f"{MAP} .done_marks path", timeout=WAIT)
    settled(tab)
    (filled,) = drawn(tab, "done")
    assert near(filled, place_of(tab, run["f"], run["mu"]))
    assert near(filled, ring, 6.0), "where the ring was, but for the T that was typed"
    assert len(drawn(tab, "waiting")) == 2
    again = [text.split(", ")[:2] for text in items.all_inner_texts()]
    assert planned[0] not in again and len(again) == 3
    assert kept(tab) == before + 1
    expect(tab.get_by_text("1 logged from the plan")).to_be_visible()
    shot(tab, "plan-filled-1024-light", full_page=True)
    assert tab.problems == []


def test_the_sheet_and_the_page_to_print(page, served, book, shot, tmp_path):
    address = served(book)
    tab = page(width=1600, height=1000)
    open_plan(tab, f"{address}/plan?swimmer=reed-06&next=top&n=4")
    with tab.expect_download(timeout=WAIT) as coming:
        tab.get_by_role("button", name="CSV").click()
    sheet = tmp_path / "plan-reed-06.csv"
    coming.value.save_as(sheet)
    with tab.expect_download(timeout=WAIT) as coming:
        tab.get_by_role("button", name="Print").click()
    coming.value.save_as(tmp_path / "plan.html")

    tab.goto(address)
    tab.get_by_text("planned sheet", exact=False).first.click()
    zone = tab.locator(".st-key-lb-dropzone-planned input[type=file]")
    zone.set_input_files({"name": "wrong.csv", "mimeType": "text/csv", "buffer": b"a,b\n1,2\n"})
    expect(tab.get_by_text("has no such column", exact=False)).to_be_visible(timeout=WAIT)
    shot(tab, "plan-sheet-refused-1600-light")
    zone.set_input_files(sheet)
    expect(tab.get_by_text("0 of 4 logged")).to_be_visible(timeout=WAIT)
    expect(tab.get_by_role("button", name="4 · ", exact=False)).to_be_visible()

    paper = page(width=1123, height=794)  # A4 on its side at 96 dots an inch
    paper.set_content((tmp_path / "plan.html").read_text(encoding="utf-8"))
    expect(paper.get_by_role("checkbox", name="run 4 done")).to_be_visible()
    assert paper.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth") <= 0
    shot(paper, "plan-printed", full_page=True)
    assert tab.problems == [] and paper.problems == []


def overlap(one, other) -> bool:
    return (
        min(one[3], other[3]) - max(one[1], other[1]) > 1
        and min(one[4], other[4]) - max(one[2], other[2]) > 1
    )


@pytest.mark.parametrize(("size", "scheme"), SIZES)
@pytest.mark.parametrize("asked", ["", "swimmer=hop-01", "swimmer=reed-04&Sp=400&theta0=0.9 rad"])
def test_the_page_stands_in_both_sizes_and_themes(page, served, book, shot, size, scheme, asked):
    tab = page(width=size[0], height=size[1], scheme=scheme)
    open_plan(tab, f"{served(book)}/plan?{asked}")
    shot(tab, f"plan-{asked[:14].partition('=')[2] or 'first'}-{size[0]}-{scheme}")
    names = tab.evaluate(WRITTEN, [MAP, "fluid_texts"])
    words = tab.evaluate(WRITTEN, [MAP, "words"])
    frame = tab.locator(f"{MAP} svg.marks").bounding_box()
    assert len(names) >= 10 and len(words) >= 3
    for text, left, top, right, bottom in [*names, *words]:
        assert left >= frame["x"] - 1 and right <= frame["x"] + frame["width"] + 1, f"{text} is cut"
        assert top >= frame["y"] - 1 and bottom <= frame["y"] + frame["height"] + 1, f"{text} is cut"
    for i, one in enumerate(names):
        assert not any(overlap(one, other) for other in names[i + 1 :]), f"{one[0]} lies upon another name"
    assert frame["width"] > 0.55 * size[0] and frame["height"] > 0.4 * size[1], "the map is big"
    assert tab.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth") <= 0
    for button in ("Print", "CSV", "To Bench"):
        assert tab.get_by_role("button", name=button).bounding_box()["height"] >= 40
    assert tab.problems == []


def test_a_link_gives_the_same_view(page, served, book):
    address = served(book)
    tab = page(width=1024, height=768)
    open_plan(tab, f"{address}/plan?swimmer=reed-06")
    field = tab.get_by_label("target Sp", exact=True)
    field.fill("2.5")
    field.press("Enter")
    expect(tab.locator(f"{MAP} text", has_text="Sp 2.5, target").first).to_be_attached(timeout=WAIT)
    settled(tab)
    assert "Sp=2.5" in tab.url and "swimmer=reed-06" in tab.url
    other = page(width=1024, height=768)
    open_plan(other, tab.url)
    for layer in ("proposed", "runs", "target"):
        pairs = zip(drawn(other, layer), drawn(tab, layer), strict=True)
        assert all(near(one, same, 0.5) for one, same in pairs), layer
