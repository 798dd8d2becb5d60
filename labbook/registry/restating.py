"""Restating: stored values of a number and their uncertainties, from one dialect into another."""

import math
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from labbook.errors import Refusal
from labbook.physics import rods
from labbook.registry.dialects import MULTIPLES, Choices, completed
from labbook.registry.swimmer_share import DIMENSIONS, drag, exchanged, kinds, needed, share, shared_parts

_CHUNK = 16_000  # rows at a time: more would leave the processor's cache
_LARGEST_ID = 10_000_000


@dataclass(frozen=True)
class Restated:
    """Values in another dialect with the own and shared part of their standard uncertainty.

    u_own, u_shared: None where none was given; why: None, or one sentence (None elsewhere) for each run that
    had a value and lost it.
    """

    value: np.ndarray
    u_own: np.ndarray | None
    u_shared: np.ndarray | None
    why: np.ndarray | None


def restate(
    number: str, value, u_own=None, u_shared=None, *, choices: Choices, house: Choices | None = None,
    inputs: Mapping[str, object],
) -> Restated:  # fmt: skip
    """A number's values, and their uncertainties to first order, from the dialect `house` into another.

    choices: the dialect wanted, what it leaves out being the house's; house: the dialect the values are in
    (left out: as at birth). inputs: SI scalars or arrays (a frame will do) of the swimmers' DIMENSIONS and
    their u_<key>; tail_is_body: where L_tail is L_body itself; swimmer: whole numbers, equal for runs of one
    swimmer, whose dimensions are then looked at once. A change of rate, amplitude, breadth or power needs
    none. NaN stays NaN; a run whose dimension is missing becomes NaN, and `why` says so.
    Errors: Refusal for an unknown number, choice or option, or a dimension without its u_.

    A value is the swimmer's share times what all else brings. From the shared variance the parts of the old
    share are taken and those of the new one join it, each dimension being one source (JCGM 100:2008, 5).
    """
    old, new = completed(number, house or {}), completed(number, choices, house)
    value = np.asarray(value, dtype=float)
    told = [None if u is None else np.broadcast_to(np.asarray(u, dtype=float), value.shape)
            for u in (u_own, u_shared)]  # fmt: skip
    if old == new:
        return Restated(value, *told, None)
    flat = [None if u is None else u.reshape(-1) for u in (value, *told)]
    power = new.get("power", 1) / old.get("power", 1)
    names = exchanged(old, new)
    if names:
        *found, why = _by_swimmer(number, old, new, names, power, flat, _Swimmers(inputs, value.shape))
    else:
        ones = dict.fromkeys(DIMENSIONS, 1.0)
        factor = share(number, new, ones, ()) / share(number, old, ones, ()) ** power
        *found, why = *_moved(*flat, power, float(factor), None), None
    return Restated(*(None if u is None else u.reshape(value.shape) for u in (*found, why)))


def _by_swimmer(number, old, new, names, power, flat, swimmers):
    """(values, own, shared, why) where the swimmers' dimensions matter; their factors are looked up."""
    with np.errstate(all="ignore"):
        factor = share(number, new, swimmers.dims, names) / share(number, old, swimmers.dims, names) ** power
        added = None if flat[2] is None else _added(number, old, new, power, swimmers)
    lost, why = ~np.isfinite(factor), None
    if lost.any():
        said = swimmers.spread(_why(old, new, names, swimmers.dims, lost))
        why = np.where(np.isfinite(flat[0]), said, None)
        why = why if np.not_equal(why, None).any() else None
    if swimmers.ids is None:
        return *_moved(*flat, power, factor, added), why
    by_id = [None if table is None else swimmers.by_id(table) for table in (factor, added)]
    out = [None if u is None else np.empty(u.shape) for u in flat]
    for start in range(0, len(swimmers.ids), _CHUNK):
        rows = slice(start, start + _CHUNK)
        given = (None if u is None else u[rows] for u in flat)
        looked_up = (None if table is None else table.take(swimmers.ids[rows]) for table in by_id)
        for column, piece in zip(out, _moved(*given, power, *looked_up), strict=True):
            if column is not None:
                column[rows] = piece
    return *out, why


def _moved(value, u_own, u_shared, power, factor, added):
    """factor value^power and its own and shared part: by the slope, and by what the dimensions add."""
    with np.errstate(all="ignore"):
        slope = factor
        if power == 4:
            slope = value * value * value * factor
        elif power != 1:
            slope = value**power / value * factor
        spoken = slope * value
        slope = slope * power if power != 1 else slope  # never negative: only positive numbers have powers
        own = None if u_own is None else slope * u_own
        if u_shared is None:
            return spoken, own, None
        shared = slope * u_shared
        if added is not None:
            shared *= shared
            shared += spoken * spoken * added
            shared = np.sqrt(np.maximum(shared, 0.0, out=shared), out=shared)
        return spoken, own, shared


def _added(number, old, new, power, swimmers):
    """What the relative shared variance gains: the new share's parts squared less those of the old one."""
    u = swimmers.spreads(dict.fromkeys((*needed(number, old), *needed(number, new))))
    before, after = (shared_parts(number, c, swimmers.dims, u, swimmers.one_length) for c in (old, new))
    total = np.zeros(swimmers.count)
    for source in {**before, **after}:
        one, two = power * before.get(source, 0.0), after.get(source, 0.0)
        total = total + (two - one) * (two + one)
    return total


class _Swimmers:
    """The dimensions of the distinct swimmers of some runs; of every run where nothing tells them apart."""

    def __init__(self, inputs: Mapping[str, object], shape: tuple[int, ...]):
        self.inputs, self.shape = inputs, shape
        self.ids = _ids(inputs, shape)
        if self.ids is None:
            self.rows, self.count = slice(None), math.prod(shape)
        else:
            self.occur = np.flatnonzero(np.bincount(self.ids))
            one_run = np.empty(self.occur[-1] + 1, np.int64)
            one_run[self.ids] = np.arange(len(self.ids))
            self.rows, self.count = one_run[self.occur], len(self.occur)
        self.dims = {key: self._column(key) for key in DIMENSIONS}
        self.one_length = self._column("tail_is_body") > 0
        missing = self.one_length & np.isnan(self.dims["L_tail"])
        self.dims["L_tail"] = np.where(missing, self.dims["L_body"], self.dims["L_tail"])

    def _column(self, key: str) -> np.ndarray:
        if key not in self.inputs:
            return np.full(self.count, np.nan)
        column = np.asarray(self.inputs[key], dtype=float)
        return np.broadcast_to(column, self.shape).reshape(-1)[self.rows]

    def spreads(self, keys) -> dict[str, np.ndarray]:
        """Standard uncertainties of some dimensions; Refusal for one that has values and no u_."""
        for key in keys:
            if f"u_{key}" not in self.inputs and np.isfinite(self._column(key)).any():
                raise Refusal(f"u_{key}", None, f"is needed to restate an uncertainty, as {key} is given")
        found = {key: self._column(f"u_{key}") for key in keys}
        if "L_tail" in found:
            missing = self.one_length & np.isnan(found["L_tail"])
            found["L_tail"] = np.where(missing, self._column("u_L_body"), found["L_tail"])
        return found

    def by_id(self, column: np.ndarray) -> np.ndarray:
        """A column of the swimmers as a table that their ids look up."""
        table = np.empty(self.occur[-1] + 1, column.dtype)
        table[self.occur] = column
        return table

    def spread(self, column: np.ndarray) -> np.ndarray:
        """A column of the swimmers over their runs."""
        return column if self.ids is None else self.by_id(column)[self.ids]


def _ids(inputs, shape) -> np.ndarray | None:
    if "swimmer" not in inputs:
        return None
    ids = np.asarray(inputs["swimmer"])
    whole = ids.dtype.kind in "iu" and ids.ndim == 1 and ids.shape == shape and ids.size > 0
    # counting makes a table as long as the largest id
    return ids.astype(np.int64, copy=False) if whole and ids.min() >= 0 and ids.max() <= _LARGEST_ID else None


def _why(old, new, names, dims, lost) -> np.ndarray:
    """One sentence for each swimmer that loses its value: the first input that is missing."""
    found = np.full(len(lost), None, dtype=object)
    reasons = []
    if "length" in names:
        reasons += [(np.isnan(dims[c["length"]]), f"needs {c['length']}") for c in (new, old)]
    if "coefficient" in names:
        for model in (new["coefficient"], old["coefficient"]):
            reasons += _lacking(model, dims)
    for missing, sentence in reasons:
        here = lost & missing & np.equal(found, None).astype(bool)
        found[here] = sentence
    return found


def _lacking(model, dims) -> list[tuple[np.ndarray, str]]:
    if model in MULTIPLES:
        return []
    rod, tube, strip = kinds(dims)
    wave = model in rods.MODELS and rods.MODELS[model].needs_wavelength
    return [
        (np.isnan(dims["L_tail"]) & (not wave), "needs L_tail"),
        (~(rod | tube | strip), "needs the section: d, or D, or w and t"),
        (np.isnan(dims["pitch"]) & wave, "needs a helix pitch"),
        (np.isnan(dims["R_helix"]) & (model == "lighthill"), "needs a helix radius"),
        (~np.isfinite(drag(model, dims)), f"the tail is too stout for {model}"),
    ]
