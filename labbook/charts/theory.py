"""Theory to lie under a plot: the small-angle curve of scaled speed against sperm number."""

import numpy as np
import pandas as pd

from labbook.physics import tails, walls

DRIVE = "free_head_angle"
INPUTS = ("b", "L_tail", "zeta_n", "zeta_t", "mu")  # what the curve takes from the runs
POINTS = 160


def tail_curve(runs: pd.DataFrame, low: float, high: float, drive: str = DRIVE) -> pd.DataFrame:
    """Columns x (Sp), y (U_scaled), label from Sp = low to high, for the median swimmer of some runs.

    runs: one row a run with INPUTS in SI and `drive`; empty where no run with this drive has them all.
    Source: labbook.physics.tails, small angles, a sphere as the head, no walls.
    """
    usable = runs[(runs["drive"] == drive) & runs[list(INPUTS)].notna().all(axis=1)]
    if usable.empty or not 0 < low < high:
        return pd.DataFrame({"x": [], "y": [], "label": []})
    b, L, zeta_n, zeta_t, mu = (usable[key].to_numpy(dtype=float) for key in INPUTS)
    drag = walls.sphere_drag(mu=mu, b=b)
    head, head_drag = float(np.median(b / L)), float(np.median(drag / (zeta_n * L)))
    anisotropy = float(np.median(zeta_n / zeta_t))
    x = np.geomspace(low, high, POINTS)
    force = tails.response(drive=drive, Sp=x, head=head, head_drag=head_drag).force
    # U (zeta_t L + R) = force (zeta_n - zeta_t) omega L^2 theta0^2
    y = force * (anisotropy - 1) / (1 + head_drag * anisotropy)
    label = (f"theory: small angle, head free, b/L_tail = {head:.2g}, ζ_n/ζ_t = {anisotropy:.3g} "
             "(medians of the newest runs)")  # fmt: skip
    return pd.DataFrame({"x": x, "y": y, "label": label})
