"""Planned runs: what to expect of them, what speaks against them, and how they are set."""

import numpy as np
import pandas as pd

from labbook.book.derive import Derived
from labbook.book.plan_deriving import as_set, derived, typed_frequency, u, value, why_not
from labbook.book.plan_limits import DOUBTFUL, FORBIDDEN, GOOD, judged
from labbook.book.plan_setting import Plan, plausible_frequencies
from labbook.errors import Refusal
from labbook.physics.settling import settling

EXPECTED = ("mu", "rho", "theta0", "B", "Sp", "Re_omega", "wall", "f_ratio", "U_model", "U_scaled_model")
BEYOND = "out of reach"
VERDICTS = (GOOD, DOUBTFUL, FORBIDDEN, BEYOND)


def at_frequency(plan: Plan, f: float) -> pd.DataFrame:
    """Every fluid at one frequency (Hz), as `planned` tells it."""
    ids = np.array([x.id for x in plan.fluids])
    return planned(plan, np.full(len(ids), float(f)), ids)


def planned(plan: Plan, f, fluids, theta0=None) -> pd.DataFrame:
    """What to expect of planned runs, one a row: everything in SI, u_<key> beside each of EXPECTED.

    f: Hz, NaN where a fluid has none; fluids: ids; theta0: rad of each where it is not the plan's. Columns:
    fluid, f, f_typed (three digits, as one would set it), EXPECTED, f_stepout, t_tail, t_tank, t_elastic,
    t_beats and t_settle (s), verdict ('good', 'doubtful', 'forbidden' or 'out of reach'), against
    (sentences), cells (of the run as typed, without `at`).
    """
    f, fluids = np.asarray(f, float), np.asarray(fluids)
    found = derived(plan, f, fluids, theta0=theta0)
    codes = [plan.shelf.fluids[int(i)].code for i in fluids]
    low, high = plausible_frequencies()
    with np.errstate(all="ignore"):
        typed = [typed_frequency(x) if low <= x <= high else "" for x in f]
        columns: dict = {"swimmer": plan.swimmer.code, "fluid": codes, "f": f, "f_typed": typed}
        for key in EXPECTED:
            one, spread = _expected(found, key)
            columns[key], columns[f"u_{key}"] = one, spread
        columns["f_stepout"] = f / value(found, "f_ratio")
        columns |= _settling(plan, found, f)
        verdict, against = judged(plan, found, f)
    for i in range(len(f)):
        if not np.isfinite(f[i]):
            verdict[i], against[i] = BEYOND, [why_not(plan, found, i, "Sp")]
        elif not np.isfinite(value(found, "U_model")[i]) and plan.drive:
            against[i].append(f"no predicted speed: {why_not(plan, found, i, 'U_model')}")
    columns["verdict"], columns["against"] = verdict, against
    own = [None] * len(f) if theta0 is None else np.broadcast_to(theta0, f.shape)
    columns["cells"] = [_cells(plan, c, t, a) for c, t, a in zip(codes, typed, own, strict=True)]
    table = pd.DataFrame(columns)
    table.attrs["units"] = {k: plan.registry.unit(k) for k in ("f", *EXPECTED[:-1])} | {"f_stepout": "Hz"}
    return table


def _expected(found: Derived, key: str) -> tuple[np.ndarray, np.ndarray]:
    if key != "U_scaled_model":
        return value(found, key), u(found, key)
    scale = value(found, "omega") * value(found, "L_tail") * value(found, "theta0") ** 2
    return value(found, "U_model") / scale, u(found, "U_model") / scale


def _settling(plan: Plan, found: Derived, f) -> dict[str, np.ndarray]:
    bore = plan.value("D_tank") / 2.0
    times = settling(
        f=f,
        L_tail=value(found, "L_tail"),
        nu=value(found, "nu"),
        zeta_n=value(found, "zeta_n"),
        EI=value(found, "EI"),
        reach=np.fmin(plan.value("h_wall"), bore),
    )
    return {k: getattr(times, k) for k in ("t_tail", "t_tank", "t_elastic", "t_beats")} | {
        "t_settle": times.total
    }


def _cells(plan: Plan, fluid: str, f_typed: str, theta0) -> dict[str, str]:
    cells = {"swimmer": plan.swimmer.code, "fluid": fluid, **plan.cells, "f": f_typed}
    return cells if theta0 is None else cells | {"theta0": f"{theta0:.3g} rad"}


def to_run(plan: Plan, table: pd.DataFrame, forbidden: bool = False) -> pd.DataFrame:
    """The rows that one could run, the best first, f as it would be set (three digits), what to expect there.

    forbidden: keep those that are forbidden too. Refuses a table in which nothing is left.
    """
    out = (BEYOND,) if forbidden else (BEYOND, FORBIDDEN)
    there = best_first(table[(table["f_typed"] != "") & ~table["verdict"].isin(out)])
    if there.empty:
        raise Refusal(
            "plan",
            plan.swimmer.code,
            "nothing is left that could be run",
            "name a fluid to have it all the same",
        )
    ids = {x.code: x.id for x in plan.fluids}
    return planned(plan, as_set(there["f"].to_numpy()), there["fluid"].map(ids).to_numpy())


def best_first(table: pd.DataFrame) -> pd.DataFrame:
    """The rows by verdict, and those alike by how much stands against them."""
    order = table["verdict"].map(VERDICTS.index), table["against"].map(len)
    return table.iloc[np.lexsort(order[::-1])].reset_index(drop=True)


def in_common(table: pd.DataFrame) -> list[str]:
    """The sentences that stand against every row."""
    rows = list(table["against"])
    return [said for said in rows[0] if all(said in other for other in rows)] if len(rows) > 1 else []
