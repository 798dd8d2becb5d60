"""Several processes on one book: every acknowledged run is kept, a killed load leaves all or nothing, copies are clean."""

import multiprocessing
import os
import signal
import time

import pytest

from labbook import Book
from labbook.cli import main

# processes of their own, forked so that eight of them need not import everything again
SYSTEM = multiprocessing.get_context("fork")


def log_runs(path, who, n, go, told) -> None:
    with Book.open(path) as book:
        go.wait()
        for i in range(n):
            code = book.record(swimmer="reed-1", fluid="syrup", rig="coil-1", by=who, f=f"0.{i + 100} Hz",
                               T="22.0(1) degC", U="0.051(3) mm/s", note=f"{who} {i}")  # fmt: skip
            os.write(told, f"{code}\n".encode())


class Logger:
    """A process that logs runs and says each code once it is acknowledged."""

    def __init__(self, path, who, n, go):
        read, write = os.pipe()
        self.process = SYSTEM.Process(target=log_runs, args=(path, who, n, go, write))
        self.process.start()
        os.close(write)
        self.lines = os.fdopen(read)

    def kill(self) -> list[str]:
        os.kill(self.process.pid, signal.SIGKILL)
        return self.end()

    def end(self) -> list[str]:
        """The codes it said and nobody read yet."""
        rest = self.lines.read().split()
        self.lines.close()
        self.process.join(100)
        return rest


def writer(path, n):
    go = SYSTEM.Event()
    go.set()
    return Logger(path, "wren", n, go)


def test_eight_processes_log_at_once(stocked):
    """Eight times 25 acts; each waits for the others, and none is lost, doubled or refused."""
    stocked.close()
    go = SYSTEM.Event()
    loggers = [Logger(stocked.target, f"person-{i}", 25, go) for i in range(8)]
    assert len({logger.process.pid for logger in loggers} | {os.getpid()}) == 9
    go.set()
    acknowledged = [code for logger in loggers for code in logger.end()]
    assert [logger.process.exitcode for logger in loggers] == [0] * 8
    assert len(acknowledged) == len(set(acknowledged)) == 200
    with Book.open(stocked.target) as book:
        runs = book.runs()
        assert set(runs["code"]) == set(acknowledged) == {f"R-{i:04d}" for i in range(1, 201)}
        assert runs.groupby("by").size().tolist() == [25] * 8
        assert runs["note"].nunique() == 200
        assert book.check() == []


ROWS = 4_000


@pytest.fixture(scope="module")
def large(tmp_path_factory):
    path = tmp_path_factory.mktemp("large") / "runs.csv"
    with path.open("w", encoding="utf-8") as sheet:
        sheet.write("swimmer,fluid,rig,at,by,f [Hz],T [degC],U [mm/s],A_tip [mm],note\n")
        for i in range(ROWS):
            sheet.write(f"reed-1,syrup,coil-1,2026-{1 + i % 12:02d}-{1 + i % 28:02d}T10:{i % 60:02d},wren,"
                        f"{0.1 + i % 50 / 20:.3f},22.{i % 10}(1),0.{i % 89 + 10}(1),1.{i % 10}(1),row {i}\n")  # fmt: skip
    return path


def load(path, sheet, told, stop) -> None:
    """Load, saying each step on a pipe, and stand still for ever at the step called `stop`."""

    def progress(what, n):
        os.write(told, f"{what} {n}\n".encode())
        if what == stop and n:
            time.sleep(600)

    with Book.open(path) as book:
        book.load(sheet, progress=progress)
    os.write(told, b"done\n")


def test_a_load_killed_in_the_middle_leaves_nothing(stocked, large, counts):
    """Killed while reading, once known runs are sorted out, and with every row written but not committed."""
    before = counts(stocked)
    stocked.close()
    for stop in ("reading runs.csv", "readings", "runs"):
        read, write = os.pipe()
        process = SYSTEM.Process(target=load, args=(stocked.target, large, write, stop))
        process.start()
        os.close(write)
        with os.fdopen(read) as lines:
            told = next(line for line in lines if line.startswith(stop + " ") or line == "done\n")
            assert told != "done\n", f"the load never said {stop!r}"
            os.kill(process.pid, signal.SIGKILL)
        process.join(60)
        assert counts(stocked) == before
        with Book.open(stocked.target) as book:
            assert book.check() == []
    with Book.open(stocked.target) as book:
        assert book.load(large).added["run"] == ROWS
        assert str(book.load(large)).startswith(f"nothing new; {ROWS} rows")
        assert book.check() == []


def test_the_command_killed_at_several_times_leaves_all_or_nothing(stocked, large):
    """`labbook load` killed after growing waits, so that some kill falls near the commit on any machine."""
    stocked.close()
    outcomes = []
    for wait in (0.05, 0.1, 0.2, 0.4, 0.8, 1.6, 3.2, 6.4, 12.8, 25.6):
        process = SYSTEM.Process(target=main, args=(["load", str(stocked.target), str(large)],))
        process.start()
        process.join(wait)
        if process.is_alive():
            os.kill(process.pid, signal.SIGKILL)
        process.join(60)
        with Book.open(stocked.target) as book:
            outcomes.append(len(book.runs(columns=())))
            assert book.check() == []
        if outcomes[-1]:
            break
    assert outcomes[0] == 0 and set(outcomes) == {0, ROWS}


def test_a_process_killed_while_logging_keeps_what_it_acknowledged(stocked):
    stocked.close()
    process = writer(stocked.target, 500)
    acknowledged = [process.lines.readline().strip() for _ in range(7)]
    rest = process.kill()
    with Book.open(stocked.target) as book:
        kept = set(book.runs()["code"])
        assert {c for c in [*acknowledged, *rest] if c.startswith("R-")} <= kept
        assert len(kept) < 500
        assert book.check() == []
        assert book.record(swimmer="reed-1", fluid="syrup", f="1 Hz") not in acknowledged


def test_copies_while_another_process_writes_are_books(stocked, tmp_path):
    stocked.close()
    process = writer(stocked.target, 400)
    process.lines.readline()
    sizes = []
    with Book.open(stocked.target) as book:
        for i in range(4):
            book.copy(tmp_path / f"copy-{i}.db")
            time.sleep(0.05)
    still_writing = process.process.is_alive()
    process.kill()
    assert still_writing, "the writer ended before the copies were made"
    for i in range(4):
        with Book.open(tmp_path / f"copy-{i}.db") as copy:
            assert copy.check() == []
            sizes.append(len(copy.runs(columns=())))
            assert copy.record(swimmer="reed-1", fluid="syrup", f="1 Hz") == f"R-{sizes[-1] + 1:04d}"
    assert sizes == sorted(sizes) and sizes[0] >= 1
    assert not list(tmp_path.glob("*.part*"))
