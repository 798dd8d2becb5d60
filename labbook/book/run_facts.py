"""What was typed on a block of runs, as columns."""

from dataclasses import dataclass

import numpy as np

from labbook.book.clock import local
from labbook.registry.quantities import RUN_KEYS
from labbook.registry.typed import DIGITS


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
    keys = (*RUN_KEYS, "T_end")
    values = {k: np.full(n, np.nan) for k in keys}
    u = {k: np.zeros(n) for k in keys}
    digits = {k: np.zeros(n, bool) for k in keys}
    swimmer, fluid, rig, days = (np.zeros(n, np.int64) for _ in range(4))
    drive = np.empty(n, dtype=object)
    ordinals: dict[str, int] = {}
    for i, (swimmer_id, fluid_id, rig_id, at, how, typed) in enumerate(rows):
        swimmer[i], fluid[i], rig[i], drive[i] = swimmer_id, fluid_id, rig_id or 0, how
        if at not in ordinals:
            ordinals[at] = local(at).toordinal()
        days[i] = ordinals[at]
        for key, (_, _, value, spread, origin) in typed.items():
            values[key][i] = value
            u[key][i] = spread
            if origin == DIGITS:
                digits[key][i] = True
    return RunFacts(values, u, digits, swimmer, fluid, rig, days, drive)
