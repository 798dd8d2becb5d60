"""Warnings that compare with what the book already holds: a run with its swimmer's, a reading with its batch's."""

from dataclasses import replace

import numpy as np
from sqlalchemy import Connection, func, select

from labbook.book.batch_means import modulus, relaxation_time
from labbook.book.densities import density
from labbook.book.resolved import Resolved
from labbook.book.sets import sets_of
from labbook.book.shelf import Item, Reading
from labbook.book.stored_view import resolved
from labbook.book.viscosities import viscosity
from labbook.registry.written import shown, written

FACTOR = 5.0
ENOUGH = 3
SIMILAR_SP = 1.2
READING_FACTOR = 10.0
SAME_T = 10.0  # K: beyond it a lone reading that nothing carries says nothing about another temperature


def enough_runs(connection: Connection, swimmer_ids, before: int) -> set[int]:
    """The swimmers with three or more kept runs among the runs with ids below `before`."""
    found = set()
    for swimmer_id in set(swimmer_ids):
        some = select(resolved.c.run_id).where(*_mine(swimmer_id, before)).limit(ENOUGH).subquery()
        if connection.scalar(select(func.count()).select_from(some)) >= ENOUGH:
            found.add(swimmer_id)
    return found


def _mine(swimmer_id: int, before: int):
    return resolved.c.swimmer_id == swimmer_id, resolved.c.state == "kept", resolved.c.run_id < before


class KnownRuns:
    """Each swimmer's kept runs with ids below `before`, read once: for a sheet, where a query a row would take long."""

    def __init__(self, connection: Connection, before: int):
        self.connection, self.before = connection, before
        self._columns: dict[int, np.ndarray] = {}

    def span(self, swimmer_id: int, key: str, Sp: float | None = None) -> tuple[float, float] | None:
        """As _span: smallest and largest positive value, among the runs of similar Sp where Sp is given."""
        if swimmer_id not in self._columns:
            query = select(resolved.c.Sp, resolved.c.Re, resolved.c.U_cap)
            rows = self.connection.execute(query.where(*_mine(swimmer_id, self.before))).fetchall()
            read = np.array([tuple(r) for r in rows], dtype=float).reshape(-1, 3).T
            self._columns[swimmer_id] = read[:, np.argsort(read[0])]  # by Sp, absent last
        columns = self._columns[swimmer_id]
        values = columns[("Sp", "Re", "U").index(key)]
        if Sp is not None:
            first = np.searchsorted(columns[0], Sp / SIMILAR_SP, "left")
            values = values[first : np.searchsorted(columns[0], Sp * SIMILAR_SP, "right")]
        values = values[values > 0]
        return (float(values.min()), float(values.max())) if len(values) >= ENOUGH else None


def run_warnings(
    connection: Connection, swimmer_id: int, values: dict, before: int, leave_out: int = 0,
    known: KnownRuns | None = None,
) -> list[tuple[str, str]]:  # fmt: skip
    """(column, sentence) where Sp, Re or U lies far outside this swimmer's kept runs.

    values: Sp, Re, U, u_U of the new run in SI, NaN where absent; before: only runs with lower ids count;
    leave_out: the id of the run that is being amended; known: the swimmer's runs if they are read already.
    """
    mine = (*_mine(swimmer_id, before), resolved.c.run_id != leave_out)
    found = []
    moving = abs(values["U"]) > 2 * values["u_U"] if np.isfinite(values["U"]) else False
    for key, field in (("Sp", "f"), ("Re", "U")):
        span = known.span(swimmer_id, key) if known else _span(connection, resolved.c[key], *mine)
        found += _outside(key, field, values[key], span, moving or key == "Sp", written)
    if np.isfinite(values["U"]):
        # among similar Sp; without an Sp (T not typed, say) among all of them
        Sp = values["Sp"] if np.isfinite(values["Sp"]) else None
        similar = () if Sp is None else (resolved.c.Sp.between(Sp / SIMILAR_SP, Sp * SIMILAR_SP),)
        span = (
            known.span(swimmer_id, "U", Sp) if known else _span(connection, resolved.c.U_cap, *mine, *similar)
        )
        found += _outside("U", "U", values["U"], span, moving, lambda v: shown("U", v))
    return found


def _span(connection, column, *where) -> tuple[float, float] | None:
    """Smallest and largest size of the positive values, None where fewer than ENOUGH are there."""
    # asked one by one, each is the first entry of an index; together they would read all of it
    low, high = (select(f(column)).where(*where, column > 0).scalar_subquery() for f in (func.min, func.max))
    some = select(column).where(*where, column > 0).limit(ENOUGH).subquery()
    if connection.scalar(select(func.count()).select_from(some)) < ENOUGH:
        return None
    return tuple(connection.execute(select(low, high)).one())


def _outside(key, field, value, span, checks_low, say):
    if span is None or not np.isfinite(value):
        return []
    low, high = span
    size = abs(value)
    if size > FACTOR * high:
        return [(field, f"{key} = {say(value)} is {_factor(size / high)} times the largest of this swimmer's runs: "
                 f"{_guess(field)}")]  # fmt: skip
    if checks_low and size < low / FACTOR:
        return [(field, f"{key} = {say(value)} is {_factor(low / size)} times below the smallest of this swimmer's "
                 f"runs: {_guess(field)}")]  # fmt: skip
    return []


def _guess(field: str) -> str:
    return {"U": "mm/s typed as m/s, or per minute as per second?", "f": "rpm typed as Hz, or another fluid?"}[
        field
    ]


def reading_warning(item: Item, new: Reading) -> tuple[str, str] | None:
    """(column, sentence) where a reading is ten times off its batch's last at that temperature."""
    keys = ("mu", "nu") if new.key in ("mu", "nu") else (new.key,)
    sets = sets_of(item.readings, keys, item.texts["made"])
    if not sets:
        return None
    last = sets[-1]
    of_density = () if new.key == "rho" else tuple(r for r in item.readings if r.key == "rho")
    before = _last_value(replace(item, readings=(*last.readings, *of_density)), new)
    if before is None or not np.isfinite(before) or before <= 0:
        return None
    ratio = new.value / before
    if 1 / READING_FACTOR < ratio < READING_FACTOR:
        return None
    times = f"{_factor(ratio)} times" if ratio > 1 else f"{_factor(1 / ratio)} times below"
    hint = {"mu": "mPa.s typed as Pa.s", "nu": "cSt typed as m2/s", "E": "kPa typed as MPa",
            "rho": "g/cm3 typed as kg/m3", "lam": "ms typed as s"}[new.key]  # fmt: skip
    return "value", f"{times} this batch's last reading ({last.day}): {hint}, or the other way round?"


def _last_value(item: Item, new: Reading) -> float | None:
    day = np.zeros(1, np.int64)
    if new.key in ("E", "lam"):
        found = modulus(item, day) if new.key == "E" else relaxation_time(item, day)
        return float(found.value[0])
    T = np.array([new.T if new.T is not None else np.nan])
    rho = density(item, day, T, np.zeros(1))
    if new.key == "rho":
        return float(rho.value[0])
    viscous = [r for r in item.readings if r.key != "rho"]
    if new.key == "nu" and all(r.key == "nu" for r in viscous):
        rho = Resolved(np.ones(1))  # nu against nu needs no density
    if "constant" in (found := viscosity(item, day, T, np.zeros(1), rho)).said[0]:
        if min(abs(r.T - new.T) for r in viscous) > SAME_T:
            return None
    mu = float(found.value[0])
    return mu if new.key == "mu" else mu / float(rho.value[0])


def _factor(ratio: float) -> str:
    """'5.3', '47' or '1020', never a power of ten: people read it at the bench."""
    if ratio >= 1e6:
        return "over a million"
    return f"{ratio:.2g}" if ratio < 100 else f"{float(f'{ratio:.3g}'):.0f}"
