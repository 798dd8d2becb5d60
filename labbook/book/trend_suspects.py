"""What may have been off where a run lies far from the curve: the readings and settings it rests on."""

import numpy as np

from labbook.book.trend_source import TrendRuns
from labbook.physics.trend_causes import Cause

# source of a run -> name of the cause
OWN = {"T": "temperature", "theta0": "amplitude", "h0": "amplitude h0", "A_tip": "amplitude A_tip"}
SHARED = {
    "E": "E", "mu_readings": "fluid reading", "grade": "nominal grade", "glycerol": "glycerol share",
    "mu_model": "viscosity correlation",
}  # fmt: skip
BEYOND = "its temperature lies beyond the fluid's readings"
# house rule: b/h_wall from which Faxen's factor raises the head's drag by 6 %
NEAR = 0.1
BESIDE_WALL = "its head is nearer the wall than ten of its radii"


def suspects(runs: TrendRuns) -> tuple[Cause, ...]:
    """A Cause for each source that reaches x or y of some run, and for a wall nearby; (n,) arrays.

    A wall slows: where y grows with U it explains a run below the curve, elsewhere either.
    """
    found = [Cause(name, *runs.own[source]) for source, name in OWN.items() if _reaches(runs.own.get(source))]
    for source in runs.shared:
        if source.name in SHARED and _reaches((source.x, source.y)):
            of_fluid = source.name != "E"
            flag, note = (runs.beyond, BEYOND) if of_fluid else (None, "")
            found.append(Cause(SHARED[source.name], source.x, source.y, source.owner, flag, note))
    near = np.nan_to_num(runs.wall) > NEAR
    if near.any():
        by_speed = runs.own.get("U", (0.0, 0.0))[1]
        sign = -1 if np.any(by_speed) and np.all(np.asarray(by_speed) >= 0.0) else 0
        found.append(Cause("wall", flag=near, note=BESIDE_WALL, sign=sign))
    return tuple(found)


def _reaches(parts) -> bool:
    return parts is not None and bool(np.any(parts[0]) or np.any(parts[1]))
