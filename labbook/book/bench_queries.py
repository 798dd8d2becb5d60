"""What the bench asks while a trial is typed: what the book knows of a swimmer and a fluid, and whom to compare."""

from datetime import date

import numpy as np
from sqlalchemy import Connection, func, select

from labbook.book.batch_means import modulus
from labbook.book.block_spread import section_of
from labbook.book.ledger import cells_of, run_row
from labbook.book.sets import sets_of
from labbook.book.shelf import Item, document, read_shelf
from labbook.book.tables import SHELF, fluid, rig, run, swimmer
from labbook.registry.written import shown

NOT_AGAIN = ("at", "by", "state", "why", "note", "video", "U", "A_tip", "T_end")
MOST_SIBLINGS = 6
_DIMENSIONS = {"rod": ("d",), "strip": ("w", "t"), "tube": ("D", "d_in")}


def counts_of_book(connection: Connection) -> dict[str, int]:
    """How many fluids, materials, swimmers, rigs and runs the book holds."""
    tables = {**SHELF, "run": run}
    return {k: connection.scalar(select(func.count()).select_from(t)) for k, t in tables.items()}


def cells_again(connection: Connection, code: str) -> dict[str, str]:
    """A run's settings as cells to start the next run from: what was seen, and when, is left out."""
    cells = cells_of(connection, run_row(connection, code), track=False)
    return {k: v for k, v in cells.items() if k not in NOT_AGAIN}


def siblings(connection: Connection, code: str) -> list[str]:
    """This swimmer and those of the same form, material and section, the most used first."""
    mine = connection.execute(select(swimmer).where(swimmer.c.code == code)).mappings().one_or_none()
    if mine is None:
        return [code]
    query = (
        select(swimmer.c.code)
        .join(run, run.c.swimmer_id == swimmer.c.id)
        .where(
            swimmer.c.form == mine["form"],
            swimmer.c.material_id.is_not_distinct_from(mine["material_id"]),
            swimmer.c.section.is_not_distinct_from(mine["section"]),
        )
        .group_by(swimmer.c.code)
        .order_by(func.count().desc())
        .limit(MOST_SIBLINGS)
    )
    return list(dict.fromkeys([code, *connection.scalars(query)]))


def summary_of(connection: Connection, swimmer_code: str, fluid_code: str) -> str:
    """One line on a swimmer and a fluid: section, batch and modulus, last reading and its age."""
    swimmer_id = connection.scalar(select(swimmer.c.id).where(swimmer.c.code == swimmer_code))
    fluid_id = connection.scalar(select(fluid.c.id).where(fluid.c.code == fluid_code))
    shelf = read_shelf(
        connection, [swimmer_id] if swimmer_id else [], [fluid_id] if fluid_id else [], []
    )  # fmt: skip
    parts = [_of_swimmer(s, shelf.materials.get(s.texts["material_id"])) for s in shelf.swimmers.values()]
    parts += [_of_fluid(f) for f in shelf.fluids.values()]
    return " · ".join(parts)


def kinds_chosen(connection: Connection, fluid_code: str, rig_code: str) -> tuple[str, dict[str, str]]:
    """The kind of a fluid, and a rig's cells ({} for none): what the cautions follow from."""
    kind = connection.scalar(select(fluid.c.kind).where(fluid.c.code == fluid_code)) or ""
    row = connection.execute(select(rig).where(rig.c.code == rig_code)).mappings().one_or_none()
    return kind, {} if row is None else {"kind": row["kind"] or "", **document(row["typed"])}


def _of_swimmer(item: Item, material: Item | None) -> str:
    section = section_of(item)
    sizes = [*_DIMENSIONS.get(section, ()), "L_tail"]
    said = " × ".join(_size(item, k) for k in sizes if k in item.typed)
    text = f"{item.code}: {section or item.texts['form']} {said}".rstrip()
    if material is None:
        return f"{text}, no material named"
    sets = sets_of(material.readings, ("E",), material.texts["made"])
    if not sets:
        return f"{text}, batch {material.code}, E not measured"
    today = np.array([date.today().toordinal()])
    E = modulus(material, today)
    return f"{text}, batch {material.code}, E {shown('E', E.value[0], E.parts['E'][0])}"


def _size(item: Item, key: str) -> str:
    return shown(key, item.value(key), item.u(key), item.typed[key][1])


def _of_fluid(item: Item) -> str:
    sets = sets_of(item.readings, ("mu", "nu"), item.texts["made"])
    if not sets:
        kind = item.texts["kind"]
        return f"{item.code}: {kind}, no viscosity reading"
    n = sum(len(s.readings) for s in sets)
    said = f"{item.code}: {n} reading{'s' if n != 1 else ''}"
    return f"{said}, last {age(sets[-1].on)}" if sets[-1].on else said


def age(day: str) -> str:
    """'3 days ago' of an ISO date."""
    days = (date.today() - date.fromisoformat(day)).days
    if days < 0:
        return f"dated {day}"
    if days == 0:
        return "today"
    if days < 60:
        return f"{days} day{'s' if days != 1 else ''} ago"
    return f"{days // 30} months ago" if days < 700 else f"{days // 365} years ago"
