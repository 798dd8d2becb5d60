"""What a block of runs is derived from: typed values with their uncertainties, the shelf's cells, the day's batches."""

from collections.abc import Set
from dataclasses import dataclass

import numpy as np

from labbook.book.batch_means import modulus, relaxation_time
from labbook.book.densities import density
from labbook.book.resolved import Resolved
from labbook.book.run_facts import RunFacts
from labbook.book.shelf import Shelf
from labbook.book.viscosities import viscosity

ABSENT = (np.nan, 0.0)
BATCH_KEYS = ("mu", "rho", "lam", "E")  # properties of a batch on the run's day
STATED_BY_RIG = ("f", "theta0", "B", "T")


def distinct(ids: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """(the ids that occur, ascending, and which of them each is): np.unique for small counts, without sorting."""
    occur = np.flatnonzero(np.bincount(ids))
    place = np.empty(occur[-1] + 1, np.int64)
    place[occur] = np.arange(len(occur))
    return occur, place[ids]


class Gathered:
    """Cells of shelf records spread over the runs that refer to them."""

    def __init__(self, ids, items):
        unique, self.which = distinct(ids)
        self.items = [items.get(int(i)) for i in unique]

    def pick(self, block, cell):
        """(values, u) over a block of runs of `cell(record) -> (value, u)`."""
        cells = [cell(item) if item is not None else ABSENT for item in self.items]
        table = np.array(cells, dtype=float).reshape(-1, 2)
        which = self.which[block]
        return table[which, 0], table[which, 1]


@dataclass
class Gathering:
    """All that some runs are derived from.

    values, u: what was typed on the runs, the rig's stated uncertainties and the mean temperature in place;
    batch: key -> the batch's property on each run's day; swimmers, rigs: their cells spread over the runs;
    material: ids, 0 for none.
    """

    facts: RunFacts
    shelf: Shelf
    values: dict[str, np.ndarray]
    u: dict[str, np.ndarray]
    batch: dict[str, Resolved]
    swimmers: Gathered
    rigs: Gathered
    material: np.ndarray


def gather(facts: RunFacts, shelf: Shelf, keys: Set[str]) -> Gathering:
    """What the runs are derived from, as far as `keys` need it."""
    values, u = dict(facts.values), {k: a.copy() for k, a in facts.u.items()}
    _rig_uncertainties(facts, shelf, values, u)
    _mean_temperature(values, u)
    swimmers, rigs = Gathered(facts.swimmer, shelf.swimmers), Gathered(facts.rig, shelf.rigs)
    material = swimmers.pick(slice(None), lambda s: (s.texts["material_id"] or 0, 0.0))[0].astype(np.int64)
    batch = batches_of(facts, material, shelf, values["T"], u["T"], keys)
    return Gathering(facts, shelf, values, u, batch, swimmers, rigs, material)


def _rig_uncertainties(facts, shelf, values, u) -> None:
    """Where the digits alone tell the uncertainty, the rig's stated one is better."""
    for rig_id, rig in shelf.rigs.items():
        here = facts.rig == rig_id
        for key in STATED_BY_RIG:
            stated = rig.typed.get(f"u_{key}")
            if stated is None:
                continue
            rows = here & facts.digits[key]
            size = np.abs(values[key][rows]) if stated[4] == "relative" else 1.0
            u[key][rows] = stated[2] * size
            if key == "T":
                rows = here & facts.digits["T_end"]
                u["T_end"][rows] = stated[2] * (values["T_end"][rows] if stated[4] == "relative" else 1.0)


def _mean_temperature(values, u) -> None:
    """T_end given: T is the mean, and half the difference, rectangular, joins its uncertainty."""
    start, end = values["T"], values["T_end"]
    both = np.isfinite(start) & np.isfinite(end)
    if both.any():
        half = np.abs(end - start)[both] / 2
        # one thermometer: its uncertainty does not shrink by reading it twice
        larger = np.maximum(u["T"][both], u["T_end"][both])
        values["T"] = np.where(both, (start + end) / 2, start)
        u["T"][both] = np.sqrt(larger**2 + half**2 / 3)


def batches_of(facts: RunFacts, material, shelf: Shelf, T, u_T, keys) -> dict[str, Resolved]:
    """mu, rho, lam by fluid and E by material, each run by its own day; those that are not in `keys` stay empty."""
    found = {k: Resolved.empty(len(facts), "") for k in BATCH_KEYS}
    for fluid_id in distinct(facts.fluid)[0] if keys & {"mu", "rho", "lam"} else ():
        rows = np.flatnonzero(facts.fluid == fluid_id)
        item, days = shelf.fluids[int(fluid_id)], facts.days[rows]
        rho = density(item, days, T[rows], u_T[rows])
        mu = viscosity(item, days, T[rows], u_T[rows], rho)
        for key, part in (("rho", rho), ("mu", mu), ("lam", relaxation_time(item, days))):
            found[key].put(rows, part.value, part.parts, part.said, part.beyond)
    for material_id in distinct(material)[0] if "E" in keys else ():
        rows = np.flatnonzero(material == material_id)
        if material_id:
            part = modulus(shelf.materials[int(material_id)], facts.days[rows])
            found["E"].put(rows, part.value, part.parts, part.said, part.beyond)
        else:
            codes = [shelf.swimmers[int(i)].code for i in facts.swimmer[rows]]
            found["E"].said[rows] = [f"absent: swimmer {code} names no material" for code in codes]
    return found
