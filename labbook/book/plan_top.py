"""Runs that pin down the maximum of a swimmer's scaled speed over the sperm number."""

import numpy as np
import pandas as pd

from labbook.book.plan_candidates import Proposals, as_planned, candidates
from labbook.book.plan_deriving import derived, value
from labbook.book.plan_setting import Plan
from labbook.book.plan_targets import frequency_for, optimum, without
from labbook.errors import Refusal
from labbook.physics.designs import pin_top, top_of_parabola

WINDOW = 1.4  # factor in Sp about the top within which a parabola serves
U_RELATIVE = 0.05  # of a speed where no run tells another: common practice, no source
PIN = (
    "pins down the maximum: the runs that leave the least variance of the Sp at which the scaled speed peaks, on a "
    "parabola within a factor {w:g} of it (local c-optimality, Atkinson, Donev & Tobias 2007; Chaloner 1989)"
)


def pinned(plan: Plan, kept: pd.DataFrame, n: int, within, strict: bool) -> Proposals:
    if not set(within) <= {"Sp"}:
        raise Refusal("within", ", ".join(within), "the maximum is one over Sp", "give Sp alone")
    at, values = candidates(plan, plan.value("theta0"), strict)
    own = kept[(kept["swimmer"] == plan.swimmer.code) & (kept["Sp"] > 0) & (kept["U_scaled"] > 0)]
    x, y = np.log(own["Sp"].to_numpy(float)), np.log(own["U_scaled"].to_numpy(float))
    spread = np.maximum((own["u_own_U_scaled"] / own["U_scaled"]).to_numpy(float), 1e-3)
    reach, source = np.log(WINDOW), f"from the {len(own)} kept runs of {plan.swimmer.code}"
    fitted = top_of_parabola(x=x, y=y, u=spread, window=reach)
    if fitted is None:
        fitted, source = _predicted_top(plan, reach), "where theory has it: its own kept runs show none"
    top, (_, _, curvature) = fitted
    low, high = np.log(within.get("Sp", np.exp([top - reach, top + reach])))
    with np.errstate(all="ignore"):
        ln_Sp = np.log(values["Sp"])
    rows = np.flatnonzero((ln_Sp >= low) & (ln_Sp <= high))
    if not len(rows):
        raise Refusal(
            "top",
            f"Sp = {np.exp(top):.3g}",
            f"{plan.swimmer.code} comes nowhere near it in these fluids",
            f"a fluid in which it does; here it reaches Sp {np.exp(np.nanmin(ln_Sp)):.3g} to "
            f"{np.exp(np.nanmax(ln_Sp)):.3g}",
        )
    near = np.abs(x - top) <= reach
    relative = float(np.median(spread)) if len(spread) else U_RELATIVE
    picked, u_top = pin_top(
        top=top,
        curvature=curvature,
        known_x=x[near],
        known_u=spread[near],
        candidates=ln_Sp[rows],
        u=np.full(len(rows), relative),
        n=n,
    )
    chosen = np.sort(rows[picked])
    why = [f"Sp {np.exp(ln_Sp[i]):.3g} beside the maximum at {np.exp(top):.3g}" for i in chosen]
    usual = "as of its runs so far" if len(spread) else "common practice, no source"
    notes = (
        f"the maximum is taken at Sp = {np.exp(top):.3g}, {source}",
        f"each speed is expected to be known to {relative:.2g} of it, {usual}",
    )
    return Proposals(
        as_planned(plan, at.iloc[chosen], why, False),
        PIN.format(w=WINDOW),
        kept,
        float(u_top[0]),
        float(u_top[-1]),
        notes,
    )


def _predicted_top(plan: Plan, reach: float):
    """(ln Sp, coefficients) of the parabola about the maximum of the predicted scaled speed."""
    middle = np.log(optimum(plan))
    ln_Sp = np.linspace(middle - reach, middle + reach, 21)
    for fluid in plan.fluids:
        ids = np.full(len(ln_Sp), fluid.id)
        found = derived(plan, frequency_for(plan, np.exp(ln_Sp), ids), ids)
        with np.errstate(all="ignore"):
            scaled = np.log(value(found, "U_model") / value(found, "omega"))
        if np.isfinite(scaled).all():
            coefficients = np.polynomial.polynomial.polyfit(ln_Sp, scaled, 2)
            return middle, coefficients
    raise without(plan, "U_model")
