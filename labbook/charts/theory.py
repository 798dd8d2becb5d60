"""Theory to lie under a plot: the small-angle curve of scaled speed against sperm number."""

import numpy as np
import pandas as pd

from labbook.physics import rods, tails, walls
from labbook.registry.dialects import AT_BIRTH, Choices
from labbook.registry.restating import restate
from labbook.registry.swimmer_share import exchanged

DRIVE = "free_head_angle"
AXES = ("Sp", "U_scaled")
INPUTS = ("b", "L_tail", "zeta_n", "zeta_t", "mu")  # what the curve takes from the runs
POINTS = 160


def models_own(coefficient: str) -> dict[str, dict[str, object]]:
    """The dialects that the tail model itself speaks where `coefficient` stands behind the runs' zeta_n."""
    return {"Sp": AT_BIRTH["Sp"] | {"coefficient": coefficient}, "U_scaled": AT_BIRTH["U_scaled"]}


def why_no_curve(coefficient: str, spoken: dict[str, Choices]) -> str:
    """Why the curve cannot be drawn on axes in these dialects (every choice named); '' where it can.

    The model holds for one swimmer at a time: a change of rate or power is the same for all of them, one of
    length or coefficient is not, and runs of several swimmers have no one curve then.
    """
    if coefficient not in rods.MODELS:
        return f"zeta_n and zeta_t of one drag model are needed, and {coefficient} gives zeta_n alone"
    for number, own in models_own(coefficient).items():
        for name in exchanged(own, spoken[number]):
            needs = f"{own[name]} as the {name} in {number}"
            return f"the curve needs {needs}; with {spoken[number][name]} each swimmer has one of its own"
    return ""


def tail_curve(
    runs: pd.DataFrame, low: float, high: float, drive: str = DRIVE, *,
    spoken: dict[str, Choices] | None = None, coefficient: str = rods.HOUSE_MODEL,
) -> pd.DataFrame:  # fmt: skip
    """Columns x (Sp), y (U_scaled), label from Sp = low to high, for the median swimmer of some runs.

    runs: one row a run with INPUTS in SI and `drive`; empty where no run with this drive has them all.
    spoken: the dialects of both axes, every choice named (left out: the model's own); low, high, x and y are
    in them; empty where why_no_curve has a reason. coefficient: the drag model of zeta_n and zeta_t.
    Source: labbook.physics.tails, small angles, a sphere as the head, no walls.
    """
    own = models_own(coefficient)
    spoken = own if spoken is None else spoken
    usable = runs[(runs["drive"] == drive) & runs[list(INPUTS)].notna().all(axis=1)]
    if usable.empty or not 0 < low < high or why_no_curve(coefficient, spoken):
        return pd.DataFrame({"x": [], "y": [], "label": []})
    b, L, zeta_n, zeta_t, mu = (usable[key].to_numpy(dtype=float) for key in INPUTS)
    drag = walls.sphere_drag(mu=mu, b=b)
    head, head_drag = float(np.median(b / L)), float(np.median(drag / (zeta_n * L)))
    anisotropy = float(np.median(zeta_n / zeta_t))
    ends = restate("Sp", np.array([low, high]), choices=own["Sp"], house=spoken["Sp"], inputs={}).value
    Sp = np.geomspace(*ends, POINTS)
    force = tails.response(drive=drive, Sp=Sp, head=head, head_drag=head_drag).force
    # U (zeta_t L + R) = force (zeta_n - zeta_t) omega L^2 theta0^2
    U_scaled = force * (anisotropy - 1) / (1 + head_drag * anisotropy)
    x, y = (restate(number, values, choices=spoken[number], house=own[number], inputs={}).value
            for number, values in (("Sp", Sp), ("U_scaled", U_scaled)))  # fmt: skip
    label = (f"theory: small angle, head free, b/L_tail = {head:.2g}, ζ_n/ζ_t = {anisotropy:.3g} "
             "(medians of the newest runs)")  # fmt: skip
    return pd.DataFrame({"x": x, "y": y, "label": label})
