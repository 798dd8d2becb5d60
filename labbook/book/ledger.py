"""Acts on runs, each one function, one transaction, one ledger line: log, amend, void."""

import json
from collections.abc import Mapping
from datetime import UTC, datetime, timedelta
from typing import NamedTuple

from sqlalchemy import Connection, Engine, select, update

from labbook.book import chain
from labbook.book.arrivals import Arrival, Findings, default_drive, ids_of, place_runs, unknown, watched
from labbook.book.clock import now
from labbook.book.derive import derive
from labbook.book.drafts import Draft, all_of, read_draft, whole
from labbook.book.opening import writing
from labbook.book.plausibility import run_warnings
from labbook.book.records import KINDS
from labbook.book.reduced_cells import let_go, reduced_keys, scale_kept, typed_before
from labbook.book.registry_rows import registry_of
from labbook.book.run_rows import derive_again, facts_of, shelf_for
from labbook.book.shelf import document, read_shelf
from labbook.book.tables import fluid, reading, rig, run, swimmer
from labbook.errors import Refusal, Unconfirmed
from labbook.registry.typed import Typed, printed

TYPO_MINUTES = 10  # how long after logging "typo" is reason enough
LONGEST_REASON = 1_000


def handle(by: str | None) -> str:
    """A person's handle, checked."""
    text = (by or "").strip()
    if not text or len(text) > 64 or any(ord(c) < 32 for c in text):
        raise Refusal("by", by, "a handle of 1 to 64 characters is needed", "say who you are with --by")
    return text


def reason(why: str | None, field: str = "why") -> str:
    """A reason, checked."""
    text = (why or "").strip()
    if not text:
        raise Refusal(field, None, "is missing: say in a few words why")
    if len(text) > LONGEST_REASON:
        raise Refusal(field, text[:40] + "...", f"is longer than {LONGEST_REASON} characters")
    return text


def settle(findings: Findings, confirm: bool) -> None:
    """Stop the act where anything is refused, or warned about and not confirmed."""
    if findings.refused:
        raise all_of(findings.refused)
    if findings.warned and not confirm:
        raise Unconfirmed([s for _, s in findings.warned], [c for c, _ in findings.warned])


class Logged(NamedTuple):
    """The code of a run, and whether the book held it already."""

    code: str
    known: bool


def record(
    engine: Engine, cells: Mapping[str, str], by: str, *, confirm: bool = False, token: str | None = None
) -> Logged:
    """Log one run from cells as typed; `at` left out means now, and such a run is never a duplicate.

    token: a one-use token: the second call with the same token logs nothing and names the first's code, as does
    a second call with the same cells and the same `at`.
    Errors: Refusal or Refusals (nothing written), Unconfirmed (warnings that confirm=True would pass).
    """
    by = handle(by)
    timed = bool(cells.get("at"))
    draft = whole(read_draft("run", {**cells, "at": cells.get("at") or now()}))
    sheet_row = f"{draft.fingerprint()}:1" if timed else None  # as the first such row of a sheet
    with writing(engine) as connection:
        for column, mark in ((run.c.token, token), (run.c.sheet_row, sheet_row)):
            known = connection.scalar(select(run.c.code).where(column == mark)) if mark else None
            if known is not None:
                return Logged(known, known=True)
        _free_code(connection, draft)
        findings = Findings()
        written = place_runs(
            connection, [Arrival(draft, sheet_row=sheet_row, token=token)], by, findings, confirm=confirm
        )
        settle(findings, confirm)
        (_, code), = written
        chain.append(connection, by, "log", "run", code, after=draft.content(), runs=written)
    return Logged(code, known=False)


def _free_code(connection, draft: Draft) -> None:
    code = draft.texts.get("code")
    if code and connection.scalar(select(run.c.id).where(run.c.code == code)):
        raise Refusal("code", code, "this run is logged already", "amend it, or leave the code out")


def run_row(connection: Connection, code: str):
    """The row of a run; Refusal for an unknown code."""
    row = connection.execute(select(run).where(run.c.code == code)).mappings().one_or_none()
    if row is None:
        raise Refusal("run", code, "the book has no such run")
    return row


def cells_of(connection: Connection, row, *, track: bool = True) -> dict[str, str]:
    """A run's cells as they would be typed again; track=False: as they stood before a track brought its own."""
    cells = {c: row[c] for c in ("at", "by", "drive", "series", "video", "note", "state", "why") if row[c]}
    for column, table in (("swimmer", swimmer), ("fluid", fluid), ("rig", rig)):
        if row[f"{column}_id"] is not None:
            cells[column] = connection.scalar(select(table.c.code).where(table.c.id == row[f"{column}_id"]))
    typed = document(row["typed"]) if track else typed_before(connection, row)
    for key, entry in typed.items():
        if key in KINDS["run"].typed:
            cells[key] = printed(KINDS["run"].typed[key], Typed(*entry))
    return cells


def amend(
    engine: Engine, code: str, changes: Mapping[str, str | None], why: str, by: str, *, confirm: bool = False
) -> None:
    """Change cells of a run (None or '' clears one); the old values stay in the ledger with the reason."""
    by, why = handle(by), reason(why)
    if "code" in changes:
        raise Refusal("code", changes["code"], "a run keeps its code")
    with writing(engine) as connection:
        row = run_row(connection, code)
        before = cells_of(connection, row)
        wanted = {**before, **{k: (str(v).strip() if v is not None else "") for k, v in changes.items()}}
        _fill_in(connection, row, wanted, why)
        draft = whole(read_draft("run", wanted))
        after = draft.content()
        touched = [k for k in {**before, **after} if before.get(k) != after.get(k)]
        if not touched:
            raise Refusal("amend", code, "nothing would change", "type a value that differs")
        old = document(row["typed"])
        typed = {k: (t if k in touched or k not in old else old[k]) for k, t in draft.typed.items()}
        typed = scale_kept(old, typed)
        warned = [(c, s) for c, s in draft.warned if c in touched]
        values = _columns(connection, draft, typed)
        warned += _warned_again(connection, row, values, touched)
        settle(Findings(warned=warned), confirm)
        # a confirmation belongs to the cell that was confirmed, and goes with it
        warned = [w for w in json.loads(row["confirmed"] or "[]") if w[0] not in touched] + warned
        values["confirmed"] = json.dumps(warned, ensure_ascii=False) if warned else None
        connection.execute(update(run).where(run.c.id == row["id"]).values(**values))
        if reduced_keys(old) and not reduced_keys(typed):
            let_go(connection, row["id"], why)
        changed = derive_again(connection, run.c.id == row["id"])
        chain.append(
            connection, by, "amend", "run", code,
            before={k: before.get(k) for k in touched}, after={k: after.get(k) for k in touched}, why=why,
            runs=changed or [(row["id"], code)],
        )  # fmt: skip


def _fill_in(connection, row, wanted: dict[str, str], why: str) -> None:
    """What an amended run cannot be without: who, a drive, a state; and a void run says why."""
    if not wanted["by"]:
        raise Refusal("by", None, "is missing: a run was made by somebody")
    if not wanted["drive"]:
        of = read_shelf(connection, [row["swimmer_id"]], (), ()).swimmers[row["swimmer_id"]]
        wanted["drive"] = default_drive(of)
    wanted["state"] = wanted["state"] or "kept"
    if wanted["state"] == "kept":
        wanted["why"] = ""
    elif not wanted.get("why"):
        wanted["why"] = why


def _columns(connection, draft: Draft, typed) -> dict:
    values: dict = {c: draft.texts.get(c) for c in ("series", "video", "note", "why")}
    values |= {c: draft.texts[c] for c in ("at", "by", "drive", "state") if c in draft.texts}
    for column, table in (("swimmer", swimmer), ("fluid", fluid), ("rig", rig)):
        code = draft.texts.get(column)
        found = ids_of(connection, table, [code or ""])
        if code and code not in found:
            raise unknown(connection, table, column, code)
        values[f"{column}_id"] = found.get(code)
    wall = draft.typed.get("h_wall")
    head = document(connection.scalar(select(swimmer.c.typed).where(swimmer.c.id == values["swimmer_id"]))).get("b")
    if wall is not None and head is not None and wall.value <= head[2]:
        raise Refusal("h_wall", wall.text, "the wall would be closer than the head radius",
                      "h_wall is measured from the axis")
    return values | {"typed": typed}


def _warned_again(connection, row, values, touched) -> list[tuple[str, str]]:
    """The comparison with the swimmer's other runs, for what was changed."""
    if not set(touched) & {"f", "U", "T", "swimmer", "fluid"} or values.get("state", "kept") != "kept":
        return []
    amended = (row["id"], row["code"], values["swimmer_id"], values["fluid_id"], values["rig_id"],
               values["at"], values["drive"], values["typed"], "kept")  # fmt: skip
    floats = derive(
        facts_of([amended]), shelf_for(connection, [amended]), registry_of(connection)
    ).floats[0]
    return run_warnings(connection, values["swimmer_id"], watched(floats), 2**62, leave_out=row["id"])


def void(engine: Engine, code: str, why: str, by: str) -> None:
    """Mark a run or a reading void, with a reason: it stays in the book and leaves the plots."""
    by, why = handle(by), reason(why)
    with writing(engine) as connection:
        target = connection.execute(select(reading).where(reading.c.code == code)).mappings().one_or_none()
        if target is not None:
            _void_reading(connection, target, why, by)
            return
        row = run_row(connection, code)
        if row["state"] == "void":
            raise Refusal("run", code, f"is void already: {row['why']}")
        connection.execute(update(run).where(run.c.id == row["id"]).values(state="void", why=why))
        derive_again(connection, run.c.id == row["id"])
        chain.append(connection, by, "void", "run", code, before={"state": "kept"}, after={"state": "void"},
                     why=why, runs=[(row["id"], code)])


def _void_reading(connection, target, why, by) -> None:
    if target["state"] == "void":
        raise Refusal("reading", target["code"], f"is void already: {target['why']}")
    connection.execute(update(reading).where(reading.c.id == target["id"]).values(state="void", why=why))
    changed = derive_again(connection, uses(fluid_id=target["fluid_id"], material_id=target["material_id"]))
    chain.append(connection, by, "void", "reading", target["code"], before={"state": "kept"},
                 after={"state": "void"}, why=why, runs=changed)


def uses(*, fluid_id=None, material_id=None):
    """The condition that a run refers to a fluid, or through its swimmer to a material."""
    if fluid_id is not None:
        return run.c.fluid_id == fluid_id
    return run.c.swimmer_id.in_(select(swimmer.c.id).where(swimmer.c.material_id == material_id))


def young_enough_for_typo(logged: str) -> bool:
    """Whether 'typo' alone is reason enough to amend a run logged at this time."""
    age = datetime.now(UTC) - datetime.fromisoformat(logged)
    return age <= timedelta(minutes=TYPO_MINUTES)
