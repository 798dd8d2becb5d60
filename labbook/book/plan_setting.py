"""What the next runs are planned by: a swimmer, there or still to be built, fluids, and how it is driven."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from sqlalchemy import Connection, func, select

from labbook.book.arrivals import Arrival, Findings, default_drive, fits_swimmer, unknown
from labbook.book.asking import Question
from labbook.book.clock import local, now
from labbook.book.drafts import Draft, all_of, read_draft, whole
from labbook.book.ledger import cells_of, run_row
from labbook.book.plan_swimmer import E_CELL, SWIMMER_CELLS, swimmer_of
from labbook.book.queries import frame
from labbook.book.registry_rows import registry_of
from labbook.book.shelf import Item, Shelf, read_shelf
from labbook.book.stored_view import resolved, view_column
from labbook.book.tables import fluid, material, rig, run, swimmer
from labbook.errors import Refusal
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES
from labbook.registry.written import written_in

TAKEN = ("rig", "drive", "theta0", "h0", "B", "I_coil", "h_wall", "D_tank")  # from the last run
RUN_CELLS = (*TAKEN, "T", "T_end", "at", "series", "note")
T_ELSE, LAST_T = "22(1) degC", 10
OWN_KEYS = ("f", "mu", "Sp", "Re_omega", "theta0", "U", "u_U")
_EITHER = {"B": "I_coil", "I_coil": "B"}  # one of them tells the field


@dataclass(frozen=True)
class RigRange:
    """What a rig has run so far, kept runs alone: how many, f in Hz from where to where, B in T at most."""

    runs: int = 0
    f_low: float = np.nan
    f_high: float = np.nan
    B_high: float = np.nan


@dataclass(frozen=True, eq=False)
class Plan:
    """All that planning needs, read once; what is asked of it afterwards takes no connection.

    shelf: the swimmer, its material, the fluids, the rig; cells: of every planned run, as typed (f, fluid and
    at are left out); draft: the same, read; given: the cells that were asked for and not taken from
    elsewhere; own: the swimmer's kept runs, oldest first (at, code, fluid, OWN_KEYS); built: it is not on the
    shelf as it is here; notes: where the rest comes from, a sentence each; materials: the batches that are
    not retired.
    """

    registry: Registry
    shelf: Shelf
    swimmer: Item
    cells: dict[str, str]
    draft: Draft
    given: dict[str, str]
    rig: Item | None
    has_run: RigRange
    own: pd.DataFrame
    built: bool
    notes: tuple[str, ...] = ()
    materials: tuple[Item, ...] = ()

    @property
    def drive(self) -> str:
        """The drive of every planned run."""
        return self.draft.text("drive")

    @property
    def fluids(self) -> list[Item]:
        """The fluids that may be used, newest first."""
        return list(self.shelf.fluids.values())

    def value(self, column: str) -> float:
        """The SI value of a cell of every planned run, NaN where it is not known."""
        typed = self.draft.quantity(column)
        return np.nan if typed is None else typed.value


def plan_of(
    connection: Connection, code: str, cells: Mapping[str, str] | None = None, fluids: Sequence[str] = ()
) -> Plan:
    """What the next runs of a swimmer are planned by.

    code: of a swimmer on the shelf, or a new name with cells that describe the tail to be built; cells:
    columns of a run (theta0, B, T, rig, drive ...) as typed, columns of a swimmer that are to differ, and E,
    a modulus in place of a batch; fluids: codes, all that are not retired where none is named. What is not
    given comes from the swimmer's last kept run, else from the newest of its form. Refuses unknown codes and
    columns, and cells that cannot be.
    """
    cells = {k: str(v).strip() for k, v in (cells or {}).items() if v is not None and str(v).strip()}
    for key in cells:
        if key not in (*SWIMMER_CELLS, *RUN_CELLS, E_CELL):
            raise Refusal(
                key,
                cells[key],
                "is no cell of a planned run or of a swimmer",
                f"one of {', '.join((*RUN_CELLS, E_CELL, *SWIMMER_CELLS))}",
            )
    item, own_material, built = swimmer_of(connection, code, cells)
    given = {k: v for k, v in cells.items() if k in RUN_CELLS}
    settings, notes = _settings(connection, item, given)
    settings |= {"drive": settings.get("drive") or default_drive(item)}
    rig_id = _rig_id(connection, settings.get("rig"))
    shelf = read_shelf(connection, [], _fluid_ids(connection, fluids), [rig_id] if rig_id else [])
    if not shelf.fluids:
        raise Refusal(
            "fluid", None, "the shelf holds no fluid that is not retired", "add one, or name a retired one"
        )
    made_of = {own_material.id: own_material} if own_material else {}
    shelf = Shelf(dict(sorted(shelf.fluids.items(), reverse=True)), made_of, {item.id: item}, shelf.rigs)
    draft = _draft(item, settings)
    own = frame(
        connection, Question(swimmers=(item.code,)), keys=OWN_KEYS[:-1], texts=("at", "code", "fluid")
    )
    own = own[["at", "code", "fluid", *OWN_KEYS]]
    if built:
        notes.append(f"{code} as planned here is not on the shelf: add it there before its runs are logged")
    batches = connection.scalars(select(material.c.id).where(material.c.retired.is_(False))).all()
    return Plan(
        registry_of(connection),
        shelf,
        item,
        {k: v for k, v in settings.items() if k != "at"},
        draft,
        given,
        shelf.rigs.get(rig_id or 0),
        _rig_range(connection, rig_id),
        own,
        built,
        tuple(notes),
        tuple(read_shelf(connection, [], [], [], batches).materials.values()),
    )


def _settings(connection, item: Item, given: dict[str, str]) -> tuple[dict[str, str], list[str]]:
    """The cells of every planned run, and a sentence for each source that was not the asker."""
    notes = []
    code, of = _last_run(connection, item)
    last = cells_of(connection, run_row(connection, code), track=False) if code else {}
    taken = {k: last[k] for k in TAKEN if k in last and k not in given and _EITHER.get(k) not in given}
    if taken:
        told = ", ".join(f"{k} {v}" for k, v in taken.items())
        notes.append(f"as in {code}, the last kept run of {of}: {told}")
    settings = taken | given
    if "T" not in settings:
        settings["T"], source = _usual_temperature(connection)
        notes.append(f"T {settings['T']}: {source}")
    return settings, notes


def _last_run(connection, item: Item) -> tuple[str | None, str]:
    """(code of the newest kept run of this swimmer, else of its form, and whose it is)."""
    query = select(run.c.code, swimmer.c.code).join(swimmer, swimmer.c.id == run.c.swimmer_id)
    query = query.where(run.c.state == "kept").order_by(run.c.at.desc(), run.c.id.desc()).limit(1)
    found = connection.execute(query.where(swimmer.c.code == item.code)).one_or_none()
    if found:
        return found[0], item.code
    form = item.texts["form"]
    found = connection.execute(query.where(swimmer.c.form == form)).one_or_none()
    return (found[0], f"{found[1]}, the newest of a {form} swimmer") if found else (None, "")


def _usual_temperature(connection) -> tuple[str, str]:
    """(T as typed, where it comes from): mean and scatter of the newest kept runs."""
    column = view_column("T")
    query = select(column).where(resolved.c.state == "kept", column.is_not(None))
    found = np.array(connection.scalars(query.order_by(resolved.c.at.desc()).limit(LAST_T)).all(), float)
    if len(found) < 2:
        return T_ELSE, "no run tells another"
    spread = max(float(found.std(ddof=1)), 0.05)
    return written_in(
        "T", float(found.mean()), spread, "degC"
    ), f"mean and scatter of the newest {len(found)} runs"


def _rig_id(connection, code: str | None) -> int | None:
    if not code:
        return None
    found = connection.scalar(select(rig.c.id).where(rig.c.code == code))
    if found is None:
        raise unknown(connection, rig, "rig", code)
    return found


def _fluid_ids(connection, codes: Sequence[str]) -> list[int]:
    if not codes:
        return list(connection.scalars(select(fluid.c.id).where(fluid.c.retired.is_(False))))
    found = dict(connection.execute(select(fluid.c.code, fluid.c.id).where(fluid.c.code.in_(codes))).all())
    for code in codes:
        if code not in found:
            raise unknown(connection, fluid, "fluid", code)
    return list(found.values())


def _rig_range(connection, rig_id: int | None) -> RigRange:
    if rig_id is None:
        return RigRange()
    f, B = view_column("f"), view_column("B")
    query = select(func.count(), func.min(f), func.max(f), func.max(B)).select_from(
        resolved.join(run, run.c.id == resolved.c.run_id)
    )
    n, low, high, field_high = connection.execute(
        query.where(run.c.rig_id == rig_id, resolved.c.state == "kept")
    ).one()
    return RigRange(n, *(np.nan if v is None else float(v) for v in (low, high, field_high)))


def _draft(item: Item, settings: dict[str, str]) -> Draft:
    """The cells of every planned run, read; f, fluid and at stand in for those to come."""
    stand_in = {"swimmer": item.code, "fluid": "any", "f": "1 Hz", "at": now()}
    draft = whole(read_draft("run", stand_in | settings))
    findings = Findings()
    fits_swimmer(Arrival(draft), item, findings)
    if findings.refused:
        raise all_of(findings.refused)
    return draft


def day_of(plan: Plan) -> int:
    """The ordinal of the local day that is planned for."""
    return local(plan.draft.text("at")).toordinal()


def plausible_frequencies() -> tuple[float, float]:
    """The frequencies that a run may have without a question, Hz."""
    return QUANTITIES["f"].low, QUANTITIES["f"].high
