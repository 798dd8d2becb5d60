"""A track dropped on a run: adjusted, accepted, seen on the sheet, and the run's point moves on Trends.

Truth is the motion that the test makes: 40 um/s along 20 degrees after a slow first cycle, a beat of 0.4 mm at the
run's 0.56 Hz, a tail tip of 2.4 mm peak to peak, seen by a camera of 21.4(1) um/px at 30 frames a second.
"""

import math
import re
import shutil

import numpy as np
import pytest
from playwright.sync_api import expect
from steps import WAIT, settled, typed

from labbook import Book
from labbook.book.asking import Question

F, FPS, PIXEL = 0.56, 30, 21.4e-6
U, TIP, ANGLE = 40e-6, 2.4e-3, math.radians(20)
CELLS = {"swimmer": "rush-05", "fluid": "sil12500-a", "rig": "eye-1", "f": "0.56 Hz", "theta0": "0.200(6) rad",
         "T": "23.7 degC", "U": "0.0309(19) mm/s", "A_tip": "2.62(8) mm"}  # fmt: skip
MARKS = """() => [...document.querySelectorAll('.st-key-lb-trend-chart path[aria-roledescription="point"]')].map(
  path => [path.getAttribute('aria-label'), path.getAttribute('transform')])"""
# [letters of a tick, its x, its y] of the two axes of the path
TICKS = """() => [...document.querySelectorAll('[class*="st-key-lb-track-path"] .role-axis-label text')].map(
  text => { const at = text.getBoundingClientRect();
            return [text.textContent, at.x + at.width / 2, at.y + at.height / 2] })"""


def track(speed: float = U, drift: tuple[float, float] = (0.0, 0.0)) -> bytes:
    """The motion as a tracker writes it: frames and pixels; drift: m/s of the whole picture."""
    rng = np.random.default_rng(8)
    t = np.arange(1200) / FPS
    # it starts from rest, and is up to speed when the first beat is over
    along = speed * np.where(t < 1 / F, 0.5 * F * t**2, t - 0.5 / F) + 4e-4 * np.sin(2 * np.pi * F * t)
    tip = 0.5 * TIP * np.sin(2 * np.pi * F * t + 0.5)
    x, y = (0.003 + along * g(ANGLE) + rng.normal(0, 1e-5, len(t)) for g in (math.cos, math.sin))
    x, y = x + drift[0] * t, y + drift[1] * t
    columns = (x, y, x - 0.02 - tip * math.sin(ANGLE), y + tip * math.cos(ANGLE))
    rows = zip(range(len(t)), *(one / PIXEL for one in columns), strict=True)
    return ("frame,x,y,tip_x,tip_y\n" + "".join(f"{i},{a:.3f},{b:.3f},{c:.3f},{d:.3f}\n" for i, a, b, c, d in rows)).encode()


def tracer(drift: tuple[float, float]) -> bytes:
    """A particle that only drifts, in the same film."""
    rng = np.random.default_rng(9)
    x, y = (0.001 + v * np.arange(900) / FPS + rng.normal(0, 1e-5, 900) for v in drift)
    return ("frame,x,y\n" + "".join(f"{i},{a / PIXEL:.3f},{b / PIXEL:.3f}\n" for i, (a, b) in enumerate(zip(x, y, strict=True)))).encode()


@pytest.fixture(scope="module")
def made(demo_book, tmp_path_factory):
    """(book with one run before its own camera, that run's code)."""
    path = shutil.copy(demo_book, tmp_path_factory.mktemp("track") / "track.db")
    with Book.open(path) as book:
        book.stock("rig", code="eye-1", kind="camera", scale="21.4(1) um/px", fps="30 fps", calibrated="2026-11-20")
        return path, book.record(**CELLS, confirm=True)


def drop(tab, content: bytes, name: str = "reed.csv", zone: int = 0) -> None:
    """Into the track's own zone, or (1) that of its drift."""
    settled(tab)  # a page that is still running would mount the zone anew, and lose the file
    place = tab.locator("input[type=file]").nth(zone)
    place.set_input_files({"name": name, "mimeType": "text/csv", "buffer": content})


def heights(tab) -> dict[str, float]:
    """Run -> pixel of its mark on Trends, from the top."""
    tab.wait_for_function(f"() => ({MARKS})().length > 500", timeout=WAIT)
    tab.wait_for_timeout(300)
    found = {}
    for label, place in tab.evaluate(MARKS):
        if run := re.search(r"run: (R-\d+)", label):
            found[run[1]] = float(re.search(r"translate\([-\d.]+,([-\d.]+)", place)[1])
    return found


def test_a_track_is_dropped_adjusted_accepted_and_its_point_moves(page, served, made, shot, tmp_path):
    book, code = made
    content, address = track(), served(book)
    tab = page(width=1024, height=768)
    tab.goto(f"{address}/trends")
    before = heights(tab)

    tab.goto(f"{address}/runs?run={code}")
    tab.get_by_role("button", name="Drop a track").click()
    expect(tab.get_by_text("Drop a track: CSV or Parquet with", exact=False)).to_be_visible(timeout=WAIT)
    # a film by mistake: one sentence, and the page goes on
    large = tmp_path / "film.csv"
    large.write_bytes(b"t,x,y\n" + b"1,2,3\n" * 11_500_000)
    tab.locator("input[type=file]").first.set_input_files(large)
    expect(tab.get_by_text("film.csv has 66 MB, and this page takes 64;", exact=False)).to_be_visible(timeout=WAIT)
    shot(tab, "track-large-1024-light")
    huge = tmp_path / "two-hours.csv"
    with huge.open("wb") as file:  # beyond what is let in at all: the page alone can say it
        file.truncate(2 * 2**30)
    tab.locator("input[type=file]").first.set_input_files(huge)
    expect(tab.locator('[class*="st-key-lb-dropzone"] [aria-invalid="true"]')).to_be_visible(timeout=WAIT)
    said = tab.evaluate("""() => getComputedStyle(document.querySelector('[class*="st-key-lb-dropzone"]'), '::after').content""")
    assert "This file is not read: a page takes at most 64 MB" in said
    shot(tab, "track-huge-1024-light")
    drop(tab, content)
    expect(tab.get_by_text("that of the velocity", exact=False)).to_be_visible(timeout=WAIT)
    expect(tab.get_by_label("scale, from the rig", exact=True)).to_have_value("21.4(1) um/px")
    # a bad setting is refused at its field, and the file and the rest stay
    typed(tab, "axis, ° from x to y", "north")
    expect(tab.get_by_text("cannot be read as an angle", exact=False)).to_be_visible(timeout=WAIT)
    shot(tab, "track-refused-1024-light")
    typed(tab, "axis, ° from x to y", "20")
    expect(tab.get_by_text("20.0° from x to y, as given")).to_be_visible(timeout=WAIT)
    typed(tab, "trim, cycles", "1")
    expect(tab.get_by_text("1 start-up cycle", exact=True)).to_be_visible(timeout=WAIT)
    expect(tab.get_by_text("the grey stretch is trimmed", exact=False)).to_be_visible(timeout=WAIT)
    equal_scales(tab)
    shot(tab, "track-adjusted-1024-light", full_page=True)
    tab.get_by_role("button", name="Accept").click()
    expect(tab.get_by_text("come from reed.csv", exact=False).first).to_be_visible(timeout=WAIT)

    # on the sheet: the value within its u of the truth, marked, the typed one beside it
    cells = tab.locator("tr", has_text="speed, head first positive").first
    expect(cells).to_contain_text("reduced, typed 0.0309(19) mm/s", timeout=WAIT)
    value, u = re.search(r"(0\.\d+)\((\d+)\) mm/s", cells.inner_text()).groups()
    u_mm = int(u) * 10.0 ** -len(value.partition(".")[2])
    assert abs(float(value) - 1e3 * U) <= u_mm and u_mm < 0.001
    with tab.expect_download(timeout=WAIT) as coming:
        tab.get_by_role("button", name="The file as it was dropped").click()
    assert coming.value.suggested_filename == "reed.csv"
    with open(coming.value.path(), "rb") as kept:
        assert kept.read() == content
    shot(tab, "track-kept-1024-light", full_page=True)

    tab.goto(f"{address}/trends")
    after = heights(tab)
    with Book.open(book) as opened:
        frame = opened.frame(Question(), keys=("Sp", "U_scaled"), texts=("code",), spread=False).dropna()
        run = opened.sheet(code)
    scaled = {c: v for c, v in zip(frame["code"], frame["U_scaled"], strict=True) if v > 0}
    others = sorted(after.keys() - {code})
    # the others have not moved, and say where on the log axis this run's scaled speed belongs
    assert max(abs(after[c] - before[c]) for c in others) < 0.5
    line = np.polyfit([math.log(scaled[c]) for c in others], [after[c] for c in others], 1)
    assert after[code] == pytest.approx(float(np.polyval(line, math.log(scaled[code]))), abs=0.5)
    # U_scaled is in proportion to U: by as much as 40 is more than 30.9 it has gone up
    assert after[code] - before[code] == pytest.approx(line[0] * math.log(float(value) / 0.0309), abs=0.5)
    assert before[code] - after[code] > 3
    assert run.values["A_tip"] == pytest.approx(TIP, rel=0.01) and run.track.settings["trim"] == "1"
    assert tab.problems == []


def test_a_drift_track_and_a_speed_that_is_far_off(page, served, made, shot):
    book, _ = made
    with Book.open(book) as opened:
        code = opened.record(**CELLS, at="2026-11-30T15:00", confirm=True)
    drift = (9e-6, -6e-6)
    tab = page(width=1600, height=1000)
    tab.goto(f"{served(book)}/runs?run={code}")
    tab.get_by_role("button", name="Drop a track").click()
    expect(tab.get_by_text("Nothing enters the run before", exact=False)).to_be_visible(timeout=WAIT)
    # 200 times as fast as this swimmer: a touch more, and nothing before it
    drop(tab, track(speed=200 * U), "fast.csv")
    tab.get_by_role("button", name="Accept", exact=True).click()
    expect(tab.get_by_text("times the largest of this swimmer's runs", exact=False).first).to_be_visible(timeout=WAIT)
    expect(tab.get_by_role("button", name="It is right, accept")).to_be_visible(timeout=WAIT)
    shot(tab, "track-far-off-1600-light")
    with Book.open(book) as opened:
        assert opened.sheet(code).track is None
    tab.reload()  # another file, and with it the drift of a tracer in the same film
    tab.get_by_role("button", name="Drop a track").click()
    expect(tab.get_by_text("Nothing enters the run before", exact=False)).to_be_visible(timeout=WAIT)
    drop(tab, track(drift=drift))
    expect(tab.get_by_role("button", name="Accept", exact=True)).to_be_visible(timeout=WAIT)
    drop(tab, tracer(drift), "tracer.csv", zone=1)
    expect(tab.get_by_text(re.compile(r"^Drift .* from tracer.csv$"))).to_be_visible(timeout=WAIT)
    settled(tab)
    shot(tab, "track-drift-1600-light")
    tab.get_by_role("button", name="Accept", exact=True).click()
    expect(tab.get_by_text("come from reed.csv", exact=False).first).to_be_visible(timeout=WAIT)
    with Book.open(book) as opened:
        run = opened.sheet(code)
        assert abs(run.values["U"] - U) < 3 * run.u["U"] < 2e-6 and run.track.settings["drift_from"] == "tracer.csv"
    assert tab.problems == []


def equal_scales(tab) -> None:
    """A millimetre is as many pixels across as up."""
    tab.wait_for_function(f"() => ({TICKS})().length > 4", timeout=WAIT)
    ticks = [(float(text.replace("−", "-")), x, y) for text, x, y in tab.evaluate(TICKS)]
    lowest = max(y for _, _, y in ticks)
    across = [(v, x) for v, x, y in ticks if abs(y - lowest) < 2]
    up = [(v, y) for v, x, y in ticks if abs(y - lowest) >= 2]
    slopes = [(row[-1][1] - row[0][1]) / (row[-1][0] - row[0][0]) for row in (across, up)]
    assert slopes[0] == pytest.approx(-slopes[1], rel=0.02)  # letters are centred to a pixel


@pytest.mark.parametrize(("size", "scheme"), [((1024, 768), "light"), ((1024, 768), "dark"), ((1600, 1000), "light"),
                                              ((1600, 1000), "dark")])  # fmt: skip
def test_bench_and_record_stand_with_a_track_in_both_sizes_and_themes(page, served, made, shot, size, scheme):
    book, _ = made
    name = f"{size[0]}-{scheme}"
    tab = page(width=size[0], height=size[1], scheme=scheme)
    tab.goto(served(book))
    expect(tab.get_by_role("button", name="Log trial")).to_be_visible(timeout=WAIT)
    for label, text in {"f frequency": "0.56 Hz", "θ₀ angle": "12 deg", "T fluid": "22.4 degC"}.items():
        typed(tab, label, text)
    drop(tab, track(), f"{name}.csv")
    expect(tab.get_by_text(re.compile(r"^U .* 95 %: .*replaces a typed U"))).to_be_visible(timeout=WAIT)
    settled(tab)
    log = tab.get_by_role("button", name="Log trial")
    assert log.bounding_box()["y"] + log.bounding_box()["height"] <= size[1], "Log trial stands on the screen"
    expect(tab.locator(".st-key-lb-track-along-bench svg, .st-key-lb-track-along-bench canvas").first).to_be_visible(timeout=WAIT)
    shot(tab, f"track-bench-{name}")
    log.click()
    expect(tab.get_by_text(f"U from {name}.csv", exact=False)).to_be_visible(timeout=WAIT)
    tab.get_by_role("link", name=re.compile("open or amend")).click()
    expect(tab.get_by_text("nothing was typed").first).to_be_visible(timeout=WAIT)
    expect(tab.get_by_text(re.compile("no net motion|net motion of")).first).to_be_visible(timeout=WAIT)
    shown = tab.locator("[class*=st-key-lb-track-residual]").first
    shown.scroll_into_view_if_needed()
    expect(shown).to_be_visible()
    tab.wait_for_timeout(500)
    shot(tab, f"track-record-{name}")
    assert tab.evaluate("document.documentElement.scrollWidth - document.documentElement.clientWidth") <= 0
    assert tab.problems == []
