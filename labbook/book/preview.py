"""A run that is not logged yet: its numbers, refusals and warnings while it is being typed."""

from collections.abc import Mapping
from dataclasses import dataclass, field

import numpy as np
from sqlalchemy import Connection, select

from labbook.book.absence import marks_of, why_absent
from labbook.book.arrivals import Arrival, Findings, default_drive, fits_swimmer, watched
from labbook.book.clock import now
from labbook.book.derive import derive
from labbook.book.drafts import read_draft
from labbook.book.plausibility import enough_runs, run_warnings
from labbook.book.registry_rows import registry_of
from labbook.book.run_facts import facts_from
from labbook.book.shelf import read_shelf
from labbook.book.stored_view import SENTENCES
from labbook.book.tables import fluid, rig, swimmer
from labbook.errors import Refusal
from labbook.registry.regimes import regimes_of


@dataclass(frozen=True)
class Preview:
    """What logging these cells would give: values and u in SI, and everything said about them.

    refused: column -> sentence; warned: (column, sentence) pairs that logging would ask to confirm.
    """

    values: dict[str, float | None] = field(default_factory=dict)
    u: dict[str, float | None] = field(default_factory=dict)
    sentences: dict[str, str] = field(default_factory=dict)
    regimes: list[str] = field(default_factory=list)
    why_absent: dict[str, str] = field(default_factory=dict)
    marks: dict[str, list[str]] = field(default_factory=dict)
    refused: dict[str, str] = field(default_factory=dict)
    warned: list[tuple[str, str]] = field(default_factory=list)


def preview(connection: Connection, cells: Mapping[str, str]) -> Preview:
    """The numbers of a run as typed so far; cells that cannot be read are left out and said."""
    draft, found = read_draft("run", {**cells, "at": cells.get("at") or now()})
    missing = {r.field for r in found if r.typed is None}
    refused = {r.field: str(r) for r in found if not (r.field in missing and r.field == "f")}
    ids = {}
    for column, table in (("swimmer", swimmer), ("fluid", fluid), ("rig", rig)):
        code = draft.texts.get(column)
        ids[column] = connection.scalar(select(table.c.id).where(table.c.code == code)) if code else None
        if code and ids[column] is None:
            refused[column] = str(Refusal(column, code, f"no {column} has this code"))
    if ids["swimmer"] is None or ids["fluid"] is None or "at" not in draft.texts:
        return Preview(refused=refused)
    shelf = read_shelf(connection, [ids["swimmer"]], [ids["fluid"]], [ids["rig"]] if ids["rig"] else [])
    of = shelf.swimmers[ids["swimmer"]]
    findings = Findings()
    fits_swimmer(Arrival(draft), of, findings)
    refused |= {r.field: str(r) for r in findings.refused}
    drive = draft.texts.get("drive") or default_drive(of)
    facts = facts_from(
        [(ids["swimmer"], ids["fluid"], ids["rig"], draft.texts["at"], drive, draft.document())]
    )
    registry = registry_of(connection)
    derived = derive(facts, shelf, registry)
    row = derived.floats[0]
    values = {k: _number(row[3 * i]) for i, k in enumerate(derived.keys)}
    u = {k: _number(np.hypot(row[3 * i + 1], row[3 * i + 2])) for i, k in enumerate(derived.keys)}
    said = {s: derived.sentences[s][0] for s in SENTENCES}
    warned = list(draft.warned)
    if enough_runs(connection, [ids["swimmer"]], 2**62):
        warned += run_warnings(connection, ids["swimmer"], watched(row), 2**62)
    return Preview(
        values, u, {k: s for k, s in said.items() if not s.startswith("absent")}, regimes_of(values, registry.regimes), why_absent(values | {f"u_{k}": v for k, v in u.items()}, said, of.code, of.texts["form"], drive, registry),
        marks_of(derived.marks[0], None, values, registry), refused, warned,
    )  # fmt: skip


def _number(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
