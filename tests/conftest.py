"""What the whole suite shares: the benchmarks' switch, no skips where CI says so, a demo book, the order."""

import os
from pathlib import Path

import pytest
from hypothesis import settings

from labbook.demo import make_demo

TESTS = Path(__file__).parent

# a busy machine is no reason for red, and CI tries the same examples each time
settings.register_profile("labbook", deadline=None, derandomize=bool(os.environ.get("CI")))
settings.load_profile("labbook")


def pytest_addoption(parser):
    parser.addoption(
        "--benchmarks", action="store_true", help="collect tests/benchmarks, which measure and take minutes"
    )


def pytest_ignore_collect(collection_path, config):
    """Benchmarks are another command's business: without the flag they are not collected at all."""
    inside = TESTS / "benchmarks" in (collection_path, *collection_path.parents)
    return True if inside and not config.getoption("benchmarks") else None


def pytest_xdist_auto_num_workers(config):
    """As many workers as cores, four at most, which is what the memory of a small machine bears; benchmarks have the
    machine to themselves."""
    return 0 if config.getoption("benchmarks") else min(4, os.cpu_count() or 1)


def pytest_collection_modifyitems(items):
    """The browser goes last: it is slow, and its event loop would be in the way of others."""
    items.sort(key=lambda item: TESTS / "browser" in item.path.parents)


def _unrun(config) -> list:
    if hasattr(config, "workerinput"):  # a worker reports to the one that counts
        return []
    stats = config.pluginmanager.get_plugin("terminalreporter").stats
    return stats.get("skipped", []) + stats.get("xfailed", [])


def pytest_sessionfinish(session, exitstatus):
    """With LABBOOK_NO_SKIPS=1 a test that did not run is a failure."""
    if os.environ.get("LABBOOK_NO_SKIPS") == "1" and exitstatus == 0 and _unrun(session.config):
        session.exitstatus = pytest.ExitCode.TESTS_FAILED


def pytest_terminal_summary(terminalreporter, config):
    if os.environ.get("LABBOOK_NO_SKIPS") == "1" and (unrun := _unrun(config)):
        line = f"LABBOOK_NO_SKIPS: {len(unrun)} did not run, which counts as failure"
        terminalreporter.write_line(line, red=True)


@pytest.fixture(scope="session")
def demo_book(tmp_path_factory) -> Path:
    """The demo book, made once: read it, or write to a copy."""
    path = tmp_path_factory.mktemp("demo") / "demo.db"
    make_demo(path).close()
    return path
