"""The Book: the one public face of a group's notebook, for Python, the command line and the app."""

from collections.abc import Callable, Mapping, Sequence
from pathlib import Path

import pandas as pd

from labbook.book import (
    attaching,
    checking,
    copying,
    defining,
    ledger,
    loading,
    opening,
    plan_proposals,
    plan_setting,
    published_points,
    queries,
    run_sheet,
    stocking,
    track_checking,
)
from labbook.book import preview as previewing
from labbook.book.asking import Question
from labbook.book.dialect_columns import Dialects
from labbook.book.loading import Loaded, Progress
from labbook.book.registry_rows import registry_of
from labbook.errors import Refusal
from labbook.exchange import sheets, track_reducing
from labbook.exchange.collector import paused_collector
from labbook.places import current_handle, default_book
from labbook.registry.group import Registry
from labbook.registry.regimes import Regime


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

    @property
    def registry(self) -> Registry:
        """The registry as the book has it now: numbers, regimes, house dialects."""
        return self.ask(registry_of)

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
        """Add a fluid, material, swimmer, rig, reading or published point, or amend one with a reason; returns its code
        (a point's series)."""
        if kind == "published":
            return published_points.add_point(self.engine, _texts(cells), by or current_handle(), confirm=confirm)
        return stocking.stock(self.engine, kind, _texts(cells), by or current_handle(), why=why, confirm=confirm)

    def retire(self, kind: str, code: str, *, why: str, by: str | None = None, back: bool = False) -> None:
        """Retire a fluid, material, swimmer or rig: kept, but no longer offered first."""
        stocking.retire(self.engine, kind, code, why, by or current_handle(), back=back)

    def define_number(
        self, *, why: str | None = None, by: str | None = None, progress: Callable[[int], None] = lambda n: None,
        **cells: str,
    ) -> int:  # fmt: skip
        """Add a number of the group's own (key name formula compares source example answer), or, with a reason, a
        new version of one; returns its version."""
        return defining.define_number(self.engine, _texts(cells), by or current_handle(), why=why, progress=progress)

    def adopt_dialect(
        self, number: str, choices: Mapping[str, object], *, why: str, by: str | None = None,
        progress: Callable[[int], None] = lambda n: None,
    ) -> dict:  # fmt: skip
        """Make a dialect the group's house dialect of a number: the book is derived again; returns before and after."""
        return defining.adopt_dialect(self.engine, number, choices, why, by or current_handle(), progress)

    def set_regime(self, regime: Regime, *, why: str, by: str | None = None) -> tuple[int, int]:
        """Add or change a regime; returns how many kept runs lay in it before and lie in it now."""
        return defining.set_regime(self.engine, regime, why, by or current_handle())

    def withdraw(self, kind: str, key: str, *, why: str, by: str | None = None) -> None:
        """Take an own number, a regime or a published series out of use, with a reason; it stays in the book."""
        acts = {"number": defining.withdraw_number, "regime": defining.withdraw_regime,
                "published": published_points.withdraw_series}
        if kind not in acts:
            raise Refusal("kind", kind, "cannot be withdrawn", "number, regime or published")
        acts[kind](self.engine, key, why, by or current_handle())

    def load(
        self, path: str | Path, *, by: str | None = None, confirm: bool = False,
        progress: Progress = lambda what, n: None,
    ) -> Loaded:  # fmt: skip
        """Load a shelf folder, a workbook or one CSV file, whole or not at all."""
        name = Path(path).resolve().name
        return self.load_tables(sheets.read_tables(path), name, by=by, confirm=confirm, progress=progress)

    def load_tables(
        self, tables: Sequence[sheets.Table], subject: str, *, by: str | None = None, confirm: bool = False,
        progress: Progress = lambda what, n: None,
    ) -> Loaded:  # fmt: skip
        """Load sheets that are read already."""
        with paused_collector():
            return self._load(tables, subject, by or current_handle(), confirm, progress)

    def _load(self, tables, subject, by, confirm, progress) -> Loaded:
        # a call of its own, so that the rows are gone before the collector is back
        rows, refused = sheets.read_rows(list(tables), progress)
        return loading.load(self.engine, rows, by, subject=subject, refused=refused, confirm=confirm, progress=progress)

    def attach_track(
        self, code: str, content: bytes, name: str, settings: Mapping | None = None,
        accept: Sequence[str] = ("U", "A_tip", "f"), *, by: str | None = None, why: str | None = None,
        confirm: bool = False, made: track_reducing.Made | None = None,
    ):  # fmt: skip
        """Reduce a track for a run, attach it and return the Reduction; settings, made: as track_reducing has them."""
        given = attaching.conditions(self.engine, code)
        made = track_reducing.reduce_track(content, name, settings or {}, given, made)
        attaching.attach(self.engine, code, content, name, made.reduction, made.settings, accept,
                         by or current_handle(), why, confirm=confirm)  # fmt: skip
        return made.reduction

    # ---- questions

    def runs(
        self, *, regime: str | Sequence[str] = (), ranges: Mapping[str, tuple[float, float]] | None = None,
        kept: bool = True, state: str | None = None, fluid: str | Sequence[str] = (),
        swimmer: str | Sequence[str] = (), material: str | Sequence[str] = (),
        person: str | Sequence[str] = (), series: str | Sequence[str] = (), since: str | None = None,
        until: str | None = None, text: str | None = None, columns: Sequence[str] | None = None,
        dialects: Dialects | None = None,
    ) -> pd.DataFrame:  # fmt: skip
        """One row a run, oldest first: text columns, every key in SI, u_<key>, u_own_<key>, u_shared_<key>.

        Regimes mean *and*; several fluids, swimmers, ... mean *or*; ranges are inclusive, in SI, numbers in
        the house dialect. kept=False includes void runs; columns: the keys wanted, all if left out.
        dialects: e.g. {"Sp": {"rate": "f", "power": 1}}: the columns of Sp are restated (ranges and regimes stay in
        the house dialect), attrs['dialects'] says so, attrs['lost'] why a run has no such value.
        attrs['units'] maps key to SI unit, attrs['question'] says what was asked.
        """
        question = Question(
            _several(regime), dict(ranges or {}), _several(fluid), _several(swimmer), _several(material),
            _several(person), _several(series), since, until, text, state or ("kept" if kept else "all"),
        )  # fmt: skip
        keys = tuple(columns) if columns is not None else None
        return self.frame(question, keys=keys, dialects=dialects)

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

    def sheets(
        self, question: Question, newest: int | None = None, dialects: Dialects | None = None
    ) -> list[run_sheet.RunSheet]:
        """Everything about each run of a question, some numbers in other dialects if asked."""
        with opening.reading(self.engine) as connection:
            return list(run_sheet.sheets(connection, question, newest, dialects))

    def sheet(self, code: str) -> run_sheet.RunSheet:
        """Everything about one run."""
        return self.ask(run_sheet.run_sheet, code)

    def preview(self, **cells: str) -> previewing.Preview:
        """What logging these cells would give, without logging them."""
        return self.ask(previewing.preview, cells)

    def plan(self, swimmer: str, *, fluids: Sequence[str] = (), **cells: str) -> plan_setting.Plan:
        """What a swimmer's next runs go by; planning, plan_zones and plan_inverse (of book) are asked with it."""
        return self.ask(plan_setting.plan_of, swimmer, _texts(cells), fluids)

    def propose(self, plan: plan_setting.Plan, n: int = 5, **options):
        """The next n runs that fill a gap or pin down the maximum, as Proposals; options as in plan_proposals.propose."""
        return self.ask(plan_proposals.propose, plan, n, **options)

    def check(self, progress: Callable[[int], None] = lambda n: None) -> list[str]:
        """Everything that is wrong with the book, one sentence each; an empty list is a clean book."""
        found = checking.check(self.engine, progress)
        return found + track_checking.reduced_otherwise(self.engine, track_reducing.reduce_track, progress)

    def copy(self, target: str | Path) -> None:
        """Write a consistent copy to a new file while others may be writing."""
        copying.copy(self.engine, target)


def _texts(cells: Mapping) -> dict[str, str]:
    return {k: str(v) for k, v in cells.items() if v is not None}


def _several(given: str | Sequence[str]) -> tuple[str, ...]:
    return (given,) if isinstance(given, str) else tuple(given)
