"""The demo book's first page, interactive in a real browser, against a one-line Streamlit page beside it."""

import importlib.util
import subprocess
import sys
import time
from pathlib import Path
from statistics import median

import pytest
from measured import noted
from playwright.sync_api import sync_playwright

from labbook.demo import make_demo

_PLACE = Path(__file__).parent.parent / "browser" / "conftest.py"
_SPEC = importlib.util.spec_from_file_location("browser_fixtures", _PLACE)
fixtures = importlib.util.module_from_spec(_SPEC)
_SPEC.loader.exec_module(fixtures)


def seconds_until(browser, address: str, button: str) -> float:
    """Seconds from asking for the page to a button that can be pressed, in a fresh tab."""
    context = browser.new_context(viewport={"width": 1024, "height": 768})
    tab = context.new_page()
    start = time.perf_counter()
    tab.goto(address)
    tab.get_by_role("button", name=button).wait_for(timeout=60_000)
    spent = time.perf_counter() - start
    context.close()
    return spent


@pytest.fixture
def servers(tmp_path):
    """(address of the app on a demo book, address of a one-line page)."""
    book = tmp_path / "demo.db"
    make_demo(book).close()
    (tmp_path / "one.py").write_text('import streamlit as st\nst.button("Hello")\n', encoding="utf-8")
    started = []
    addresses = []
    for command in (["-c", fixtures.COMMAND, "open", str(book), "--no-browser", "--port"],
                    ["-m", "streamlit", "run", "one.py", "--server.headless", "true", "--server.address",
                     "127.0.0.1", "--server.port"]):  # fmt: skip
        port = fixtures.free_port()
        log = tmp_path / f"{port}.log"
        with log.open("wb") as out:
            process = subprocess.Popen([sys.executable, *command, str(port)], stdout=out, stderr=out, cwd=tmp_path)
        started.append(process)
        fixtures._wait(process, f"http://127.0.0.1:{port}", log)
        addresses.append(f"http://127.0.0.1:{port}")
    yield addresses
    for process in started:
        fixtures._end(process)


def test_first_page(servers):
    app, one_line = servers
    with sync_playwright() as playwright:
        path = fixtures.executable(playwright.chromium.executable_path)
        browser = playwright.chromium.launch(executable_path=path, args=[*fixtures.QUIET, "--no-sandbox"])
        ours, theirs = [], []
        for _ in range(6):  # the first of each warms the server
            ours.append(seconds_until(browser, app, "Log trial"))
            theirs.append(seconds_until(browser, one_line, "Hello"))
        browser.close()
    noted("first page of the demo book : one-line page", median(ours[1:]), median(theirs[1:]), 2.5)
