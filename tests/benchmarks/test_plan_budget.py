"""Plan's map drawn again in a real browser, against the same chart on a page that computes nothing.

Each redraw is one typed value: from the Enter key to the new word in the drawing. The page beside it draws
the very specification of the map, with the typed word in place of the target's: as large and as rich.
"""

import importlib.util
import json
import subprocess
import sys
import time
from pathlib import Path
from statistics import median

import pytest
from measured import LINES, noted
from playwright.sync_api import sync_playwright

from labbook import Book
from labbook.book.plan_targets import optimum
from labbook.book.plan_zones import plan_map as plane
from labbook.charts.plan_map import ground, plan_map
from labbook.demo import make_demo

_PLACE = Path(__file__).parent.parent / "browser" / "conftest.py"
_SPEC = importlib.util.spec_from_file_location("browser_fixtures", _PLACE)
fixtures = importlib.util.module_from_spec(_SPEC)
_SPEC.loader.exec_module(fixtures)

SWIMMER = "reed-06"
VALUES = [f"{1.5 + 0.1 * i:.3g}" for i in range(15)]
MOST_SECONDS = 0.300
STATIC = """
import json
import streamlit as st
st.set_page_config(layout="wide")
typed = st.text_input("target Sp")
left, right = st.columns([0.64, 0.36], gap="medium")
spec = json.load(open("chart.json"))
word = next(r for r in spec["datasets"]["rows"] if r["kind"] == "words" and r["of"] == "target")
word["text"] = f"Sp {typed}, target"
with left, st.container(height=470, border=False):
    st.vega_lite_chart(spec=spec, theme=None, width="stretch", height="stretch")
"""
SEEN = """word => [...document.querySelectorAll('[data-testid="stVegaLiteChart"] text')].some(
  t => t.textContent === word)"""


def specification(book: Path) -> str:
    with Book.open(book) as opened:
        plan = opened.plan(SWIMMER)
        seen = plane(plan)
        runs = opened.propose(plan, 5).runs.assign(place=range(1, 6), code="")
    plane_ = dict(f=seen.f, mu=seen.mu, zones=seen.zones)
    spec = plan_map(
        **plane_, below=ground(**plane_, fluids=seen.fluids, runs=seen.runs), surface=seen.grid["Sp"],
        levels=(1.0, 4.0), target=optimum(plan), proposed=runs, waiting=seen.runs.head(0),
        done=seen.runs.head(0),
    )  # fmt: skip
    return json.dumps(spec)


@pytest.fixture
def servers(tmp_path):
    """(address of Plan on a demo book, address of the page with a static chart)."""
    book = tmp_path / "demo.db"
    make_demo(book).close()
    (tmp_path / "chart.json").write_text(specification(book), encoding="utf-8")
    (tmp_path / "static.py").write_text(STATIC, encoding="utf-8")
    started, addresses = [], []
    for command in (["-c", fixtures.COMMAND, "open", str(book), "--no-browser", "--port"],
                    ["-m", "streamlit", "run", "static.py", "--server.headless", "true", "--server.address",
                     "127.0.0.1", "--server.port"]):  # fmt: skip
        port = fixtures.free_port()
        log = tmp_path / f"{port}.log"
        with log.open("wb") as out:
            process = subprocess.Popen(
                [sys.executable, *command, str(port)], stdout=out, stderr=out, cwd=tmp_path
            )
        started.append(process)
        fixtures._wait(process, f"http://127.0.0.1:{port}", log)
        addresses.append(f"http://127.0.0.1:{port}")
    yield f"{addresses[0]}/plan?swimmer={SWIMMER}", addresses[1]
    for process in started:
        fixtures._end(process)


def seconds_of(tab, typed: str) -> float:
    """From Enter to the word in the drawing."""
    field = tab.get_by_label("target Sp", exact=True)
    field.fill(typed)
    start = time.perf_counter()
    field.press("Enter")
    tab.wait_for_function(SEEN, arg=f"Sp {typed}, target", timeout=30_000)
    spent = time.perf_counter() - start
    # what comes after the map is no part of it, and would slow the next one
    tab.wait_for_timeout(500)
    tab.wait_for_function("document.querySelector('[data-testid=stStatusWidget]') === null", timeout=30_000)
    tab.wait_for_timeout(500)
    return spent


def test_the_map_is_drawn_again(servers):
    with sync_playwright() as playwright:
        path = fixtures.executable(playwright.chromium.executable_path)
        browser = playwright.chromium.launch(executable_path=path, args=[*fixtures.QUIET, "--no-sandbox"])
        tabs = []
        for address in servers:
            tab = browser.new_context(viewport={"width": 1024, "height": 768}).new_page()
            tab.goto(address)
            tab.wait_for_selector('[data-testid="stVegaLiteChart"] svg', timeout=60_000)
            tab.wait_for_timeout(3000)
            tabs.append(tab)
        spent = [[seconds_of(tab, typed) for tab in tabs] for typed in VALUES]
        browser.close()
    ours, theirs = (median(times) for times in zip(*spent[2:], strict=True))
    noted("Plan's map again, a target typed : the same chart, static", ours, theirs, 1.5)
    LINES.append(("Plan's map again, a target typed", f"{ours:.3f} s", f"{MOST_SECONDS} s", "at most"))
    assert ours <= MOST_SECONDS
