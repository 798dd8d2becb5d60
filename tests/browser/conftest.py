"""A real browser and the real server for the page tests: nothing is started that a test did not ask for."""

import os
import shutil
import socket
import subprocess
import sys
import time
import urllib.error
import urllib.request
from pathlib import Path
from urllib.parse import urlsplit

import pytest
from playwright.sync_api import sync_playwright

START_SECONDS = 60
STOP_SECONDS = 15
COMMAND = "from labbook.cli import main; main()"
QUIET = ["--disable-gpu", "--disable-background-networking", "--disable-component-update", "--disable-sync",
         "--no-first-run"]  # fmt: skip


def executable(bundled: str) -> str | None:
    """The system's Chromium, else the one that Playwright downloaded, else None."""
    names = ("chromium", "chromium-browser", "google-chrome", "chrome")
    found = next((path for name in names if (path := shutil.which(name))), None)
    return found or (bundled if Path(bundled).exists() else None)


@pytest.fixture(scope="session")
def browser():
    """Chromium without a window."""
    with sync_playwright() as playwright:
        path = executable(playwright.chromium.executable_path)
        if path is None:
            pytest.skip("no Chromium: install it, or run `python -m playwright install chromium`")
        as_root = hasattr(os, "geteuid") and os.geteuid() == 0
        flags = [*QUIET, "--no-sandbox"] if as_root or os.environ.get("CI") else QUIET
        running = playwright.chromium.launch(executable_path=path, args=flags)
        yield running
        running.close()


def _is_local(url: str) -> bool:
    parts = urlsplit(url)
    return parts.scheme in ("data", "blob", "about") or parts.hostname in ("127.0.0.1", "localhost")


@pytest.fixture
def page(browser):
    """page(width=1024, height=768, scheme='light', touch=False, **context options) opens a fresh page.

    The page carries `problems`, its uncaught script errors. A request to another machine fails the test.
    """
    contexts, strangers = [], []

    def opened(width=1024, height=768, scheme="light", touch=False, **options):
        context = browser.new_context(
            viewport={"width": width, "height": height}, color_scheme=scheme, has_touch=touch, **options
        )
        contexts.append(context)
        context.on("request", lambda request: _is_local(request.url) or strangers.append(request.url))
        one = context.new_page()
        one.problems = []
        one.on("pageerror", lambda error: one.problems.append(str(error)))
        return one

    yield opened
    for context in contexts:
        context.close()
    assert strangers == [], "a page asked another machine"


def free_port() -> int:
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return probe.getsockname()[1]


def _wait(process, address: str, log: Path) -> None:
    end = time.monotonic() + START_SECONDS
    while time.monotonic() < end:
        if process.poll() is not None:
            break
        try:
            with urllib.request.urlopen(f"{address}/_stcore/health", timeout=2) as answer:
                if answer.status == 200:
                    return
        except (urllib.error.URLError, OSError):
            time.sleep(0.1)
    raise RuntimeError(f"the app did not start:\n{log.read_text(encoding='utf-8', errors='replace')[-4000:]}")


def _end(process) -> None:
    process.terminate()
    try:
        process.wait(STOP_SECONDS)
    except subprocess.TimeoutExpired:
        process.kill()
        process.wait()


@pytest.fixture(scope="session")
def served(tmp_path_factory):
    """served(book, port=None, by='wren') runs `labbook open BOOK` and returns its address once it answers.

    A book that is served already keeps its server; all end with the session.
    """
    folder = tmp_path_factory.mktemp("served")
    started: list[subprocess.Popen] = []
    serving: dict[tuple[str, str], tuple[subprocess.Popen, str]] = {}

    def serve(book, port: int | None = None, by: str = "wren") -> str:
        known = serving.get((str(book), by))
        if port is None and known is not None and known[0].poll() is None:
            return known[1]
        port = port or free_port()
        address, log = f"http://127.0.0.1:{port}", folder / f"{port}.log"
        # the user's own settings and books stay out of it
        private = {"LABBOOK_BY": by, "HOME": str(folder), "XDG_DATA_HOME": str(folder)}
        with log.open("wb") as out:
            process = subprocess.Popen(
                [sys.executable, "-c", COMMAND, "open", str(book), "--port", str(port), "--no-browser"],
                stdin=subprocess.DEVNULL, stdout=out, stderr=subprocess.STDOUT, env=os.environ | private,
                cwd=folder,
            )  # fmt: skip
        started.append(process)
        serving[str(book), by] = (process, address)
        _wait(process, address, log)
        return address

    yield serve
    for process in started:
        _end(process)


@pytest.fixture
def shot():
    """shot(page, name) writes name.png into the folder that LABBOOK_SHOTS names, if it names one."""

    def take(page, name: str, **options) -> Path | None:
        folder = os.environ.get("LABBOOK_SHOTS")
        if not folder:
            return None
        path = Path(folder) / f"{name}.png"
        path.parent.mkdir(parents=True, exist_ok=True)
        page.screenshot(path=path, **options)
        return path

    return take
