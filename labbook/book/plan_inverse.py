"""The inverse question: which size, modulus or viscosity puts a swimmer at a sperm number at a frequency."""

import numpy as np
import pandas as pd

from labbook.book.batch_means import modulus
from labbook.book.block_spread import section_of
from labbook.book.plan_deriving import derived, fluids_of_viscosity, u, value
from labbook.book.plan_limits import judged
from labbook.book.plan_setting import Plan, day_of
from labbook.book.plan_swimmer import made_of, with_modulus, with_size
from labbook.book.plan_targets import median_density, viscosity_for, without
from labbook.book.planning import BEYOND
from labbook.book.shelf import Shelf
from labbook.errors import Refusal
from labbook.physics.roots import power_like_root
from labbook.registry.quantities import QUANTITIES
from labbook.registry.typed import Typed
from labbook.registry.written import shown

SIZES = {"rod": ("d",), "strip": ("t", "w"), "tube": ("D", "d_in"), "": ()}
STEP = 0.01  # of a size, for how steeply the number depends on it
MODULI = (1e3, 4e11)


def keys_of(plan: Plan) -> tuple[str, ...]:
    """What can be asked for this swimmer: its section's sizes, its tail's length, modulus and viscosity."""
    return (*SIZES[section_of(plan.swimmer)], "L_tail", "E", "mu")


def inverse(plan: Plan, key: str, f: float, Sp: float) -> pd.DataFrame:
    """Which value of `key` gives this sperm number (house dialect) at a frequency (Hz), a fluid a row.

    key: one of keys_of; mu needs no fluid and gives one row. Columns: fluid, <key> (SI), now (its present
    value), Sp, u_Sp and Re_omega with it, slope (d ln Sp/d ln key: how exactly it has to be made), U_model,
    verdict, against. NaN and 'out of reach' where no possible value does. Refuses a key that the section does
    not have, and a target that no fluid reaches with any value.
    """
    if key not in keys_of(plan):
        section = section_of(plan.swimmer)
        raise Refusal(
            "inverse",
            key,
            f"is no size of {plan.swimmer.code}, a {section or 'swimmer without section'}",
            f"one of {', '.join(keys_of(plan))}",
        )
    if not (np.isfinite(Sp) and Sp > 0 and np.isfinite(f) and f > 0):
        raise Refusal("Sp", f"{Sp:g} at {f:g} Hz", "cannot be met", "both are above 0")
    ids = np.array([x.id for x in plan.fluids]) if key != "mu" else np.array([1])
    low, high = _bracket(plan, key)
    if key == "mu":
        found = np.array([viscosity_for(plan, Sp, f)])
    else:
        found = power_like_root(
            function=lambda x: _with(plan, key, x, f, ids)[1],
            target=np.full(len(ids), Sp),
            low=low,
            high=high,
        )
    if not np.isfinite(found).any():
        raise _nowhere(plan, key, f, Sp, ids, (low, high))
    return _table(plan, key, f, ids, found)


def _bracket(plan: Plan, key: str) -> tuple[float, float]:
    """Between which values one is sought: what can be made, and still is a tail."""
    of = plan.swimmer.value
    if key == "E":
        return MODULI
    row = QUANTITIES[key]
    low, high = row.low, row.high
    L_tail = of("L_tail") or of("L_body")
    if key == "L_tail":
        return low, of("L_body") * (1.0 + 1e-9)
    if key == "mu":
        return low, high
    if key == "D" and of("d_in"):
        low = of("d_in") * (1.0 + 1e-6)
    if key == "d_in":
        high = of("D") * (1.0 - 1e-6)
    return low, min(high, L_tail / 2.0) if L_tail else high


def _with(plan: Plan, key: str, values, f, ids):
    """(the derived runs, their Sp) with a value of the key of its own in each fluid."""
    numbers = np.arange(1, len(ids) + 1)
    if key == "mu":
        rho = median_density(derived(plan, f, [x.id for x in plan.fluids]))
        found = derived(plan, f, numbers, shelf=fluids_of_viscosity(plan, values, rho))
        return found, value(found, "Sp")
    materials = plan.shelf.materials
    if key == "E":
        share = _u_E(plan)
        materials = {
            int(i): with_modulus(Typed(f"{x:.6g}", "Pa", float(x), share * float(x), "stated"), int(i))
            for i, x in zip(numbers, values, strict=True)
        }
        swimmers = {int(i): _numbered(made_of(plan.swimmer, materials[int(i)]), int(i)) for i in numbers}
    else:
        swimmers = {
            int(i): with_size(plan.swimmer, key, x, int(i)) for i, x in zip(numbers, values, strict=True)
        }
    shelf = Shelf(plan.shelf.fluids, materials, swimmers, plan.shelf.rigs)
    found = derived(plan, f, ids, shelf=shelf, swimmers=numbers)
    return found, value(found, "Sp")


def _numbered(item, id_: int):
    return type(item)(id_, item.code, item.texts, item.typed)


def _u_E(plan: Plan) -> float:
    """Relative u of a modulus: the present batch's, 2 % where there is none (common practice, no source)."""
    found = derived(plan, 1.0, [plan.fluids[0].id])
    now = float(value(found, "E")[0])
    return float(u(found, "E")[0]) / now if np.isfinite(now) else 0.02


def _now(plan: Plan, key: str) -> float:
    if key == "mu":
        return np.nan
    return float(value(derived(plan, 1.0, [plan.fluids[0].id]), key)[0])


def _table(plan: Plan, key: str, f: float, ids, found) -> pd.DataFrame:
    there, Sp = _with(plan, key, found, f, ids)
    more = np.where(np.isfinite(found), found * (1.0 + STEP), np.nan)
    with np.errstate(all="ignore"):
        steep = np.log(_with(plan, key, more, f, ids)[1] / Sp) / np.log(1.0 + STEP)
    verdict, against = judged(plan, there, np.full(len(ids), f))
    for i in np.flatnonzero(~np.isfinite(found)):
        verdict[i], against[i] = BEYOND, [f"no {QUANTITIES[key].name} that can be made does it in this fluid"]
    table = pd.DataFrame(
        {
            "fluid": [plan.shelf.fluids[int(i)].code if key != "mu" else "any" for i in ids],
            key: found,
            "now": _now(plan, key),
            "f": f,
            "Sp": Sp,
            "u_Sp": u(there, "Sp"),
            "Re_omega": value(there, "Re_omega"),
            "U_model": value(there, "U_model"),
            "u_U_model": u(there, "U_model"),
            "slope": steep,
            "verdict": verdict,
            "against": against,
        }
    )
    table.attrs["units"] = {
        key: QUANTITIES[key].unit,
        "now": QUANTITIES[key].unit,
        "f": "Hz",
        "U_model": "m/s",
    }
    return table


def _nowhere(plan: Plan, key: str, f: float, Sp: float, ids, bracket) -> Refusal:
    """The refusal where no value reaches the target in any fluid, with what the ends of its range give."""
    ends = [_with(plan, key, np.full(len(ids), x), f, ids)[1] for x in np.geomspace(*bracket, 25)]
    if not np.isfinite(ends).any():
        return without(plan, "Sp")
    name, code = QUANTITIES[key].name, plan.swimmer.code
    return Refusal(
        "Sp",
        f"{Sp:g}",
        f"no {name} from {shown(key, bracket[0])} to {shown(key, bracket[1])} reaches it with "
        f"{code} at {f:g} Hz",
        f"Sp {np.nanmin(ends):.3g} to {np.nanmax(ends):.3g} can be reached",
    )


def batches_near(plan: Plan, E: float) -> list[tuple[str, float]]:
    """(code, modulus in Pa) of the materials on the shelf, the nearest in ratio first."""
    day = np.array([day_of(plan)])
    known = [(m.code, float(modulus(m, day).value[0])) for m in plan.materials]
    return sorted((k for k in known if np.isfinite(k[1])), key=lambda k: abs(np.log(k[1] / E)))
