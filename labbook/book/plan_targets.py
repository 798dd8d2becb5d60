"""Targets: the frequency or viscosity that puts a swimmer at a sperm number, its optimum, and where none does."""

import numpy as np
import pandas as pd

from labbook.book.derive import Derived
from labbook.book.plan_deriving import derived, fluids_of_viscosity, value, why_not
from labbook.book.plan_setting import Plan, plausible_frequencies
from labbook.book.planning import planned
from labbook.book.shelf import Shelf
from labbook.errors import Refusal
from labbook.physics.roots import power_like_root
from labbook.registry.quantities import QUANTITIES

WIDE = (1e-15, 1e15)  # Hz, Pa.s: where a root is sought before it is judged
USUAL_F = (0.01, 20.0)  # Hz, where no rig tells: common practice, no source
OPTIMUM_F = 161  # frequencies that are tried for the optimum, and twice again near it
_SECTION = (
    "give the section: section=rod d='1 mm', section=strip w='3 mm' t='0.8 mm', or section=tube D='2 mm' "
    "d_in='1 mm'"
)
_REMEDY = {
    "E": "name a batch (material=...) or give E='0.5 MPa'",
    "I_area": _SECTION,
    "a": _SECTION,
    "L_tail": "give L_tail='24 mm'",
    "mu": "read the fluid's viscosity, or name another fluid",
    "theta0": "give theta0='0.3 rad'",
    "h0": "give h0='2 mm'",
    "B": "give B='3 mT'",
    "m_mag": "give m_mag='4 mA.m2'",
    "b": "give the head, b='2 mm', or drive=pivoted_angle",
}


def reach(plan: Plan, Sp: float) -> pd.DataFrame:
    """In each fluid the frequency that gives this sperm number (house dialect), as `planned` tells it.

    Solved through the book's own numbers. Refuses a target that no fluid reaches at a frequency that a rig
    may have, with what would, and a swimmer without what the number needs.
    """
    if not (np.isfinite(Sp) and Sp > 0):
        raise Refusal("Sp", f"{Sp:g}", "is no sperm number", "a number above 0, as 2")
    ids = np.array([x.id for x in plan.fluids])
    f = frequency_for(plan, Sp, ids)
    if not np.isfinite(f).any():
        raise without(plan, "Sp")
    low, high = plausible_frequencies()
    if not ((f >= low) & (f <= high)).any():
        raise _unreachable(plan, Sp, ids, f)
    return planned(plan, f, ids)


def frequency_for(plan: Plan, Sp, fluids, shelf: Shelf | None = None) -> np.ndarray:
    """The frequency (Hz) that gives a sperm number in each of some fluids (ids), NaN where none does."""
    fluids = np.asarray(fluids)

    def number(f):
        return value(derived(plan, f, fluids, shelf=shelf, wanted=("Sp",)), "Sp")

    return power_like_root(
        function=number, target=np.broadcast_to(Sp, fluids.shape), low=WIDE[0], high=WIDE[1]
    )


def optimum(plan: Plan) -> float:
    """The sperm number (house dialect) at which the predicted speed over omega L_tail theta0^2 is largest.

    Sought in the first fluid that has a prediction; how large it is depends on the fluid through f alone.
    Refuses where nothing is predicted.
    """
    around = np.array([np.nan])
    for fluid in plan.fluids:
        around = frequency_for(plan, np.array([0.05, 40.0]), np.full(2, fluid.id))
        if not np.isfinite(around).all():
            continue
        low, high = np.log(around)
        for _ in range(3):
            f = np.exp(np.linspace(low, high, OPTIMUM_F))
            found = derived(plan, f, np.full(OPTIMUM_F, fluid.id))
            scaled, Sp = value(found, "U_model") / f, value(found, "Sp")
            if not np.isfinite(scaled).any():
                break
            best = int(np.clip(np.nanargmax(scaled), 1, OPTIMUM_F - 2))
            low, high = np.log(f[best - 1]), np.log(f[best + 1])
        else:
            if scaled[best] > 0:
                return float(_vertex(np.log(Sp[best - 1 : best + 2]), scaled[best - 1 : best + 2]))
    lacks = without(plan, "Sp" if not np.isfinite(around).any() else "U_model")
    raise Refusal(
        "Sp",
        None,
        f"no target was given, and none can be told for {plan.swimmer.code}: {lacks.reason}",
        f"give a sperm number, as 2, or a frequency; {lacks.remedy}",
    )


def _vertex(ln_x, y) -> float:
    c2, c1, _ = np.polyfit(ln_x - ln_x[1], y / y[1], 2)
    return np.exp(ln_x[1] - c1 / (2.0 * c2)) if c2 < 0 else np.exp(ln_x[1])


def without(plan: Plan, key: str) -> Refusal:
    """The refusal where no fluid has a value of a key, with what would make one."""
    found = derived(plan, 1.0, [x.id for x in plan.fluids])
    said = min((why_not(plan, found, i, key) for i in range(len(plan.fluids))), key=len)
    remedy = next(
        (text for k, text in _REMEDY.items() if f"needs {k}:" in said), "choose another swimmer or drive"
    )
    return Refusal(key, plan.swimmer.code, f"cannot be told: {said}", remedy)


def _unreachable(plan: Plan, Sp: float, ids, f) -> Refusal:
    """The refusal of a target beyond every fluid: who comes nearest, which viscosity or tail would reach it."""
    low, high = plausible_frequencies()
    near = int(np.nanargmin(np.abs(np.log(f) - np.log(np.clip(f, low, high)))))
    softer = bool(f[near] > high)
    usual = span_of(plan)
    thin, thick = (viscosity_for(plan, Sp, at) for at in usual[::-1])
    least, most = QUANTITIES["mu"].low, QUANTITIES["mu"].high
    if thin < most and thick > least:
        does = (
            f"a viscosity of {max(thin, least):.3g} to {min(thick, most):.3g} Pa.s would reach it between "
            f"{usual[0]:.3g} and {usual[1]:.3g} Hz"
        )
    else:
        which = "softer, thinner or longer" if softer else "stiffer, thicker or shorter"
        does = f"no viscosity does; a {which} tail would"
    return Refusal(
        "Sp",
        f"{Sp:g}",
        f"no fluid reaches it with {plan.swimmer.code} between {low:g} and {high:g} Hz",
        f"{plan.shelf.fluids[int(ids[near])].code} comes nearest and would take {f[near]:.3g} Hz; {does}",
    )


def span_of(plan: Plan) -> tuple[float, float]:
    """From where to where f is looked at, Hz: what the rig has run so far, else USUAL_F."""
    has = plan.has_run
    return (has.f_low, has.f_high) if has.f_low < has.f_high else USUAL_F


def viscosity_for(plan: Plan, Sp: float, f: float) -> float:
    """The viscosity (Pa.s) at which a frequency gives this sperm number, NaN where none does."""
    rho = median_density(derived(plan, f, [x.id for x in plan.fluids]))

    def number(mu):
        shelf = fluids_of_viscosity(plan, mu, rho)
        return value(derived(plan, f, np.arange(1, len(mu) + 1), shelf=shelf, wanted=("Sp",)), "Sp")

    return float(power_like_root(function=number, target=Sp, low=WIDE[0], high=WIDE[1])[0])


def median_density(found: Derived) -> float:
    """The median density of some planned runs' fluids, kg/m3; water's 1000 where none has one."""
    rho = value(found, "rho")
    return float(np.nanmedian(rho)) if np.isfinite(rho).any() else 1000.0
