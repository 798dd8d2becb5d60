"""What was typed on a block of runs, as columns."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np

from labbook.book.cells import Cell
from labbook.book.clock import local
from labbook.registry.quantities import RUN_KEYS
from labbook.registry.typed import DIGITS

KEYS = frozenset((*RUN_KEYS, "T_end"))


@dataclass
class RunFacts:
    """What was typed on a block of runs, as columns.

    values, u: key -> SI array (NaN absent); digits: key -> bool array, no uncertainty was typed;
    swimmer, fluid, rig: ids (rig 0 for none); days: ordinals of local dates; rotating: a rotating drive.
    """

    values: dict[str, np.ndarray]
    u: dict[str, np.ndarray]
    digits: dict[str, np.ndarray]
    swimmer: np.ndarray
    fluid: np.ndarray
    rig: np.ndarray
    days: np.ndarray
    drive: np.ndarray

    def __len__(self) -> int:
        return len(self.swimmer)

    def slice(self, start: int, stop: int) -> "RunFacts":
        """The facts of some of the runs."""
        part = slice(start, stop)
        return RunFacts(
            *({k: a[part] for k, a in table.items()} for table in (self.values, self.u, self.digits)),
            *(a[part] for a in (self.swimmer, self.fluid, self.rig, self.days, self.drive)),
        )


def facts_from(rows) -> RunFacts:
    """Columns from (swimmer_id, fluid_id, rig_id, at, drive, typed document) rows."""
    n = len(rows)
    values, u, digits = _absent(n, np.nan), _absent(n, 0.0), _absent(n, False)
    for i, row in enumerate(rows):
        for key, (_, _, value, spread, origin) in row[5].items():
            values[key][i] = value
            u[key][i] = spread
            if origin == DIGITS:
                digits[key][i] = True
    return _facts(values, u, digits, *([row[k] for row in rows] for k in range(5)))


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


def _facts(values, u, digits, swimmer, fluid, rig, at, drive) -> RunFacts:
    ordinals = {moment: local(moment).toordinal() for moment in set(at)}
    days = [ordinals[moment] for moment in at]
    ids = (np.array(c, dtype=np.int64) for c in (swimmer, fluid, [r or 0 for r in rig], days))
    how = np.empty(len(drive), dtype=object)
    how[:] = drive
    return RunFacts(values, u, digits, *ids, how)
