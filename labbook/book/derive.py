"""From facts to the stored row: resolve each run's inputs, then every quantity and number with uncertainty."""

import json
from collections.abc import Iterator
from dataclasses import dataclass
from datetime import date
from functools import cached_property

import numpy as np
import pandas as pd

from labbook.book.block_spread import needed, section_of, spread_of
from labbook.book.gathering import BATCH_KEYS, STATED_BY_RIG, distinct, gather
from labbook.book.run_facts import RunFacts
from labbook.book.shelf import Shelf
from labbook.book.stored_view import BIRTH_KEYS
from labbook.registry.group import Registry
from labbook.registry.quantities import RUN_KEYS

BATCH = 16_000  # rows that a caller hands over at a time: more would leave the processor's cache
STALE_DAYS = 365  # from a rig's calibration to a run: more is a mark on what the run took from the rig


@dataclass
class Derived:
    """The stored row's contents for a block of runs: values in columns, sentences, marks.

    keys: what was derived, in order; columns: three rows a key (value, own, shared), the runs grouped;
    place: where each run stands in them.
    """

    keys: tuple[str, ...]
    columns: np.ndarray
    place: np.ndarray
    sentences: dict[str, np.ndarray]
    marks: list[str]
    material: np.ndarray  # ids, 0 for none

    @cached_property
    def floats(self) -> np.ndarray:
        """One row a run, in the runs' order: value, own and shared uncertainty of each key."""
        return np.ascontiguousarray(self.columns.T)[self.place]

    @property
    def own(self) -> tuple[str, ...]:
        """The group's own numbers among the keys."""
        return tuple(k for k in self.keys if k not in BIRTH_KEYS)

    def of(self, key: str) -> np.ndarray:
        """Value, own and shared uncertainty of one key: one row a run, in the runs' order."""
        first = 3 * self.keys.index(key)
        return self.columns[first : first + 3, self.place].T


def derive(facts: RunFacts, shelf: Shelf, registry: Registry, wanted: tuple[str, ...] = ()) -> Derived:
    """Every resolved quantity and number of the runs with its own and shared standard uncertainty.

    wanted: derive only these numbers. Takes any number of runs; a caller with more than BATCH of them keeps
    memory small by slicing.
    """
    keys = wanted or registry.keys
    gathered = gather(facts, shelf, needed(registry, wanted))
    columns = np.empty((3 * len(keys), len(facts)))
    order = []
    done = 0
    with np.errstate(all="ignore"):
        for rows in blocks_alike(facts, shelf):
            spread = spread_of(gathered, rows, registry, wanted)
            _fill(columns[:, done : done + len(rows)], spread, keys)
            order.append(rows)
            done += len(rows)
    place = np.empty(len(facts), np.int64)
    place[np.concatenate(order)] = np.arange(len(facts))
    sentences = {f"{k}_from": gathered.batch[k].said for k in BATCH_KEYS}
    return Derived(keys, columns, place, sentences, _marks(facts, shelf, gathered), gathered.material)


def blocks_alike(facts: RunFacts, shelf: Shelf) -> Iterator[np.ndarray]:
    """Row indices by what changes the arithmetic: section, form and drive."""
    drive, drives = pd.factorize(facts.drive)
    kind_of = {
        i: (section_of(s), s.texts["form"], "L_tail" in s.typed) for i, s in shelf.swimmers.items()
    }
    kinds = sorted(set(kind_of.values()), key=str)
    number = {i: kinds.index(k) for i, k in kind_of.items()}
    ids, which = distinct(facts.swimmer)
    groups = np.array([number[int(i)] for i in ids])[which] * len(drives) + drive
    for k in range(len(kinds) * len(drives)):
        rows = np.flatnonzero(groups == k)
        if len(rows):
            yield rows


def _fill(columns, spread, keys) -> None:
    """Value, own and shared of each key into a block's columns; one absent value makes all three absent."""
    for i, key in enumerate(keys):
        three = columns[3 * i : 3 * i + 3]
        three[0] = spread.values[key]
        three[1], three[2] = spread.sizes(key)
        nothing = three[0] + three[1] + three[2]
        nothing -= nothing  # 0 where all three are finite, else NaN; a mask takes four times as long
        three += nothing


def _marks(facts, shelf, gathered) -> list[str]:
    """One small JSON text a run: key to list of marks."""
    batch = gathered.batch
    flags = [("mu", batch["mu"].beyond, "extrapolated"), ("rho", batch["rho"].beyond, "extrapolated")]
    by_rig = {k: [i for i, rig in shelf.rigs.items() if f"u_{k}" in rig.typed] for k in STATED_BY_RIG}
    for key in RUN_KEYS:
        digits = facts.digits[key]
        flags.append((key, digits & ~np.isin(facts.rig, by_rig[key]) if by_rig.get(key) else digits, "from digits"))
    flags += [(key, mask, "reduced") for key, mask in facts.reduced.items()]
    codes = _bits(array for _, array, _ in flags)
    unique, which = distinct(codes)
    texts = [json.dumps(_told(flags, code)) for code in unique]
    marks = [texts[i] for i in which]
    age = _calibration_age(facts, gathered.rigs)
    old = np.flatnonzero(age > STALE_DAYS)
    if len(old):
        _mark_old_calibrations(marks, old, age[old].astype(np.int64), codes[old], flags, _from_rig(facts, by_rig, gathered))
    return marks


def _bits(masks) -> np.ndarray:
    return sum(array.astype(np.int64) << i for i, array in enumerate(masks))


def _told(flags, code) -> dict[str, list[str]]:
    told: dict[str, list[str]] = {}
    for i, (key, _, mark) in enumerate(flags):
        if code >> i & 1:
            told.setdefault(key, []).append(mark)
    return told


def _calibration_age(facts, rigs) -> np.ndarray:
    """Days from the rig's calibration to the run; NaN without rig or date."""

    def day(rig):
        on = rig.texts["calibrated"]
        return (float(date.fromisoformat(on).toordinal()) if on else np.nan, 0.0)

    return facts.days - rigs.pick(slice(None), day)[0]


def _from_rig(facts, by_rig, gathered) -> list[tuple[str, np.ndarray]]:
    """(key, which runs' value took something from the rig): a stated u, the coil constant, the camera's scale."""
    found = [(k, facts.digits[k] & np.isin(facts.rig, ids)) for k, ids in by_rig.items() if ids]
    constant = gathered.rigs.pick(slice(None), lambda rig: (rig.value("current_to_B") or np.nan, 0.0))[0]
    found.append(("B", ~np.isfinite(facts.values["B"]) & np.isfinite(facts.values["I_coil"] * constant)))
    return found + [(key, relative > 0) for key, relative in facts.scale_u.items()]


def _mark_old_calibrations(marks, rows, days, codes, flags, from_rig) -> None:
    """Write the marks of some runs again, with the age of the rig's calibration where a value took from the rig."""
    more = _bits(array[rows] for _, array in from_rig)
    which = codes | more << len(flags) | days << len(flags) + len(from_rig)
    _, first, place = np.unique(which, return_index=True, return_inverse=True)
    texts = []
    for i in first:
        told = _told(flags, codes[i])
        for j, (key, _) in enumerate(from_rig):
            if more[i] >> j & 1:
                told.setdefault(key, []).append(f"rig calibrated {days[i]} days before")
        texts.append(json.dumps(told))
    for row, i in zip(rows.tolist(), place.tolist(), strict=True):
        marks[row] = texts[i]
