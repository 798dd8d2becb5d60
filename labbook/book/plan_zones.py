"""The plane of frequency and viscosity for one swimmer: lines of equal Sp, zones and why, fluids, runs."""

from dataclasses import dataclass

import numpy as np
import pandas as pd

from labbook.book.derive import Derived
from labbook.book.plan_deriving import derived, fluids_of_viscosity, u, value
from labbook.book.plan_limits import GOOD, caveats, judged, limits_of, objections, theory_doubts, verdicts
from labbook.book.plan_setting import Plan
from labbook.book.plan_targets import frequency_for, median_density, span_of
from labbook.registry.quantities import QUANTITIES

GRID_F, GRID_MU = 49, 33
ROOM = 2.0  # factor beyond what is there, on every side
GRID_KEYS = ("Sp", "Re_omega", "f_ratio", "U_model")
GOOD_POINTS = 41
ALONG_F = ("Re_omega", "f_ratio", "f")  # what grows with f, so that a zone has an edge on the plane


@dataclass(frozen=True, eq=False)
class Zone:
    """One reason against a part of the plane.

    verdict: 'doubtful' or 'forbidden'; side: 'above' or 'below' the edge; edge: f in Hz for each mu of the
    map, which may lie off the frame.
    """

    name: str
    verdict: str
    why: str
    side: str
    edge: np.ndarray


@dataclass(frozen=True, eq=False)
class PlanMap:
    """The plane of f (Hz) and mu (Pa.s) of one swimmer, all arrays plain.

    f: (F,); mu: (M,); grid: key of GRID_KEYS -> (M, F), NaN where absent; verdict: (M, F) of words; zones:
    edges in f along mu; everywhere: what stands against every point, or holds of the model; lines: Sp level
    -> (M,) f in Hz; fluids: code, mu, u_mu, rho at the planned temperature; runs: the swimmer's earlier ones
    (code, fluid, f, mu, Sp); rho: the density that the plane is drawn for, kg/m3, and T in K.
    """

    f: np.ndarray
    mu: np.ndarray
    grid: dict[str, np.ndarray]
    verdict: np.ndarray
    zones: list[Zone]
    everywhere: list[str]
    lines: dict[float, np.ndarray]
    fluids: pd.DataFrame
    runs: pd.DataFrame
    rho: float
    T: float


def plan_map(plan: Plan, levels=(), f_span=None, mu_span=None) -> PlanMap:
    """The plane for a plan; levels: Sp (house dialect) of the lines, its regimes' limits where none is given.

    f_span, mu_span: (low, high) in SI, else what rig, fluids and earlier runs span, with a factor 2 to spare.
    """
    there = derived(plan, 1.0, [x.id for x in plan.fluids])
    rho = median_density(there)
    fluids = pd.DataFrame(
        {
            "code": [x.code for x in plan.fluids],
            "mu": value(there, "mu"),
            "u_mu": u(there, "mu"),
            "rho": value(there, "rho"),
        }
    )
    runs = plan.own[["code", "fluid", "f", "mu", "Sp"]].dropna(subset=["f", "mu"])
    f = _spaced(f_span or _span([*span_of(plan), *runs["f"]], QUANTITIES["f"]), GRID_F)
    mu = _spaced(mu_span or _span([*fluids["mu"], *runs["mu"]], QUANTITIES["mu"]), GRID_MU)
    shelf = fluids_of_viscosity(plan, mu, rho)
    at_f, at_mu = np.tile(f, len(mu)), np.repeat(np.arange(1, len(mu) + 1), len(f))
    found = derived(plan, at_f, at_mu, shelf=shelf)
    verdict = verdicts(objections(plan, found, at_f), len(at_f))
    grid = {k: value(found, k).reshape(len(mu), len(f)) for k in GRID_KEYS}
    zones, everywhere = _zones(plan, found, grid, f, mu)
    levels = tuple(levels) or _regime_limits(plan)
    lines = {float(level): _edge(grid["Sp"], f, level) for level in levels}
    return PlanMap(
        f,
        mu,
        grid,
        verdict.reshape(len(mu), len(f)),
        zones,
        everywhere,
        lines,
        fluids.dropna(subset=["mu"]),
        runs,
        rho,
        plan.value("T"),
    )


def good_viscosities(plan: Plan, Sp: float) -> str:
    """One sentence: which viscosities put the swimmer at this Sp with nothing to say against it."""
    mu = _spaced((1e-3, 1e2), GOOD_POINTS)
    f, verdict, against = _along(plan, Sp, mu)
    if not np.isfinite(f).any():
        return ""
    good = np.flatnonzero(verdict == GOOD)
    if len(good):
        ends = [_last_good(plan, Sp, mu[at], mu[beyond] if 0 <= beyond < len(mu) else mu[at], f[at])
                for at, beyond in ((good[0], good[0] - 1), (good[-1], good[-1] + 1))]  # fmt: skip
        (low, f_low), (high, f_high) = ends
        return (
            f"Sp = {Sp:.3g} has nothing against it from {low:.3g} to {high:.3g} Pa.s, at "
            f"{f_high:.3g} to {f_low:.3g} Hz"
        )
    fewest = int(np.argmin([len(a) + 10 * (v != "doubtful") for a, v in zip(against, verdict, strict=True)]))
    return (
        f"no viscosity puts {plan.swimmer.code} at Sp = {Sp:.3g} without a doubt; the least stands against "
        f"{mu[fewest]:.2g} Pa.s at {f[fewest]:.2g} Hz: {'; '.join(against[fewest])}"
    )


def _along(plan: Plan, Sp: float, mu: np.ndarray):
    """(f, verdict, against) at this Sp in fluids of these viscosities, at the shelf's median density."""
    rho = median_density(derived(plan, 1.0, [x.id for x in plan.fluids]))
    shelf, ids = fluids_of_viscosity(plan, mu, rho), np.arange(1, len(mu) + 1)
    f = frequency_for(plan, Sp, ids, shelf)
    return f, *judged(plan, derived(plan, f, ids, shelf=shelf), f)


def _last_good(plan: Plan, Sp: float, good: float, bad: float, f_good: float) -> tuple[float, float]:
    """(mu, f) of the last viscosity without an objection on the way from a good one to one that is not."""
    if good == bad:
        return good, f_good
    mu = np.geomspace(good, bad, GOOD_POINTS)
    f, verdict, _ = _along(plan, Sp, mu)
    last = int(np.argmax(verdict != GOOD)) - 1
    return float(mu[last]), float(f[last])


def _zones(plan: Plan, found: Derived, grid, f, mu) -> tuple[list[Zone], list[str]]:
    zones, everywhere = [], []
    for limit in limits_of(plan):
        if limit.key not in ALONG_F:
            one, spread = value(found, limit.key), u(found, limit.key)
            if np.isfinite(one).any() and limit.broken(one, spread).all():
                everywhere.append(limit.says)
            continue
        surface = np.broadcast_to(f, (len(mu), len(f))) if limit.key == "f" else grid[limit.key]
        room = 1.0
        if limit.margin:  # the margin is a share of the value, nearly the same all over the plane
            share = u(found, limit.key) / value(found, limit.key)
            room = 1.0 + limit.margin * float(
                np.nan_to_num(np.nanmedian(share) if np.isfinite(share).any() else 0.0)
            )
        for side, edge in (("above", limit.high / room), ("below", limit.low * room)):
            if np.isfinite(edge) and edge > 0 and np.isfinite(surface).any():
                zone = Zone(limit.name, limit.verdict, limit.why, side, _edge(surface, f, edge))
                if (zone.edge < f[-1]).any() if side == "above" else (zone.edge > f[0]).any():
                    zones.append(zone)
    for doubt in theory_doubts(plan, found):
        where = np.broadcast_to(doubt.where, (len(mu) * len(f),))
        if where.any():
            everywhere.append(doubt.says if where.all() else f"in part: {doubt.says}")
    return zones, everywhere + caveats(plan, found)


def _edge(surface, f, level) -> np.ndarray:
    """f at which a surface that grows with f passes a level, for each mu; beyond the frame along its slope.

    Linear in the logarithms, in which every number of the book is a straight line in f.
    """
    ln_f, ln_s = np.log(f), np.log(surface)
    slope = (ln_s[:, -1] - ln_s[:, 0]) / (ln_f[-1] - ln_f[0])
    return np.exp(ln_f[0] + (np.log(level) - ln_s[:, 0]) / slope)


def _regime_limits(plan: Plan) -> tuple[float, ...]:
    bands = [b for r in plan.registry.regimes.values() for b in r.bands if b.number == "Sp"]
    return tuple(sorted({x for b in bands for x in (b.low, b.high) if np.isfinite(x) and x > 0})) or (
        1.0,
        2.0,
        4.0,
    )


def _span(values, quantity) -> tuple[float, float]:
    known = [v for v in values if np.isfinite(v)]
    if not known:
        return quantity.low, quantity.high
    return max(min(known) / ROOM, quantity.low), min(max(known) * ROOM, quantity.high)


def _spaced(span, n) -> np.ndarray:
    return np.geomspace(*span, n)
