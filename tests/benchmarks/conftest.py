"""The table at the end of a benchmark run, and the big book made once."""

import os
from pathlib import Path

import pytest
from measured import LINES, RUNS
from synthetic import big_book

from labbook import Book


def pytest_terminal_summary(terminalreporter):
    if not LINES:
        return
    terminalreporter.write_line(f"\n{RUNS} runs unless said")
    widths = [max(len(line[i]) for line in LINES) for i in range(4)]
    for line in LINES:
        terminalreporter.write_line("  ".join(c.ljust(w) for c, w in zip(line, widths, strict=True)))


@pytest.fixture(scope="session")
def big(tmp_path_factory):
    """The book with RUNS runs; LABBOOK_BENCH_BOOK names a file to keep it in between runs."""
    kept = os.environ.get("LABBOOK_BENCH_BOOK")
    path = Path(kept) if kept else tmp_path_factory.mktemp("big") / "big.db"
    if path.exists():
        return Book.open(path)
    return big_book(path, RUNS)
