"""New runs, one or a hundred thousand: references found, identity settled, derived, warned about, written."""

import json
from collections.abc import Callable, Iterable
from dataclasses import dataclass, field

import numpy as np
from sqlalchemy import Connection, Table, func, select

from labbook.book.bulk import write_many
from labbook.book.clock import now
from labbook.book.derive import BATCH, derive
from labbook.book.drafts import Draft
from labbook.book.plausibility import KnownRuns, enough_runs, run_warnings
from labbook.book.run_facts import facts_from
from labbook.book.run_rows import stored_rows, write_stored
from labbook.book.shelf import Item, Shelf, read_shelf
from labbook.book.stored_view import KEYS
from labbook.book.tables import fluid, rig, run, swimmer
from labbook.errors import Refusal

RUN_COLUMNS = (
    "id", "code", "serial", "swimmer_id", "fluid_id", "rig_id", "at", "by", "drive", "series", "video", "note",
    "state", "why", "typed", "confirmed", "logged", "token", "sheet_row",
)  # fmt: skip
_REFERS = {"swimmer": swimmer, "fluid": fluid, "rig": rig}
FEW = 20  # runs that are compared by a query each; more are compared with a swimmer's runs read at once
LAST_SERIAL = 900_000_000  # the codes that the book gives itself never reach it
PLACE = {k: 3 * i for i, k in enumerate(KEYS)}


@dataclass(frozen=True)
class Arrival:
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
    found = {k: ids_of(connection, t, {a.draft.texts.get(k, "") for a in arrivals}) for k, t in _REFERS.items()}
    fit = [a for a in arrivals if _references_stand(connection, a, found, findings)]
    shelf = read_shelf(
        connection,
        swimmers={found["swimmer"][a.draft.texts["swimmer"]] for a in fit},
        fluids={found["fluid"][a.draft.texts["fluid"]] for a in fit},
        rigs={found["rig"][a.draft.texts["rig"]] for a in fit if "rig" in a.draft.texts},
    )
    fit = [a for a in fit if fits_swimmer(a, shelf.swimmers[found["swimmer"][a.draft.texts["swimmer"]]], findings)]
    if findings.refused:
        return []
    codes = _codes(connection, fit)
    next_id = (connection.scalar(select(func.max(run.c.id))) or 0) + 1
    enough = enough_runs(connection, (found["swimmer"][a.draft.texts["swimmer"]] for a in fit), next_id)
    known = KnownRuns(connection, next_id) if len(fit) > FEW else None
    write = _Writer(connection, found, shelf, by, findings, confirm, next_id, enough, known)
    written = []
    for start in range(0, len(fit), BATCH):
        part = fit[start : start + BATCH]
        ids = range(next_id + start, next_id + start + len(part))
        written += write.batch(part, ids, codes[start : start + BATCH])
        if progress is not None:
            progress(len(part))
    return written


def _references_stand(connection, arrival: Arrival, found, findings: Findings) -> bool:
    stands = True
    for column, table in _REFERS.items():
        code = arrival.draft.texts.get(column)
        if code is not None and code not in found[column]:
            findings.refuse(arrival.where, unknown(connection, table, column, code))
            stands = False
    return stands and all(column in arrival.draft.texts for column in ("swimmer", "fluid", "at"))


def fits_swimmer(arrival: Arrival, of: Item, findings: Findings) -> bool:
    """Whether a run is possible with this swimmer: no wall inside its head."""
    wall, head = arrival.draft.typed.get("h_wall"), of.value("b")
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


def _codes(connection, arrivals: list[Arrival]) -> list[str]:
    """Each run's code: its own, else the next free R-number."""
    serial = connection.scalar(select(func.max(run.c.serial))) or 0
    own = [serial_of(a.draft.texts["code"]) or 0 for a in arrivals if "code" in a.draft.texts]
    serial = max([serial, *own])
    codes = []
    for arrival in arrivals:
        if "code" in arrival.draft.texts:
            codes.append(arrival.draft.texts["code"])
        else:
            serial += 1
            codes.append(f"R-{serial:04d}")
    return codes


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
    by: str
    findings: Findings
    confirm: bool
    first_id: int
    enough: set[int]
    known: KnownRuns | None
    logged: str = field(default_factory=now)

    def batch(self, arrivals, ids, codes) -> list[tuple[int, str]]:
        """Write a batch; nothing is written, and nothing returned, while a warning is not confirmed."""
        rows = [self._facts(*one) for one in zip(arrivals, ids, codes, strict=True)]
        facts = facts_from([r[2:8] for r in rows])
        derived = derive(facts, self.shelf)
        warned = self._warnings(arrivals, rows, derived.floats)
        if self.findings.warned and not self.confirm:
            return []
        runs = [self._row(a, r, warned.get(i)) for i, (a, r) in enumerate(zip(arrivals, rows, strict=True))]
        write_many(self.connection, run, RUN_COLUMNS, runs)
        write_stored(self.connection, *stored_rows(rows, facts, derived))
        return [(r[0], r[1]) for r in rows]

    def _facts(self, arrival, run_id, code) -> tuple:
        """A run as run_rows.FACTS selects it."""
        texts = arrival.draft.texts
        swimmer_id = self.found["swimmer"][texts["swimmer"]]
        drive = texts.get("drive") or default_drive(self.shelf.swimmers[swimmer_id])
        return (
            run_id, code, swimmer_id, self.found["fluid"][texts["fluid"]],
            self.found["rig"].get(texts.get("rig", "")), texts["at"], drive, arrival.draft.document(),
            texts.get("state", "kept"), texts.get("by", self.by), texts.get("series"), texts.get("video"),
            texts.get("note"), texts.get("why"), arrival.draft.stored(),
        )  # fmt: skip

    def _row(self, arrival, facts, warned) -> tuple:
        """A run in RUN_COLUMNS order."""
        by, series, video, note, why, typed = facts[9:]
        return (
            *facts[:2], serial_of(facts[1]), *facts[2:6], by, facts[6], series, video, note, facts[8], why, typed,
            warned, self.logged, arrival.token, arrival.sheet_row,
        )  # fmt: skip

    def _warnings(self, arrivals, rows, floats) -> dict[int, str]:
        """Index of the run -> its warnings as stored; all of them go into `findings` too."""
        told: dict[int, str] = {}
        for i, (arrival, row) in enumerate(zip(arrivals, rows, strict=True)):
            mine = list(arrival.draft.warned)
            if row[8] == "kept" and row[2] in self.enough:
                mine += run_warnings(self.connection, row[2], watched(floats[i]), self.first_id, known=self.known)
            if mine:
                told[i] = json.dumps(mine, ensure_ascii=False)
                lead = f"{arrival.where}, " if arrival.where else ""
                self.findings.warned += [(column, lead + sentence) for column, sentence in mine]
        return told


def watched(row: np.ndarray) -> dict[str, float]:
    """What the plausibility rules look at, from a row of the stored view's floats."""
    u = np.hypot(row[PLACE["U"] + 1], row[PLACE["U"] + 2])
    return {"Sp": row[PLACE["Sp"]], "Re": row[PLACE["Re"]], "U": row[PLACE["U"]], "u_U": u}
