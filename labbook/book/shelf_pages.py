"""What the Shelf page asks: each record as typed with its readings, runs and ledger lines."""

from collections.abc import Mapping
from dataclasses import dataclass

import pandas as pd
from sqlalchemy import Connection, func, select

from labbook.book.ledger_pages import Line, lines_from
from labbook.book.queries import recent
from labbook.book.records import kind
from labbook.book.shelf import document
from labbook.book.stocking import stocked_cells
from labbook.book.tables import SHELF, ledger, material, reading, run, swimmer
from labbook.errors import Refusal
from labbook.registry.quantities import QUANTITIES
from labbook.registry.typed import Typed, printed


@dataclass(frozen=True)
class ReadingLine:
    """One reading as typed, void ones too; value, u and T in SI (T None where not given)."""

    code: str
    key: str
    value_text: str
    T_text: str
    on: str | None
    how: str
    note: str
    state: str
    why: str
    value: float
    u: float
    T: float | None


@dataclass(frozen=True)
class OnShelf:
    """One fluid, material, swimmer or rig.

    cells: column -> text as typed (units included); sizes: column -> SI value; runs: how many runs use it,
    for a material through its swimmers; readings: newest date first.
    """

    kind: str
    code: str
    cells: Mapping[str, str]
    sizes: Mapping[str, float]
    retired: bool
    runs: int
    readings: tuple[ReadingLine, ...] = ()

    def kept(self, *keys: str) -> list[ReadingLine]:
        """The readings of some keys that are not void."""
        return [r for r in self.readings if r.state == "kept" and r.key in keys]

    def last(self, *keys: str) -> str | None:
        """The date of the newest kept reading, the day the batch was made where none is dated, else None."""
        dates = [r.on for r in self.kept(*keys) if r.on]
        return max(dates) if dates else (self.cells.get("made") if self.kept(*keys) else None)


def on_shelf(connection: Connection, name: str) -> list[OnShelf]:
    """Every record of a kind, retired ones last, the newest (made, built or calibrated) first."""
    table = SHELF[name] if name in SHELF else _no_shelf(name)
    rows = connection.execute(select(table).order_by(table.c.code)).mappings().all()
    dated = table.c[kind(name).dates[0]].name
    rows = sorted(sorted(rows, key=lambda r: r[dated] or "", reverse=True), key=lambda r: r["retired"])
    used, read = _runs(connection, name), _readings(connection, name)
    return [
        OnShelf(
            name, row["code"], _cells(connection, name, row),
            {k: entry[2] for k, entry in document(row["typed"]).items()}, bool(row["retired"]),
            used.get(row["id"], 0), tuple(read.get(row["id"], ())),
        )
        for row in rows
    ]  # fmt: skip


def item_lines(connection: Connection, name: str, code: str, newest: int = 50) -> list[Line]:
    """The ledger lines about one record of the shelf and about its readings, newest first."""
    about = (ledger.c.kind == name) & (ledger.c.subject == code)
    if name in ("fluid", "material"):
        mine = select(reading.c.code).join(SHELF[name], SHELF[name].c.id == reading.c[f"{name}_id"])
        about |= (ledger.c.kind == "reading") & ledger.c.subject.in_(mine.where(SHELF[name].c.code == code))
    return lines_from(connection, select(ledger).where(about).order_by(ledger.c.id.desc()).limit(newest))


def modulus_frame(item: OnShelf) -> pd.DataFrame:
    """The kept readings of E as charts take them: value, u [Pa], on, how."""
    rows = [(r.value, r.u, r.on, r.how) for r in item.kept("E")]
    return pd.DataFrame(rows, columns=["value", "u", "on", "how"])


def _cells(connection: Connection, name: str, row) -> dict[str, str]:
    """The cells as typed; a count's unit 1 is not said."""
    counts = [c for c, key in kind(name).typed.items() if QUANTITIES[key].units == ("1",)]
    cells = stocked_cells(connection, name, row)
    return {k: v.removesuffix(" 1") if k in counts else v for k, v in cells.items()}


def _no_shelf(name: str):
    raise Refusal("kind", name, "does not stand on the shelf", f"one of {', '.join(SHELF)}")


def _runs(connection: Connection, name: str) -> dict[int, int]:
    if name == "material":
        query = select(swimmer.c.material_id, func.count()).join(run, run.c.swimmer_id == swimmer.c.id)
        return dict(connection.execute(query.group_by(swimmer.c.material_id)).all())
    column = run.c[f"{name}_id"]
    return dict(connection.execute(select(column, func.count()).group_by(column)).all())


def _readings(connection: Connection, name: str) -> dict[int, list[ReadingLine]]:
    if name not in ("fluid", "material"):
        return {}
    column = reading.c[f"{name}_id"]
    query = select(column.label("of_id"), reading).where(column.is_not(None))
    found: dict[int, list[ReadingLine]] = {}
    for row in connection.execute(query.order_by(reading.c.on.desc(), reading.c.id.desc())).mappings():
        found.setdefault(row["of_id"], []).append(_reading_line(row))
    return found


def _reading_line(row) -> ReadingLine:
    typed = {k: Typed(*entry) for k, entry in document(row["typed"]).items()}
    value, T = typed["value"], typed.get("T")
    return ReadingLine(
        row["code"], row["key"], printed(row["key"], value), printed("T", T) if T else "", row["on"],
        row["how"] or "", row["note"] or "", row["state"], row["why"] or "", value.value, value.u,
        T.value if T else None,
    )  # fmt: skip


def owner_of_reading(connection: Connection, code: str) -> tuple[str, str] | None:
    """('fluid' or 'material', code) of the batch that a reading is of."""
    row = connection.execute(select(reading).where(reading.c.code == code)).mappings().one_or_none()
    if row is None:
        return None
    name = "fluid" if row["fluid_id"] is not None else "material"
    table = SHELF[name]
    return name, connection.scalar(select(table.c.code).where(table.c.id == row[f"{name}_id"]))


def of_material(connection: Connection, code: str) -> list[str]:
    """The swimmers built from a material, newest first."""
    query = select(swimmer.c.code).join(material, material.c.id == swimmer.c.material_id)
    return list(connection.scalars(query.where(material.c.code == code).order_by(swimmer.c.id.desc())))


def every_code(connection: Connection, name: str) -> set[str]:
    """The codes of a kind, retired ones too."""
    return set(connection.scalars(select(SHELF[name].c.code)))


def offered(connection: Connection, name: str) -> list[str]:
    """The codes of a kind that a form offers: those in use, the last used (for a material, newest) first."""
    if name != "material":
        return recent(connection, name)
    query = select(material.c.code).where(material.c.retired.is_(False)).order_by(material.c.id.desc())
    return list(connection.scalars(query))
