"""The shelf as frozen records: what runs refer to, read in a few queries and never touched again."""

import json
from collections.abc import Iterable
from dataclasses import dataclass, field
from typing import Any

from sqlalchemy import Connection, Table, select

from labbook.book.tables import fluid, material, reading, rig, swimmer

Typed = dict[str, list]  # key -> [text, unit, SI value, standard uncertainty, origin]


@dataclass(frozen=True)
class Reading:
    """One measured property of a batch: SI value and u at T (None where not given), on a date or undated."""

    code: str
    key: str
    value: float
    u: float
    T: float | None
    u_T: float
    on: str | None
    state: str
    origin: str


@dataclass(frozen=True)
class Item:
    """A fluid, material, swimmer or rig: its text columns, its typed quantities and its readings."""

    id: int
    code: str
    texts: dict[str, Any]
    typed: Typed
    readings: tuple[Reading, ...] = ()

    def value(self, key: str) -> float | None:
        """The SI value of a typed quantity, or None."""
        return self.typed[key][2] if key in self.typed else None

    def u(self, key: str) -> float:
        """Its standard uncertainty."""
        return self.typed[key][3]


@dataclass(frozen=True)
class Shelf:
    """The records that some runs need, by id."""

    fluids: dict[int, Item] = field(default_factory=dict)
    materials: dict[int, Item] = field(default_factory=dict)
    swimmers: dict[int, Item] = field(default_factory=dict)
    rigs: dict[int, Item] = field(default_factory=dict)


def read_shelf(
    connection: Connection,
    swimmers: Iterable[int] | None = None,
    fluids: Iterable[int] | None = None,
    rigs: Iterable[int] | None = None,
    materials: Iterable[int] = (),
) -> Shelf:
    """The shelf, or just the named records, the materials of the named swimmers included."""
    found = _items(connection, swimmer, swimmers)
    wanted = None
    if swimmers is not None:
        wanted = {i.texts["material_id"] for i in found.values()} - {None} | set(materials)
    return Shelf(
        fluids=_items(connection, fluid, fluids, _readings(connection, reading.c.fluid_id, fluids)),
        materials=_items(connection, material, wanted, _readings(connection, reading.c.material_id, wanted)),
        swimmers=found,
        rigs=_items(connection, rig, rigs),
    )


def _chosen(query, column, ids):
    if ids is None:
        return query
    ids = list(ids)
    # a long list would exceed the driver's limit on parameters, and then nearly all is wanted anyway
    return query if len(ids) > 500 else query.where(column.in_(ids))


def _items(connection, table: Table, ids=None, readings=None) -> dict[int, Item]:
    rows = connection.execute(_chosen(select(table), table.c.id, ids)).mappings()
    return {row["id"]: item_of(row, (readings or {}).get(row["id"], ())) for row in rows}


def item_of(row, readings=()) -> Item:
    """A shelf record from its row."""
    texts = {k: v for k, v in row.items() if k not in ("id", "code", "typed")}
    return Item(row["id"], row["code"], texts, document(row["typed"]), tuple(readings))


def document(stored) -> Typed:
    """A typed document, whether the driver decoded it or not."""
    return json.loads(stored) if isinstance(stored, str) else stored


def _readings(connection, column, ids) -> dict[int, list[Reading]]:
    query = select(column.label("of_id"), reading).where(column.is_not(None), reading.c.state == "kept")
    found: dict[int, list[Reading]] = {}
    for row in connection.execute(_chosen(query, column, ids).order_by(reading.c.id)).mappings():
        found.setdefault(row["of_id"], []).append(reading_of(row))
    return found


def reading_of(row) -> Reading:
    """A reading from its row."""
    typed = document(row["typed"])
    value, T = typed["value"], typed.get("T")
    return Reading(
        row["code"], row["key"], value[2], value[3], T[2] if T else None, T[3] if T else 0.0, row["on"],
        row["state"], value[4],
    )  # fmt: skip
