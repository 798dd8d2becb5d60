"""Acts on the shelf, each one function, one transaction, one ledger line: add, amend, retire."""

from collections.abc import Mapping
from dataclasses import replace

from sqlalchemy import Connection, Engine, func, insert, select, update

from labbook.book import chain
from labbook.book.arrivals import Findings, ids_of, unknown
from labbook.book.drafts import Draft, read_draft, whole
from labbook.book.ledger import handle, reason, settle, uses
from labbook.book.opening import writing
from labbook.book.plausibility import reading_warning
from labbook.book.records import KINDS
from labbook.book.run_rows import derive_again
from labbook.book.shelf import Item, Reading, document, read_shelf
from labbook.book.tables import SHELF, fluid, material, reading, run
from labbook.errors import Refusal
from labbook.registry.typed import Typed, printed, printed_uncertainty

OF_FLUID = ("mu", "nu", "rho", "lam")


def stock(
    engine: Engine, name: str, cells: Mapping[str, str], by: str, *, why: str | None = None,
    confirm: bool = False,
) -> str:  # fmt: skip
    """Add a fluid, material, swimmer, rig or reading from cells as typed; returns its code.

    An existing code with the same cells changes nothing; with other cells it is refused unless `why` says
    that it is an amendment, and then the runs that use it are derived again in the same transaction.
    Errors: Refusal, Refusals, Unconfirmed; nothing is written then.
    """
    by = handle(by)
    why = reason(why) if why is not None else None
    if name != "reading":
        on_shelf(name)
    with writing(engine) as connection:
        if name == "reading":
            return _one_reading(connection, whole(read_draft(name, cells)), by, confirm)
        row = _row(connection, name, str(cells.get("code", "")).strip())
        if row is None:
            draft = whole(read_draft(name, cells))
            settle(Findings(warned=list(draft.warned)), confirm)
            put(connection, name, draft)
            chain.append(connection, by, "add", name, draft.texts["code"], after=draft.content())
            return draft.texts["code"]
        return _amended(connection, name, row, cells, by, why, confirm)


def on_shelf(name: str) -> str:
    """The name of a kind that has codes on the shelf; Refusal for another."""
    if name not in SHELF:
        raise Refusal("kind", name, "does not stand on the shelf", f"one of {', '.join(SHELF)}")
    return name


def _row(connection: Connection, name: str, code: str):
    table = SHELF[name]
    return connection.execute(select(table).where(table.c.code == code)).mappings().one_or_none()


def put(connection: Connection, name: str, draft: Draft, row_id: int | None = None) -> int:
    """Insert a shelf record, or overwrite the one with this id; returns its id."""
    table = SHELF[name]
    values = {c: draft.texts.get(c) for c in KINDS[name].texts if c in table.c}
    values["typed"] = draft.document()
    for column in KINDS[name].refers:
        code = draft.texts.get(column)
        found = ids_of(connection, SHELF[KINDS[name].refers[column]], [code or ""])
        if code and code not in found:
            raise unknown(connection, SHELF[KINDS[name].refers[column]], column, code)
        values[f"{column}_id"] = found.get(code)
    if row_id is None:
        row_id = (connection.scalar(select(func.max(table.c.id))) or 0) + 1
        connection.execute(insert(table).values(id=row_id, retired=False, **values))
    else:
        connection.execute(update(table).where(table.c.id == row_id).values(**values))
    return row_id


def stocked_cells(connection: Connection, name: str, row) -> dict[str, str]:
    """A shelf record's cells as they would be typed again."""
    spec = KINDS[name]
    cells = {c: row[c] for c in spec.texts if c in row and row[c]}
    for column, kind in spec.refers.items():
        if row[f"{column}_id"] is not None:
            table = SHELF[kind]
            cells[column] = connection.scalar(select(table.c.code).where(table.c.id == row[f"{column}_id"]))
    for column, entry in document(row["typed"]).items():
        typed = Typed(*entry)
        stated = column in spec.spreads
        cells[column] = printed_uncertainty(typed) if stated else printed(spec.typed[column], typed)
    return cells


def _amended(connection, name, row, cells, by, why, confirm) -> str:
    code = row["code"]
    before = stocked_cells(connection, name, row)
    wanted = {**before, **{k: str(v).strip() for k, v in cells.items() if v is not None}}
    draft = whole(read_draft(name, wanted))
    after, known = draft.content(), whole(read_draft(name, before)).content()
    touched = [k for k in {**known, **after} if known.get(k) != after.get(k)]
    if not touched:
        return code
    if why is None:
        raise Refusal(name, code, f"differs from the book in {', '.join(touched)}",
                      "give a reason (--why) to amend it, or use a new code")
    settle(Findings(warned=[(c, s) for c, s in draft.warned if c in touched]), confirm)
    old = document(row["typed"])
    put(connection, name, draft, row["id"])
    typed = {k: (old[k] if k in old and k not in touched else t) for k, t in draft.typed.items()}
    connection.execute(update(SHELF[name]).where(SHELF[name].c.id == row["id"]).values(typed=typed))
    changed = derive_again(connection, _users(name, row["id"]))
    chain.append(
        connection, by, "amend", name, code, before={k: known.get(k) for k in touched},
        after={k: after.get(k) for k in touched}, why=why, runs=changed,
    )  # fmt: skip
    return code


def _users(name: str, row_id: int):
    match name:
        case "fluid":
            return uses(fluid_id=row_id)
        case "material":
            return uses(material_id=row_id)
        case "swimmer":
            return run.c.swimmer_id == row_id
    return run.c.rig_id == row_id


def retire(engine: Engine, name: str, code: str, why: str, by: str, *, back: bool = False) -> None:
    """Retire a fluid, material, swimmer or rig (kept, no longer offered first), or take it back."""
    by, why, name = handle(by), reason(why), on_shelf(name)
    with writing(engine) as connection:
        row = _row(connection, name, code)
        if row is None:
            raise unknown(connection, SHELF[name], name, code)
        if bool(row["retired"]) != back:
            raise Refusal(name, code, "is in use already" if back else "is retired already")
        connection.execute(update(SHELF[name]).where(SHELF[name].c.id == row["id"]).values(retired=not back))
        chain.append(connection, by, "retire", name, code, before={"retired": back},
                     after={"retired": not back}, why=why)


def _one_reading(connection, draft: Draft, by, confirm) -> str:
    # dated and equal in every cell: the same reading; undated ones are never duplicates
    sheet_row = f"{draft.fingerprint()}:1" if "on" in draft.texts else None
    known = connection.scalar(select(reading.c.code).where(reading.c.sheet_row == sheet_row)) if sheet_row else None
    if known is not None:
        return known
    batches = Batches(connection, [draft])
    findings = Findings()
    batch = batches.of(draft, "", findings)
    settle(findings, confirm)
    batches.watch(batch, draft, "", findings)
    findings.warned += draft.warned
    settle(findings, confirm)
    code = write_reading(connection, draft, batch, sheet_row)
    changed = derive_again(connection, uses(**batch.target()))
    chain.append(connection, by, "add", "reading", code, after=draft.content(), runs=changed)
    return code


class Batch:
    """A fluid or material that readings are of, with those it has so far."""

    def __init__(self, item: Item, is_fluid: bool):
        self.item, self.is_fluid = item, is_fluid

    def target(self) -> dict[str, int]:
        """The id of the batch under the column that names it."""
        return {"fluid_id" if self.is_fluid else "material_id": self.item.id}


class Batches:
    """The batches that some readings are of; remembers each new reading for the next comparison."""

    def __init__(self, connection: Connection, drafts):
        self.connection = connection
        codes = {d.texts.get("of", "") for d in drafts}
        self.fluids = ids_of(connection, fluid, codes)
        self.materials = ids_of(connection, material, codes)
        shelf = read_shelf(
            connection, swimmers=(), fluids=self.fluids.values(), rigs=(), materials=self.materials.values()
        )
        self.known: dict[tuple[bool, str], Batch] = {
            **{(True, i.code): Batch(i, True) for i in shelf.fluids.values()},
            **{(False, i.code): Batch(i, False) for i in shelf.materials.values()},
        }

    def of(self, draft: Draft, where: str, findings: Findings) -> Batch | None:
        """The batch a reading names: a material for E, a fluid for the rest."""
        is_fluid = draft.texts.get("key") != "E"
        batch = self.known.get((is_fluid, draft.texts.get("of", "")))
        if batch is None:
            table, name = (fluid, "fluid") if is_fluid else (material, "material")
            refusal = unknown(self.connection, table, name, draft.texts.get("of", ""))
            findings.refuse(where, Refusal("of", refusal.typed, refusal.reason, refusal.remedy))
        return batch

    def watch(self, batch: Batch, draft: Draft, where: str, findings: Findings) -> None:
        """Compare a reading with the batch's last, then remember it."""
        value, T = draft.typed["value"], draft.typed.get("T")
        new = Reading("", draft.texts["key"], value.value, value.u, T.value if T else None, T.u if T else 0.0,
                      draft.texts.get("on"), "kept", value.origin)  # fmt: skip
        warned = reading_warning(batch.item, new)
        if warned is not None:
            lead = f"{where}, " if where else ""
            findings.warned.append((warned[0], f"{lead}{draft.texts['of']}: {warned[1]}"))
        batch.item = replace(batch.item, readings=(*batch.item.readings, new))


def write_reading(connection, draft: Draft, batch: Batch, sheet_row: str | None = None) -> str:
    """Insert a reading; returns its code."""
    row_id = (connection.scalar(select(func.max(reading.c.id))) or 0) + 1
    code = f"M-{row_id:04d}"
    texts = draft.texts
    connection.execute(
        insert(reading).values(
            id=row_id, code=code, key=texts["key"], typed=draft.document(), on=texts.get("on"),
            how=texts.get("how"), note=texts.get("note"), state="kept", sheet_row=sheet_row, **batch.target(),
        )
    )  # fmt: skip
    return code
