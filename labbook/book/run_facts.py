"""What was typed on a block of runs, as columns."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np

from labbook.book.cells import Cell
from labbook.book.clock import local
from labbook.book.reduced_cells import LENGTHS
from labbook.registry.quantities import RUN_KEYS
from labbook.registry.typed import DIGITS, REDUCED

KEYS = frozenset((*RUN_KEYS, "T_end"))


@dataclass
class RunFacts:
    """What was typed on a block of runs, as columns.

    values, u: key -> SI array (NaN absent); digits: key -> bool array, no uncertainty was typed;
    swimmer, fluid, rig: ids (rig 0 for none); days: ordinals of local dates; drive: words.
    reduced: key -> bool array, the value comes from a track; scale_u: key -> relative standard uncertainty of the
    camera's scale in it, 0 where there is none; both only for keys that some run of the block has so.
    """

    values: dict[str, np.ndarray]
    u: dict[str, np.ndarray]
    digits: dict[str, np.ndarray]
    swimmer: np.ndarray
    fluid: np.ndarray
    rig: np.ndarray
    days: np.ndarray
    drive: np.ndarray
    reduced: dict[str, np.ndarray] = field(default_factory=dict)
    scale_u: dict[str, np.ndarray] = field(default_factory=dict)

    def __len__(self) -> int:
        return len(self.swimmer)

    def slice(self, start: int, stop: int) -> "RunFacts":
        """The facts of some of the runs."""
        part = slice(start, stop)
        return RunFacts(
            *({k: a[part] for k, a in table.items()} for table in (self.values, self.u, self.digits)),
            *(a[part] for a in (self.swimmer, self.fluid, self.rig, self.days, self.drive)),
            *({k: a[part] for k, a in table.items()} for table in (self.reduced, self.scale_u)),
        )


def facts_from(rows) -> RunFacts:
    """Columns from (swimmer_id, fluid_id, rig_id, at, drive, typed document) rows."""
    n = len(rows)
    values, u, digits = _absent(n, np.nan), _absent(n, 0.0), _absent(n, False)
    values["scale"], u["scale"] = np.full(n, np.nan), np.zeros(n)
    from_track: dict[str, list[int]] = {}
    for i, row in enumerate(rows):
        for key, (_, _, value, spread, origin) in row[5].items():
            values[key][i] = value
            u[key][i] = spread
            if origin == DIGITS:
                digits[key][i] = True
            elif origin == REDUCED:
                from_track.setdefault(key, []).append(i)
    scale, u_scale = values.pop("scale"), u.pop("scale")
    reduced = {k: _mask(n, from_track[k]) for k in (*LENGTHS, "f") if k in from_track}
    relative = u_scale / scale if "scale" in from_track else np.zeros(n)
    scale_u = {k: np.where(reduced[k] & (relative > 0), relative, 0.0) for k in LENGTHS if k in reduced}
    return _facts(values, u, digits, *([row[k] for row in rows] for k in range(5)), reduced, scale_u)


def _mask(n: int, rows: list[int]) -> np.ndarray:
    mask = np.zeros(n, bool)
    mask[rows] = True
    return mask


def facts_of_cells(cells: Mapping[str, Sequence[Cell]], swimmer, fluid, rig, at, drive) -> RunFacts:
    """Columns from the cells of each quantity and a list of each of the rest (rig None for none)."""
    n = len(swimmer)
    values, u, digits = _absent(n, np.nan), _absent(n, 0.0), _absent(n, False)
    for key in KEYS & cells.keys():
        values[key] = np.array([c.value for c in cells[key]])
        u[key] = np.array([c.u for c in cells[key]])
        digits[key] = np.array([c.digits for c in cells[key]])
    return _facts(values, u, digits, swimmer, fluid, rig, at, drive)


def _absent(n: int, cell) -> dict[str, np.ndarray]:
    return {k: np.full(n, cell) for k in KEYS}


def _facts(values, u, digits, swimmer, fluid, rig, at, drive, reduced=None, scale_u=None) -> RunFacts:
    ordinals = {moment: local(moment).toordinal() for moment in set(at)}
    days = [ordinals[moment] for moment in at]
    ids = (np.array(c, dtype=np.int64) for c in (swimmer, fluid, [r or 0 for r in rig], days))
    how = np.empty(len(drive), dtype=object)
    how[:] = drive
    return RunFacts(values, u, digits, *ids, how, reduced or {}, scale_u or {})
