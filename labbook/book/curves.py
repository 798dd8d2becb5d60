"""A fluid's viscosity over temperature as the book resolves it: its readings, and one curve for each set."""

from dataclasses import replace
from datetime import date

import numpy as np
import pandas as pd
from sqlalchemy import Connection, select

from labbook.book.densities import density
from labbook.book.sets import ReadingSet, sets_of
from labbook.book.shelf import Item, read_shelf
from labbook.book.tables import fluid
from labbook.book.viscosities import SINGLE_READING_REACH, viscosity
from labbook.errors import Refusal

POINTS = 61
REACH = 5.0  # K beyond a lone reading that a correlation carries
BY_COMPOSITION = (278.15, 313.15)  # K: the span of a curve that follows from the composition alone
FROM_COMPOSITION = "from its composition"


def viscosity_frames(connection: Connection, fluid_code: str) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Readings (T, value, u, on, key, rho) and curves (T, mu, low, high, set) of one fluid, in SI.

    Void readings are left out. Each set's curve comes from the rule that serves runs, book.viscosities.viscosity,
    with that set alone, over the temperatures it was measured at; low and high are one standard uncertainty
    of the curve away. A fluid without readings has the curve of its composition, where there is one.
    Errors: Refusal for an unknown fluid.
    """
    fluid_id = connection.scalar(select(fluid.c.id).where(fluid.c.code == fluid_code))
    if fluid_id is None:
        raise Refusal("fluid", fluid_code, "the book has no such fluid")
    item = read_shelf(connection, swimmers=[], fluids=[fluid_id], rigs=[]).fluids[fluid_id]
    sets = sets_of(item.readings, ("mu", "nu"), item.texts["made"])
    readings = [
        {
            "T": r.T,
            "value": r.value,
            "u": r.u,
            "on": group.on,
            "key": r.key,
            "rho": _density(item, group, np.array([r.T]))[0],
        }
        for group in sets
        for r in group.readings
    ]
    curves = [_curve(item, group) for group in sets]
    if not sets:
        curves = [_resolved(item, _today(), np.linspace(*BY_COMPOSITION, POINTS), FROM_COMPOSITION)]
    columns = ["T", "mu", "low", "high", "set"]
    drawn = [c for c in curves if len(c)]
    return (
        pd.DataFrame(readings, columns=["T", "value", "u", "on", "key", "rho"]),
        pd.concat(drawn, ignore_index=True) if drawn else pd.DataFrame(columns=columns),
    )


def _curve(item: Item, group: ReadingSet) -> pd.DataFrame:
    """The curve of one set, and nothing else of the fluid's viscosity readings."""
    others = tuple(r for r in item.readings if r.key not in ("mu", "nu"))
    alone = replace(item, readings=(*others, *group.readings))
    T = np.array([r.T for r in group.readings])
    low, high = T.min(), T.max()
    if high - low < SINGLE_READING_REACH:
        carried = viscosity(
            alone,
            _day(group),
            np.array([low + REACH]),
            np.zeros(1),
            density(alone, _day(group), np.array([low + REACH]), np.zeros(1)),
        )
        reach = (
            REACH if carried.beyond is not None and not carried.beyond[0] else SINGLE_READING_REACH
        )
        low, high = low - reach, high + reach
    return _resolved(alone, _day(group), np.linspace(low, high, POINTS), group.on)


def _resolved(item: Item, day: np.ndarray, T: np.ndarray, label: str | None) -> pd.DataFrame:
    days, exact = np.full(len(T), day[0]), np.zeros(len(T))
    found = viscosity(item, days, T, exact, density(item, days, T, exact))
    u = np.sqrt(sum((np.asarray(p) ** 2 for p in found.parts.values()), np.zeros(len(T))))
    table = pd.DataFrame(
        {"T": T, "mu": found.value, "low": found.value - u, "high": found.value + u, "set": label}
    )
    return table[np.isfinite(table["mu"])]


def _density(item: Item, group: ReadingSet, T: np.ndarray) -> np.ndarray:
    return density(item, _day(group), T, np.zeros(1)).value


def _day(group: ReadingSet) -> np.ndarray:
    return np.array([date.fromisoformat(group.on).toordinal()]) if group.on else _today()


def _today() -> np.ndarray:
    return np.array([date.today().toordinal()])
