"""From facts to the stored row: resolve each run's inputs, then every quantity and number with uncertainty."""

import json
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from labbook.book.batch_means import modulus, relaxation_time
from labbook.book.block_spread import Gathered, distinct, section_of, spread_of
from labbook.book.densities import density
from labbook.book.resolved import Resolved
from labbook.book.run_facts import RunFacts
from labbook.book.shelf import Shelf
from labbook.book.stored_view import KEYS
from labbook.book.viscosities import viscosity
from labbook.registry.quantities import RUN_KEYS

BATCH = 16_000  # rows that a caller hands over at a time: more would leave the processor's cache

STATED_BY_RIG = ("f", "theta0", "B", "T")


@dataclass
class Derived:
    """The stored row's contents for a block of runs: values in columns, sentences, marks.

    columns: one row a stored column, its runs grouped; place: where each run stands in them.
    """

    columns: np.ndarray
    place: np.ndarray
    sentences: dict[str, np.ndarray]
    marks: list[str]
    material: np.ndarray  # ids, 0 for none

    @cached_property
    def floats(self) -> np.ndarray:
        """One row a run, in the runs' order, in stored column order."""
        return np.ascontiguousarray(self.columns.T)[self.place]


def derive(facts: RunFacts, shelf: Shelf) -> Derived:
    """Every resolved quantity and number of the runs with its own and shared standard uncertainty.

    Takes any number of runs; a caller with more than BATCH of them keeps memory small by slicing.
    """
    values, u = dict(facts.values), {k: a.copy() for k, a in facts.u.items()}
    _rig_uncertainties(facts, shelf, values, u)
    _mean_temperature(values, u)
    swimmers, rigs = Gathered(facts.swimmer, shelf.swimmers), Gathered(facts.rig, shelf.rigs)
    material = swimmers.pick(slice(None), lambda s: (s.texts["material_id"] or 0, 0.0))[0].astype(np.int64)
    batch = _batches(facts, material, shelf, values["T"], u["T"])
    columns = np.empty((3 * len(KEYS), len(facts)))
    order = []
    done = 0
    with np.errstate(all="ignore"):
        for rows in _groups(facts, shelf):
            group = shelf.swimmers[int(facts.swimmer[rows[0]])]
            spread = spread_of(rows, group, facts, shelf, values, u, batch, swimmers, rigs)
            _fill(columns[:, done : done + len(rows)], spread)
            order.append(rows)
            done += len(rows)
    place = np.empty(len(facts), np.int64)
    place[np.concatenate(order)] = np.arange(len(facts))
    sentences = {f"{k}_from": batch[k].said for k in ("mu", "rho", "lam", "E")}
    return Derived(columns, place, sentences, _marks(facts, shelf, batch), material)


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


def _batches(facts, material, shelf, T, u_T) -> dict[str, Resolved]:
    """mu, rho, lam by fluid and E by material, each run by its own day."""
    n = len(facts)
    found = {k: Resolved.empty(n, "") for k in ("mu", "rho", "lam", "E")}
    for fluid_id in distinct(facts.fluid)[0]:
        rows = np.flatnonzero(facts.fluid == fluid_id)
        item, days = shelf.fluids[int(fluid_id)], facts.days[rows]
        rho = density(item, days, T[rows], u_T[rows])
        mu = viscosity(item, days, T[rows], u_T[rows], rho)
        for key, part in (("rho", rho), ("mu", mu), ("lam", relaxation_time(item, days))):
            found[key].put(rows, part.value, part.parts, part.said, part.beyond)
    for material_id in distinct(material)[0]:
        rows = np.flatnonzero(material == material_id)
        if material_id:
            part = modulus(shelf.materials[int(material_id)], facts.days[rows])
            found["E"].put(rows, part.value, part.parts, part.said, part.beyond)
        else:
            codes = [shelf.swimmers[int(i)].code for i in facts.swimmer[rows]]
            found["E"].said[rows] = [f"absent: swimmer {code} names no material" for code in codes]
    return found


def _groups(facts, shelf):
    """Row indices by what changes the arithmetic: section, form and drive."""
    kind_of = {
        i: (section_of(s), s.texts["form"], "L_tail" in s.typed) for i, s in shelf.swimmers.items()
    }
    kinds = sorted(set(kind_of.values()), key=str)
    number = {i: kinds.index(k) for i, k in kind_of.items()}
    ids, which = distinct(facts.swimmer)
    groups = np.array([number[int(i)] for i in ids])[which]
    for k in range(len(kinds)):
        rows = np.flatnonzero(groups == k)
        if len(rows):
            yield rows


def _fill(columns, spread) -> None:
    """Value, own and shared of each key into a block's columns; one absent value makes all three absent."""
    for i, key in enumerate(KEYS):
        three = columns[3 * i : 3 * i + 3]
        three[0] = spread.values[key]
        three[1], three[2] = spread.sizes(key)
        nothing = three[0] + three[1] + three[2]
        nothing -= nothing  # 0 where all three are finite, else NaN; a mask takes four times as long
        three += nothing


def _marks(facts, shelf, batch) -> list[str]:
    """One small JSON text a run: key to list of marks."""
    flags = [("mu", batch["mu"].beyond, "extrapolated"), ("rho", batch["rho"].beyond, "extrapolated")]
    by_rig = {k: [i for i, rig in shelf.rigs.items() if f"u_{k}" in rig.typed] for k in STATED_BY_RIG}
    for key in RUN_KEYS:
        digits = facts.digits[key]
        flags.append((key, digits & ~np.isin(facts.rig, by_rig[key]) if by_rig.get(key) else digits, "from digits"))
    codes = sum(array.astype(np.int64) << i for i, (_, array, _) in enumerate(flags))
    unique, which = distinct(codes)
    texts = [json.dumps({k: [m] for i, (k, _, m) in enumerate(flags) if code >> i & 1}) for code in unique]
    return [texts[i] for i in which]
