"""The next runs of a plan as the book proposes them, kept as long as what they depend on stays the same."""

from dataclasses import dataclass

import numpy as np
import pandas as pd
import streamlit as st

from labbook.app import session
from labbook.app.plan_answers import Aim, Answered, fluids_table
from labbook.app.plan_asked import TARGET, TOP, Asked
from labbook.book.limits import limits
from labbook.book.plan_candidates import Proposals
from labbook.book.plan_limits import GOOD
from labbook.book.plan_proposals import axes_of
from labbook.book.plan_setting import Plan
from labbook.book.plan_zones import PlanMap
from labbook.book.planning import to_run
from labbook.errors import Refusal

ELSE = ("f", "Re_omega")  # what every run has


@dataclass(frozen=True, eq=False)
class Next:
    """The next runs (planning.planned, with `why` where proposed); the Proposals where a criterion chose."""

    runs: pd.DataFrame | None
    found: Proposals | None = None
    refused: Refusal | None = None


def usual_plane(plan: Plan, seen: PlanMap) -> str:
    """The plane 'x,y' whose gaps are filled where none is asked for: the swimmer has a place on it."""
    keys = axes_of(plan)
    return ",".join(ELSE if "Sp" in keys and not np.isfinite(seen.grid["Sp"]).any() else keys)


def key_of_next(asked: Asked, answered: Answered, aim: Aim, usual: str) -> tuple:
    """What the next runs depend on, how they are chosen second; usual: the plane where none is asked for."""
    how = asked.how or usual
    target = (aim.Sp, aim.f) if how == TARGET else ()
    return (answered.key, how, asked.n, asked.strict, asked.within, target)


@st.cache_resource(max_entries=48, show_spinner="Looking for the next runs …")
def next_runs(key: tuple, _answered: Answered) -> Next:
    """The next runs that `key` (key_of_next) asks for; or why there are none."""
    plan_key, how, n, strict, within, target = key
    plan = _answered.plan
    try:
        if how == TARGET:
            return _at_target(plan_key, plan, *target, n, strict)
        axes = () if how == TOP else tuple(how.split(","))
        part = {k: span for k, low, high in within if (span := limits(k, low, high))}
        found = session.book().propose(plan, n, fill=axes, top=how == TOP, within=part, strict=strict)
        return Next(found.runs, found)
    except Refusal as refusal:
        return Next(None, None, refusal)


def _at_target(key, plan, Sp, f, n, strict) -> Next:
    if Sp is None and f is None:
        raise Refusal("next", None, "nothing is aimed at", "give a target Sp or a frequency")
    table, refusal = fluids_table(key, Sp, f, plan)
    if refusal is not None:
        raise refusal
    if strict:
        table = table[table["verdict"] == GOOD]
    return Next(to_run(plan, table).head(n))
