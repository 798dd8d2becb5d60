"""From facts to the stored row: resolve each run's inputs, then every quantity and number with uncertainty."""

import json
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from labbook.book.block_spread import needed, section_of, spread_of
from labbook.book.gathering import BATCH_KEYS, STATED_BY_RIG, distinct, gather
from labbook.book.run_facts import RunFacts
from labbook.book.shelf import Shelf
from labbook.book.stored_view import BIRTH_KEYS
from labbook.registry.group import Registry
from labbook.registry.quantities import RUN_KEYS

BATCH = 16_000  # rows that a caller hands over at a time: more would leave the processor's cache


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
        for rows in _groups(facts, shelf):
            spread = spread_of(gathered, rows, registry, wanted)
            _fill(columns[:, done : done + len(rows)], spread, keys)
            order.append(rows)
            done += len(rows)
    place = np.empty(len(facts), np.int64)
    place[np.concatenate(order)] = np.arange(len(facts))
    sentences = {f"{k}_from": gathered.batch[k].said for k in BATCH_KEYS}
    return Derived(keys, columns, place, sentences, _marks(facts, shelf, gathered.batch), gathered.material)


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


def _fill(columns, spread, keys) -> None:
    """Value, own and shared of each key into a block's columns; one absent value makes all three absent."""
    for i, key in enumerate(keys):
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
