"""Runs that fill the widest gap among the group's kept runs on a plane of two numbers."""

import numpy as np
import pandas as pd

from labbook.book.plan_candidates import Proposals, as_planned, candidates
from labbook.book.plan_setting import Plan
from labbook.book.plan_targets import without
from labbook.errors import Refusal
from labbook.physics.designs import maximin, nearest
from labbook.physics.tails import THETA0_CHECKED

THETA0 = (
    0.1,
    0.15,
    0.2,
    0.25,
    THETA0_CHECKED,
)  # rad: amplitudes of the candidates where the amplitude is an axis
CELL = 0.01  # of an axis: runs nearer than that count as one
MAXIMIN = (
    "fills the widest gap: the smallest distance to any kept or proposed run, in ln {x} and ln {y}, is as large as "
    "it can be (maximin distance, Johnson, Moore & Ylvisaker 1990)"
)


def filled(plan: Plan, kept: pd.DataFrame, axes, n: int, within, strict: bool) -> Proposals:
    x, y = axes
    at, values = candidates(plan, THETA0 if "theta0" in axes else plan.value("theta0"), strict)
    places = np.column_stack([values[x], values[y]])
    there = kept[[x, y]].to_numpy(float)
    if not np.isfinite(places).all(axis=1).any():
        raise without(plan, x if not np.isfinite(places[:, 0]).any() else y)
    with np.errstate(all="ignore"):
        places, there = np.log(places), np.log(there)
    there = there[np.isfinite(there).all(axis=1)]
    limits = _frame_of(places, there, [within.get(k) for k in axes])
    inside = (
        np.isfinite(places).all(axis=1)
        & (places >= limits[0]).all(axis=1)
        & (places <= limits[1]).all(axis=1)
    )
    if not inside.any():
        raise Refusal(
            "within",
            ", ".join(axes),
            f"{plan.swimmer.code} reaches no place there in these fluids",
            f"it reaches {_reach_in_words(places, axes)}",
        )
    scale = np.maximum(limits[1] - limits[0], 1e-9)
    scaled, taken = (
        (places - limits[0]) / scale,
        np.unique(np.round((there - limits[0]) / scale / CELL), axis=0) * CELL,
    )
    rows = np.flatnonzero(inside)
    rows = rows[maximin(candidates=scaled[rows], taken=taken, n=n)]
    chosen = scaled[rows]
    gaps = nearest(chosen, taken)
    nearest_run = [_nearest_code(kept, axes, place) for place in places[rows]]
    why = [f"{'nearest kept run ' + code if code else 'no kept run'} on this plane" for code in nearest_run]
    runs = as_planned(plan, at.iloc[rows], why, "theta0" in axes)
    before = float(nearest(scaled[inside], taken).max()) if len(taken) else np.inf
    after = float(nearest(scaled[inside], np.vstack([taken, chosen])).max())
    notes = tuple(
        s
        for s in (
            f"{len(there)} kept runs of {plan.swimmer.texts['form']} swimmers are on the plane",
            _short(len(rows), n),
        )
        if s
    )
    order = np.argsort(-np.nan_to_num(gaps, posinf=1e9), kind="stable")
    return Proposals(
        runs.iloc[order].reset_index(drop=True), MAXIMIN.format(x=x, y=y), kept, before, after, notes
    )


def _frame_of(places, there, within) -> np.ndarray:
    """(2, 2) lower and upper limits of the plane, in logarithms: as asked, else what runs or candidates span."""
    base = there if len(there) > 2 else places[np.isfinite(places).all(axis=1)]
    limits = np.array([base.min(axis=0), base.max(axis=0)])
    for i, span in enumerate(within):
        if span is not None:
            low, high = span
            if not 0 < low < high:
                raise Refusal("within", f"{low:g} {high:g}", "is no range", "0 < low < high")
            limits[:, i] = np.log([low, high])
    return limits


def _reach_in_words(places, axes) -> str:
    good = places[np.isfinite(places).all(axis=1)]
    return " and ".join(
        f"{k} {np.exp(good[:, i].min()):.3g} to {np.exp(good[:, i].max()):.3g}" for i, k in enumerate(axes)
    )


def _nearest_code(kept: pd.DataFrame, axes, place) -> str:
    if kept.empty:
        return ""
    with np.errstate(all="ignore"):
        away = ((np.log(kept[list(axes)].to_numpy(float)) - place) ** 2).sum(axis=1)
    return str(kept["code"].iloc[int(np.nanargmin(away))]) if np.isfinite(away).any() else ""


def _short(found: int, n: int) -> str:
    return "" if found == n else f"only {found} of {n}: no other place is free"
