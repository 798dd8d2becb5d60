"""Timing by ratio inside one run, and the lines of the table that is printed at the end."""

import os
import time
from statistics import median

RUNS = int(os.environ.get("LABBOOK_BENCH_RUNS", "1000000"))
LINES: list[tuple[str, str, str, str]] = []


def timed(act, repeats: int = 5) -> float:
    """Median seconds of an act."""
    spent = []
    for _ in range(repeats):
        start = time.perf_counter()
        act()
        spent.append(time.perf_counter() - start)
    return median(spent)


def noted(name: str, ours: float, theirs: float, most: float) -> None:
    """Note a ratio for the table; fails where it exceeds the budget."""
    ratio = ours / theirs
    LINES.append((name, f"{ours:.4g} s", f"{theirs:.4g} s", f"{ratio:.3g} (at most {most:g})"))
    assert ratio <= most, f"{name}: {ratio:.3g} times, budget {most:g}"
