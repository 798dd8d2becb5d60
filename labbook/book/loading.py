"""Many records in one act: a sheet or a shelf folder, whole or not at all, and the same one twice adds nothing."""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import NamedTuple

from sqlalchemy import Connection, Engine, select

from labbook.book import chain
from labbook.book.arrivals import Arrival, Findings, place_runs
from labbook.book.drafts import Draft, fingerprints, read_draft
from labbook.book.ledger import cells_of, handle, settle, uses
from labbook.book.opening import writing
from labbook.book.published_points import put_points
from labbook.book.records import LOADING_ORDER
from labbook.book.run_rows import derive_again
from labbook.book.stocking import Batches, put, stocked_cells, write_reading
from labbook.book.tables import SHELF, reading, run
from labbook.errors import Refusal


class SheetRow(NamedTuple):
    """One row of a sheet as read: its draft and where it stands ('runs.csv line 12')."""

    draft: Draft
    where: str


@dataclass(frozen=True)
class Loaded:
    """What a load added, by kind, and how many rows stood in the book already."""

    added: dict[str, int]
    known: int
    derived_again: int
    warned: tuple[str, ...] = ()

    def __str__(self) -> str:
        parts = [f"{n} {kind}{'s' if n != 1 else ''}" for kind, n in self.added.items() if n]
        text = f"added {', '.join(parts)}" if parts else "nothing new"
        if self.known:
            text += f"; {self.known} row{'s' if self.known != 1 else ''} stood in the book already"
        return text


Progress = Callable[[str, int], None]


def load(
    engine: Engine,
    rows: Sequence[SheetRow],
    by: str,
    *,
    subject: str,
    refused: Sequence[Refusal] = (),
    confirm: bool = False,
    progress: Progress = lambda what, n: None,
) -> Loaded:
    """Write all rows in one transaction, or none; `refused` are the findings of reading the sheet.

    Errors: Refusals with every bad row, Unconfirmed with every warning.
    """
    by = handle(by)
    findings = Findings(refused=list(refused))
    kinds: dict[str, list[SheetRow]] = {name: [] for name in LOADING_ORDER}
    for row in rows:
        kinds[row.draft.kind].append(row)
    with writing(engine) as connection:
        added: dict[str, int] = {}
        known = 0
        for name in ("fluid", "material", "swimmer", "rig"):
            fresh = _fresh_shelf(connection, name, kinds[name], findings)
            added[name], known = len(fresh), known + len(kinds[name]) - len(fresh)
            progress(f"{name}s", len(kinds[name]))
        touched, added["reading"] = _readings(connection, kinds["reading"], findings)
        known += len(kinds["reading"]) - added["reading"]
        progress("readings", len(kinds["reading"]))
        again = []
        if not findings.refused:
            for condition in touched:
                again += derive_again(connection, condition)
            again = sorted(set(again))
        arrivals = _arrivals(connection, kinds["run"], findings)
        known += len(kinds["run"]) - len(arrivals)
        progress("runs known already", len(kinds["run"]) - len(arrivals))
        written = place_runs(
            connection, arrivals, by, findings, confirm=confirm, progress=lambda n: progress("runs", n)
        )
        added["run"] = len(written)
        points = [(r.draft, r.where) for r in kinds["published"]]
        added["published point"] = put_points(connection, points, findings)
        known += len(points) - added["published point"]
        progress("published points", len(points))
        settle(findings, confirm)
        if any(added.values()):
            chain.append(
                connection, by, "load", "sheet", subject,
                after={"added": {k: n for k, n in added.items() if n},
                       "confirmed": [s for _, s in findings.warned]},
                runs=[*again, *written],
            )  # fmt: skip
    return Loaded(added, known, len(again), tuple(s for _, s in findings.warned))


def _fresh_shelf(connection, name, rows: list[SheetRow], findings: Findings) -> list[SheetRow]:
    """Insert the shelf rows that the book does not hold; an equal one is passed over, another refused."""
    table = SHELF[name]
    fresh, here = [], {}
    stored = {r["code"]: r for r in connection.execute(select(table)).mappings()}
    for row in _parents_first(rows) if name == "swimmer" else rows:
        code = row.draft.text("code")
        if not code:  # refused when the sheet was read
            continue
        if code in here:
            findings.refuse(row.where, Refusal("code", code, f"stands twice, first in {here[code]}"))
            continue
        here[code] = row.where
        if code in stored:
            before, _ = read_draft(name, stocked_cells(connection, name, stored[code]))
            _refuse_difference(before.content(), row, code, findings)
            continue
        draft = row.draft
        if findings.refused:
            # put all the same, so that rows which name it are not refused too: nothing of it will stay
            draft = draft.filled(kind="", form="")
        try:
            put(connection, name, draft)
        except Refusal as refusal:
            findings.refuse(row.where, refusal)
            continue
        findings.warned += [(c, f"{row.where}, {s}") for c, s in row.draft.warned]
        fresh.append(row)
    return fresh


def _parents_first(rows: list[SheetRow]) -> list[SheetRow]:
    """Swimmers ordered so that a parent precedes those cut from it."""
    waiting, codes, ordered = list(rows), {r.draft.text("code") for r in rows}, []
    placed: set = set()
    while waiting:
        ready = [r for r in waiting if (p := r.draft.text("parent")) not in codes or p in placed]
        ready = ready or waiting  # a circle: let the reference check name it
        ordered += ready
        placed |= {r.draft.text("code") for r in ready}
        done = {id(r) for r in ready}
        waiting = [r for r in waiting if id(r) not in done]
    return ordered


def _refuse_difference(before: dict, row: SheetRow, code: str, findings: Findings) -> None:
    after = row.draft.content()
    differs = [k for k in {**before, **after} if before.get(k) != after.get(k)]
    if differs:
        findings.refuse(
            row.where,
            Refusal(row.draft.kind, code, f"differs from the book in {', '.join(differs)}", "amend it"),
        )


def _numbered(rows: list[SheetRow]) -> list[tuple[SheetRow, str]]:
    """Each row with its fingerprint and which equal row of the sheet it is, so that honest repeats survive."""
    seen: dict[str, int] = {}
    numbered = []
    for row, print_ in zip(rows, fingerprints(row.draft for row in rows), strict=True):
        seen[print_] = nth = seen.get(print_, 0) + 1
        numbered.append((row, f"{print_}:{nth}"))
    return numbered


def _readings(connection: Connection, rows: list[SheetRow], findings: Findings):
    """Insert new readings; returns the conditions of the runs they may touch, and how many are new."""
    numbered = _numbered(rows)
    stored = set(connection.scalars(select(reading.c.sheet_row).where(reading.c.sheet_row.is_not(None))))
    batches = Batches(connection, [r.draft for r in rows])
    targets, added = {}, 0
    for row, sheet_row in numbered:
        if sheet_row in stored:
            continue
        batch = batches.of(row.draft, row.where, findings)
        if batch is None or "value" not in row.draft.typed:
            continue
        if not findings.refused:
            batches.watch(batch, row.draft, row.where, findings)
            findings.warned += [(c, f"{row.where}, {s}") for c, s in row.draft.warned]
            write_reading(connection, row.draft, batch, sheet_row)
        targets[tuple(batch.target().items())] = uses(**batch.target())
        added += 1
    return list(targets.values()), added


def _arrivals(connection: Connection, rows: list[SheetRow], findings: Findings) -> list[Arrival]:
    """The run rows that the book does not hold yet."""
    numbered = _numbered(rows)
    stored = _stored_rows(connection, [s for _, s in numbered])
    coded = {r.draft.text("code") for r in rows} - {None}
    in_book = _coded_runs(connection, coded)
    fresh, here = [], {}
    for row, sheet_row in numbered:
        code = row.draft.text("code")
        if sheet_row in stored:
            continue
        if code is not None:
            if code in here:
                findings.refuse(row.where, Refusal("code", code, f"stands twice, first in {here[code]}"))
                continue
            here[code] = row.where
            if code in in_book:
                known = _known(connection, in_book[code], row.draft)
                # what the book filled in is no difference: who, and the default drive
                told = {k: v for k, v in known.items() if k in row.draft.content() or k not in ("by", "drive", "state")}
                told["code"] = code
                _refuse_difference(told, row, code, findings)
                continue
        fresh.append(Arrival(row.draft, row.where, sheet_row))
    return fresh


def _known(connection, row, draft: Draft) -> dict[str, str]:
    """What the book holds of a run, for comparing a draft with it: beside a track's value the typed one counts too."""
    with_track, typed = (read_draft("run", cells_of(connection, row, track=on))[0].content() for on in (True, False))
    told = draft.content()
    return {k: v for k, v in with_track.items() if typed.get(k) == v or told.get(k) != typed.get(k)} | {
        k: v for k, v in typed.items() if told.get(k) == v
    }


def _stored_rows(connection, wanted: list[str]) -> set[str]:
    found: set[str] = set()
    if connection.scalar(select(run.c.id).where(run.c.sheet_row.is_not(None)).limit(1)) is None:
        return found
    for start in range(0, len(wanted), 900):
        part = wanted[start : start + 900]
        found |= set(connection.scalars(select(run.c.sheet_row).where(run.c.sheet_row.in_(part))))
    return found


def _coded_runs(connection, codes: set[str]) -> dict:
    found = {}
    ordered = sorted(codes)
    for start in range(0, len(ordered), 900):
        query = select(run).where(run.c.code.in_(ordered[start : start + 900]))
        found |= {r["code"]: r for r in connection.execute(query).mappings()}
    return found
