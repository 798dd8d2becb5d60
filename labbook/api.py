"""The Book: the one public face of a group's notebook, for Python, the command line and the app."""

import gc
import getpass
import os
from collections.abc import Callable, Mapping, Sequence
from contextlib import contextmanager
from pathlib import Path

import pandas as pd
from platformdirs import user_data_path

from labbook.book import checking, copying, ledger, loading, opening, queries, run_sheet, stocking
from labbook.book import preview as previewing
from labbook.book.asking import Question
from labbook.book.loading import Loaded, Progress
from labbook.book.stored_view import KEYS
from labbook.errors import LabbookError
from labbook.exchange import sheets

DEMO = "demo.db"
OWN = "bench.db"


def data_folder() -> Path:
    """Where a user's books live on this system."""
    return user_data_path("labbook", appauthor=False)


def default_book() -> str:
    """The book that is meant when none is named: LABBOOK_BOOK, else bench.db in the user's data folder."""
    return os.environ.get("LABBOOK_BOOK") or str(data_folder() / OWN)


def current_handle() -> str:
    """Who acts when nobody is named: LABBOOK_BY, else the system user."""
    try:
        return os.environ.get("LABBOOK_BY") or getpass.getuser()
    except (KeyError, OSError, ImportError):
        return ""  # a user without a name, as in a container: the act then asks for --by


def demo_folder() -> Path:
    """The shelf folder of the demo: inside an installed package, or beside it in a checkout."""
    package = Path(__file__).resolve().parent
    installed = package / "_data" / "seeds_demo"
    return installed if installed.is_dir() else package.parent / "seeds_demo"


class Book:
    """A group's notebook: a file or a database URL. Make one with `Book.new`, open one with `Book.open`.

    Every act takes `by` (a handle; left out: LABBOOK_BY, else the system user) and leaves one ledger line.
    Errors: Refusal or Refusals where an input is refused, Unconfirmed where a warning wants confirm=True,
    BookProblem where the file or database itself is the trouble; nothing is written then.
    """

    def __init__(self, engine, target: str):
        self.engine = engine
        self.target = target

    @classmethod
    def new(cls, target: str | Path) -> "Book":
        """Make an empty book; refused where something stands already."""
        return cls(opening.create(target), str(target))

    @classmethod
    def open(cls, target: str | Path | None = None, progress: Callable[[int], None] = lambda n: None) -> "Book":
        """Open a book; a stored view that another registry built is rebuilt first."""
        target = str(target) if target is not None else default_book()
        book = cls(opening.open_existing(target), target)
        if checking.out_of_date(book.engine):
            checking.rebuild(book.engine, "labbook", "the registry has changed", progress)
        return book

    @property
    def name(self) -> str:
        """What to call the book on a page: the file's name, or the database's."""
        return Path(str(self.engine.url.database)).name

    def close(self) -> None:
        """Let go of the database."""
        self.engine.dispose()

    def __enter__(self) -> "Book":
        return self

    def __exit__(self, *_) -> None:
        self.close()

    # ---- acts

    def record(
        self, *, by: str | None = None, at: str | None = None, confirm: bool = False,
        token: str | None = None, **cells: str,
    ) -> str:  # fmt: skip
        """Log one run from cells as typed, e.g. f="0.5 Hz", U="1.2(1) mm/s"; returns its code."""
        cells = _texts(cells) | ({"at": str(at)} if at is not None else {})
        return ledger.record(self.engine, cells, by or current_handle(), confirm=confirm, token=token).code

    def amend(self, code: str, /, *, why: str, by: str | None = None, confirm: bool = False, **changes) -> None:
        """Change cells of a run (None clears one); the old values stay in the ledger with the reason."""
        wanted = {k: None if v is None else str(v) for k, v in changes.items()}
        ledger.amend(self.engine, code, wanted, why, by or current_handle(), confirm=confirm)

    def void(self, code: str, *, why: str, by: str | None = None) -> None:
        """Mark a run (or a reading) void, with a reason; nothing is deleted."""
        ledger.void(self.engine, code, why, by or current_handle())

    def stock(
        self, kind: str, /, *, by: str | None = None, why: str | None = None, confirm: bool = False, **cells: str
    ) -> str:
        """Add a fluid, material, swimmer, rig or reading, or amend one with a reason; returns its code."""
        return stocking.stock(
            self.engine, kind, _texts(cells), by or current_handle(), why=why, confirm=confirm
        )

    def retire(self, kind: str, code: str, *, why: str, by: str | None = None, back: bool = False) -> None:
        """Retire a fluid, material, swimmer or rig: kept, but no longer offered first."""
        stocking.retire(self.engine, kind, code, why, by or current_handle(), back=back)

    def load(
        self, path: str | Path, *, by: str | None = None, confirm: bool = False,
        progress: Progress = lambda what, n: None,
    ) -> Loaded:  # fmt: skip
        """Load a shelf folder, a workbook or one CSV file, whole or not at all."""
        return self.load_tables(
            sheets.read_tables(path), Path(path).resolve().name, by=by, confirm=confirm, progress=progress
        )

    def load_tables(
        self, tables: Sequence[sheets.Table], subject: str, *, by: str | None = None, confirm: bool = False,
        progress: Progress = lambda what, n: None,
    ) -> Loaded:  # fmt: skip
        """Load sheets that are read already."""
        with _without_collector():
            rows, refused = sheets.read_rows(list(tables), progress)
            return loading.load(
                self.engine, rows, by or current_handle(), subject=subject, refused=refused, confirm=confirm,
                progress=progress,
            )  # fmt: skip

    # ---- questions

    def runs(
        self, *, regime: str | Sequence[str] = (), ranges: Mapping[str, tuple[float, float]] | None = None,
        kept: bool = True, state: str | None = None, fluid: str | Sequence[str] = (),
        swimmer: str | Sequence[str] = (), material: str | Sequence[str] = (),
        person: str | Sequence[str] = (), series: str | Sequence[str] = (), since: str | None = None,
        until: str | None = None, text: str | None = None, columns: Sequence[str] | None = None,
    ) -> pd.DataFrame:  # fmt: skip
        """One row a run, oldest first: text columns, every key in SI, u_<key>, u_own_<key>, u_shared_<key>.

        Regimes mean *and*; several fluids, swimmers, ... mean *or*; ranges are inclusive, in SI, numbers in
        the house dialect. kept=False includes void runs; columns: the keys wanted, all if left out.
        attrs['units'] maps key to SI unit, attrs['question'] says what was asked.
        """
        question = Question(
            _several(regime), dict(ranges or {}), _several(fluid), _several(swimmer), _several(material),
            _several(person), _several(series), since, until, text, state or ("kept" if kept else "all"),
        )  # fmt: skip
        return self.frame(question, keys=tuple(columns) if columns is not None else KEYS)

    def frame(self, question: Question, **options) -> pd.DataFrame:
        """The frame of a question; options as in queries.frame."""
        with opening.reading(self.engine) as connection:
            found = queries.frame(connection, question, **options)
        found.attrs["question"] = question.in_words()
        return found

    def ask(self, query: Callable, *arguments, **options):
        """Call a function of book.queries (or one like it) with a connection that only reads."""
        with opening.reading(self.engine) as connection:
            return query(connection, *arguments, **options)

    def sheets(self, question: Question, newest: int | None = None) -> list[run_sheet.RunSheet]:
        """Everything about each run of a question."""
        with opening.reading(self.engine) as connection:
            return list(run_sheet.sheets(connection, question, newest))

    def sheet(self, code: str) -> run_sheet.RunSheet:
        """Everything about one run."""
        return self.ask(run_sheet.run_sheet, code)

    def preview(self, **cells: str) -> previewing.Preview:
        """What logging these cells would give, without logging them."""
        return self.ask(previewing.preview, cells)

    def check(self, progress: Callable[[int], None] = lambda n: None) -> list[str]:
        """Everything that is wrong with the book, one sentence each; an empty list is a clean book."""
        return checking.check(self.engine, progress)

    def copy(self, target: str | Path) -> None:
        """Write a consistent copy to a new file while others may be writing."""
        copying.copy(self.engine, target)


@contextmanager
def _without_collector():
    """A big sheet makes millions of small objects and no circle: looking for one takes a fifth of the time."""
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()


def _texts(cells: Mapping) -> dict[str, str]:
    return {k: str(v) for k, v in cells.items() if v is not None}


def _several(given: str | Sequence[str]) -> tuple[str, ...]:
    return (given,) if isinstance(given, str) else tuple(given)


def make_demo(target: Path, progress: Progress = lambda what, n: None) -> Book:
    """Make the demo book: the shelf folder loaded, then a few entries amended as a group would."""
    target.parent.mkdir(parents=True, exist_ok=True)
    part = target.with_name(target.name + ".part")
    for name in (part, Path(f"{part}-wal"), Path(f"{part}-shm")):
        name.unlink(missing_ok=True)
    book = Book.new(part)
    try:
        book.load(demo_folder(), by="sable", progress=progress)
        _amend_demo(book)
    except LabbookError:
        book.close()
        raise
    book.copy(target)
    book.close()
    for name in (part, Path(f"{part}-wal"), Path(f"{part}-shm")):
        name.unlink(missing_ok=True)
    return Book.open(target)


def _amend_demo(book: Book) -> None:
    runs = book.runs(columns=("f", "T"))
    slow = runs[runs["T"].notna()].iloc[[40, 210, 480]]
    reasons = (
        ("note", "camera focus checked afterwards", "note was forgotten"),
        ("series", "recounted", "belongs to the recount"),
        ("T", "21.9 degC", "thermometer read again from the photograph"),
    )
    for code, by, (column, value, why) in zip(slow["code"], slow["by"], reasons, strict=True):
        book.amend(code, by=by, why=why, confirm=True, **{column: value})
