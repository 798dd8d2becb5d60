"""New runs, one or a hundred thousand: references found, identity settled, derived, warned about, written."""

import json
from collections.abc import Callable, Iterable, Sequence
from dataclasses import dataclass, field
from itertools import count
from typing import NamedTuple

import numpy as np
from sqlalchemy import Connection, Table, func, select

from labbook.book.bulk import write_many
from labbook.book.clock import now
from labbook.book.derive import BATCH, derive
from labbook.book.drafts import Draft, in_columns, typed_in_json
from labbook.book.plausibility import KnownRuns, enough_runs, run_warnings
from labbook.book.records import KINDS
from labbook.book.registry_rows import registry_of
from labbook.book.run_facts import facts_of_cells
from labbook.book.run_rows import FACTS, stored_rows, write_stored
from labbook.book.shelf import Item, Shelf, read_shelf
from labbook.book.stored_view import BIRTH_KEYS
from labbook.book.tables import fluid, rig, run, swimmer
from labbook.errors import Refusal
from labbook.registry.group import Registry

RUN_COLUMNS = (
    "id", "code", "serial", "swimmer_id", "fluid_id", "rig_id", "at", "by", "drive", "series", "video", "note",
    "state", "why", "typed", "confirmed", "logged", "token", "sheet_row",
)  # fmt: skip
_REFERS = {"swimmer": swimmer, "fluid": fluid, "rig": rig}
FEW = 20  # runs that are compared by a query each; more are compared with a swimmer's runs read at once
LAST_SERIAL = 900_000_000  # the codes that the book gives itself never reach it
PLACE = {k: 3 * i for i, k in enumerate(BIRTH_KEYS)}


class Arrival(NamedTuple):
    """One run's draft, where it stands ('runs.csv line 12', '' for the form), and what makes it unique."""

    draft: Draft
    where: str = ""
    sheet_row: str | None = None
    token: str | None = None


@dataclass
class Findings:
    """What an act has found so far: refusals stop it, warnings want a confirmation."""

    refused: list[Refusal] = field(default_factory=list)
    warned: list[tuple[str, str]] = field(default_factory=list)  # (column, sentence)

    def refuse(self, where: str, refusal: Refusal) -> None:
        """Keep a refusal, said with the place it stands at."""
        self.refused.append(placed(where, refusal))


def placed(where: str, refusal: Refusal) -> Refusal:
    """The refusal with its place before the field."""
    if not where:
        return refusal
    return Refusal(f"{where}, {refusal.field}", refusal.typed, refusal.reason, refusal.remedy)


def ids_of(connection: Connection, table: Table, codes: Iterable[str]) -> dict[str, int]:
    """Ids of the records with these codes; unknown codes are left out."""
    codes = {c for c in codes if c}
    query = select(table.c.code, table.c.id)
    if len(codes) <= 500:
        query = query.where(table.c.code.in_(codes))
    return {code: id_ for code, id_ in connection.execute(query) if code in codes}


def unknown(connection: Connection, table: Table, column: str, code: str) -> Refusal:
    """The refusal of a code that the shelf does not hold, naming what it does."""
    known = connection.scalars(select(table.c.code).order_by(table.c.id.desc()).limit(8)).all()
    remedy = f"the book has {', '.join(known)}" if known else f"add the {table.name} to the shelf first"
    return Refusal(column, code, f"no {table.name} has this code", remedy)


def place_runs(
    connection: Connection,
    arrivals: list[Arrival],
    by: str,
    findings: Findings,
    *,
    confirm: bool,
    progress: Callable[[int], None] | None = None,
) -> list[tuple[int, str]]:
    """Write new runs and their stored rows; returns their (id, code).

    Adds to `findings` what is refused or warned; where anything is refused, or a warning is not confirmed,
    the caller must abandon the transaction.
    """
    cells = in_columns(a.draft for a in arrivals)
    named = {k: {cell.text for cell in cells.get(k, ())} - {None} for k in _REFERS}
    found = {k: ids_of(connection, table, named[k]) for k, table in _REFERS.items()}
    if findings.refused or any(named[k] - found[k].keys() for k in _REFERS):
        # some lack what they refer to; the others are still looked at, so that everything is said at once
        arrivals = [a for a in arrivals if _references_stand(connection, a, found, findings)]
    shelf = read_shelf(connection, *(found[k].values() for k in ("swimmer", "fluid", "rig")))
    for arrival in arrivals:
        fits_swimmer(arrival, shelf.swimmers[found["swimmer"][arrival.draft.text("swimmer")]], findings)
    if findings.refused:
        return []
    codes = _codes(connection, [a.draft.text("code") for a in arrivals])
    next_id = (connection.scalar(select(func.max(run.c.id))) or 0) + 1
    enough = enough_runs(connection, found["swimmer"].values(), next_id)
    known = KnownRuns(connection, next_id) if len(arrivals) > FEW else None
    write = _Writer(connection, found, shelf, registry_of(connection), by, findings, confirm, next_id, enough, known)
    written = []
    for start in range(0, len(arrivals), BATCH):
        here = slice(start, start + BATCH)
        part = arrivals[here]
        ids = range(next_id + start, next_id + start + len(part))
        written += write.batch(part, {c: column[here] for c, column in cells.items()}, ids, codes[here])
        if progress is not None:
            progress(len(part))
    return written


def _references_stand(connection, arrival: Arrival, found, findings: Findings) -> bool:
    stands, text = True, arrival.draft.text
    for column, table in _REFERS.items():
        code = text(column)
        if code is not None and code not in found[column]:
            findings.refuse(arrival.where, unknown(connection, table, column, code))
            stands = False
    return stands and None not in (text("swimmer"), text("fluid"), text("at"))


def fits_swimmer(arrival: Arrival, of: Item, findings: Findings) -> bool:
    """Whether a run is possible with this swimmer: no wall inside its head."""
    wall, head = arrival.draft.quantity("h_wall"), of.value("b")
    if wall is not None and head is not None and wall.value <= head:
        findings.refuse(
            arrival.where,
            Refusal("h_wall", wall.text, f"the wall would be closer than the head radius of {of.code}",
                    "h_wall is measured from the axis"),
        )  # fmt: skip
        return False
    return True


def default_drive(of: Item) -> str:
    """The drive of a run that names none."""
    if of.texts["form"] == "helix":
        return "field"
    return "free_head_angle" if of.value("b") is not None else "pivoted_angle"


def _codes(connection, own: list[str | None]) -> list[str]:
    """Each run's code: its own, else the next free R-number."""
    serial = connection.scalar(select(func.max(run.c.serial))) or 0
    free = count(1 + max([serial, *(serial_of(code) or 0 for code in own if code)]))
    return [code or f"R-{next(free):04d}" for code in own]


def serial_of(code: str) -> int | None:
    """The 12 of 'R-0012', None for another code."""
    stem, _, number = code.partition("-")
    if stem != "R" or not number.isdecimal() or len(number) > 9:
        return None
    return int(number) if int(number) <= LAST_SERIAL else None


@dataclass
class _Writer:
    """Derives, checks and writes arrivals, a batch at a time."""

    connection: Connection
    found: dict[str, dict[str, int]]
    shelf: Shelf
    registry: Registry
    by: str
    findings: Findings
    confirm: bool
    first_id: int
    enough: set[int]
    known: KnownRuns | None
    logged: str = field(default_factory=now)

    def batch(self, arrivals, cells, ids, codes) -> list[tuple[int, str]]:
        """Write a batch; nothing is written, and nothing returned, while a warning is not confirmed."""
        columns = self._columns(arrivals, cells, ids, codes)
        told = (columns[c] for c in ("swimmer_id", "fluid_id", "rig_id", "at", "drive"))
        facts = facts_of_cells(cells, *told)
        derived = derive(facts, self.shelf, self.registry)
        warned = self._warnings(arrivals, cells, columns, derived.floats)
        if self.findings.warned and not self.confirm:
            return []
        columns["confirmed"] = [warned.get(i) for i in range(len(arrivals))]
        runs = list(zip(*(columns[c] for c in RUN_COLUMNS), strict=True))
        write_many(self.connection, run, RUN_COLUMNS, runs)
        rows = list(zip(*(columns[c.name] for c in FACTS), columns["typed"], strict=True))
        write_stored(self.connection, *stored_rows(rows, derived))
        return list(zip(ids, codes, strict=True))

    def _columns(self, arrivals, cells, ids, codes) -> dict[str, Sequence]:
        """What the table of runs gets, but for what was confirmed: column -> a value a run."""

        def texts(column, absent=None):
            if column not in cells:
                return [absent] * len(arrivals)
            return [cell.text or absent for cell in cells[column]]

        swimmers = [self.found["swimmer"][code] for code in texts("swimmer")]
        usual = {i: default_drive(item) for i, item in self.shelf.swimmers.items()}
        return {
            "id": ids, "code": codes, "serial": [serial_of(code) for code in codes], "swimmer_id": swimmers,
            "fluid_id": [self.found["fluid"][code] for code in texts("fluid")],
            "rig_id": [self.found["rig"].get(code) for code in texts("rig")],
            "at": texts("at"), "by": texts("by", self.by),
            "drive": [drive or usual[i] for drive, i in zip(texts("drive"), swimmers, strict=True)],
            **{c: texts(c) for c in ("series", "video", "note", "why")}, "state": texts("state", "kept"),
            "typed": typed_in_json(a.draft for a in arrivals), "logged": [self.logged] * len(arrivals),
            "token": [a.token for a in arrivals], "sheet_row": [a.sheet_row for a in arrivals],
        }  # fmt: skip

    def _warnings(self, arrivals, cells, columns, floats) -> dict[int, str]:
        """Index of the run -> its warnings as stored; all of them go into `findings` too."""
        typed = [cells[c] for c in KINDS["run"].typed if c in cells]
        suspects = {i for column in typed for i, cell in enumerate(column) if cell.warning}
        of = columns["swimmer_id"]
        compared = {i for i, state in enumerate(columns["state"]) if state == "kept" and of[i] in self.enough}
        told: dict[int, str] = {}
        for i in sorted(suspects | compared):
            mine = arrivals[i].draft.warned
            if i in compared:
                mine += run_warnings(self.connection, of[i], watched(floats[i]), self.first_id, known=self.known)
            if mine:
                told[i] = json.dumps(mine, ensure_ascii=False)
                lead = f"{arrivals[i].where}, " if arrivals[i].where else ""
                self.findings.warned += [(column, lead + sentence) for column, sentence in mine]
        return told


def watched(row: np.ndarray) -> dict[str, float]:
    """What the plausibility rules look at, from a row of the stored view's floats."""
    u = np.hypot(row[PLACE["U"] + 1], row[PLACE["U"] + 2])
    return {"Sp": row[PLACE["Sp"]], "Re": row[PLACE["Re"]], "U": row[PLACE["U"]], "u_U": u}
