"""What the book answers a plan, kept as long as book, day and question are the same; refusals by field."""

import math
import re
from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import date

import pandas as pd
import streamlit as st

from labbook.app import session
from labbook.app.plan_asked import TAIL_CELLS, Asked, frequency, sperm_number
from labbook.book.plan_deriving import as_set
from labbook.book.plan_inverse import inverse
from labbook.book.plan_setting import Plan
from labbook.book.plan_targets import optimum, reach, span_of, viscosity_for
from labbook.book.plan_zones import PlanMap, good_viscosities, plan_map
from labbook.book.planning import at_frequency
from labbook.book.shelf_pages import offered
from labbook.errors import Refusal, Refusals

Key = tuple  # state of the book, day, swimmer, fluids, cells: what a plan depends on
ELASTIC = "flexible tail"
NEEDS = re.compile(r"needs (\w+):")
# a size that is derived stands for the column of the swimmer that lacks
ASKS_FOR = {"I_area": "section", "a": "section", "EI": "E"}


@dataclass
class Answered:
    """A plan with its key, and sentences by field of cells that were refused; the rest is planned with."""

    plan: Plan | None
    key: Key
    said: dict[str, str] = field(default_factory=dict)


def plan_for(asked: Asked, swimmer: str, state: str) -> Answered:
    """The plan asked for in a state of the book; a refused cell is left out and said, the others stand."""
    day = date.today().isoformat()
    cells, fluids, said = dict(asked.cells), asked.fluids, {}
    while True:
        key = (state, day, swimmer, fluids, tuple(cells.items()))
        try:
            return Answered(_plan(*key), key, said)
        except Refusals as several:
            findings = several.findings
        except Refusal as one:
            findings = [one]
        said |= {one.field: str(one) for one in findings}
        wrong = {one.field for one in findings}
        if wrong & cells.keys():
            cells = {k: v for k, v in cells.items() if k not in wrong}
        elif "fluid" in wrong and fluids:
            fluids = ()
        elif cells:  # it stands against another cell: the swimmer as it is, then the run as it was
            changed = cells.keys() & set(TAIL_CELLS)
            cells = {k: v for k, v in cells.items() if k not in (changed or cells)}
        else:
            return Answered(None, key, said)


@st.cache_data(max_entries=32, show_spinner=False)
def codes(state: str, kind: str) -> list[str]:
    """The codes of a kind that are in use, the last used (for a material, newest) first."""
    return session.book().ask(offered, kind)


@st.cache_resource(max_entries=24, show_spinner="Reading what the plan goes by …")
def _plan(state: str, day: str, swimmer: str, fluids: tuple, cells: tuple) -> Plan:
    return session.book().plan(swimmer, fluids=fluids, **dict(cells))


@st.cache_resource(max_entries=24, show_spinner="Drawing the zones …")
def map_of(key: Key, _plan: Plan) -> PlanMap:
    """The plane of f and viscosity."""
    return plan_map(_plan)


# ---- the target


@dataclass(frozen=True)
class Aim:
    """What is aimed at: Sp and f where they are known, in words; lacks: why theory names no Sp of its own.

    said: sentences by field of what was refused.
    """

    Sp: float | None
    f: float | None
    words: str
    lacks: str
    said: dict[str, str]


def aim_of(asked: Asked, answered: Answered) -> Aim:
    """The target as typed, else the optimum of theory, else the middle of the usual frequencies."""
    said: dict[str, str] = {}
    lacks, words = "", ""
    Sp = _read(sperm_number, asked.Sp, "Sp", said)
    f = _read(frequency, asked.f, "f", said)
    if Sp is not None:
        words = f"Sp = {Sp:.4g}"
    else:
        Sp, refusal = best(answered.key, answered.plan)
        if Sp is not None:
            words = f"Sp = {Sp:.3g}, where theory has the largest scaled speed"
        elif not asked.Sp:
            lacks = str(refusal)
            # a flexible tail should have one; of the other forms nothing is amiss
            if f is None and answered.plan.swimmer.texts["form"] == ELASTIC:
                said.setdefault(field_of(refusal), lacks)
    if f is not None:
        words = f"{f:.3g} Hz" + (f" ({_viscosity(answered, Sp, f)})" if Sp else "")
    elif Sp is None:
        f = middle(answered.plan)
        words = f"{f:.3g} Hz, the middle of " + (
            "what the rig has run" if answered.plan.has_run.runs else "the usual"
        )
    return Aim(Sp, f, words, lacks, said)


def middle(plan: Plan) -> float:
    """The middle of the frequencies that are looked at, in Hz, as one would set it."""
    low, high = span_of(plan)
    return float(as_set(math.sqrt(low * high))[0])


def _read(act: Callable[[str], float], text: str, name: str, said: dict[str, str]) -> float | None:
    if not text:
        return None
    try:
        return act(text)
    except Refusal as refusal:
        said[name] = str(refusal)
        return None


def _viscosity(answered: Answered, Sp: float, f: float) -> str:
    mu = _viscosity_of(answered.key, Sp, f, answered.plan)
    return f"Sp = {Sp:.3g} there takes a viscosity of {mu:.3g} Pa.s"


@st.cache_data(max_entries=64, show_spinner=False)
def _viscosity_of(key: Key, Sp: float, f: float, _plan: Plan) -> float:
    return viscosity_for(_plan, Sp, f)


@st.cache_resource(max_entries=64, show_spinner=False)
def best(key: Key, _plan: Plan) -> tuple[float | None, Refusal | None]:
    """(the Sp of the predicted maximum, None) or (None, why there is none)."""
    try:
        return optimum(_plan), None
    except Refusal as refusal:
        return None, refusal


def field_of(refusal: Refusal) -> str:
    """The field that would mend what a refusal lacks: that of the first input it says it needs."""
    found = NEEDS.search(refusal.reason)
    return ASKS_FOR.get(found[1], found[1]) if found else refusal.field


# ---- tables


@st.cache_resource(max_entries=48, show_spinner="Asking every fluid …")
def fluids_table(
    key: Key, Sp: float | None, f: float | None, _plan: Plan
) -> tuple[pd.DataFrame | None, Refusal | None]:
    """What each fluid gives at a frequency, else at that which gives this Sp; or why that cannot be."""
    try:
        return (reach(_plan, Sp) if f is None else at_frequency(_plan, f)), None
    except Refusal as refusal:
        return None, refusal


@st.cache_data(max_entries=48, show_spinner=False)
def viscosities(key: Key, Sp: float, _plan: Plan) -> str:
    """Which viscosities put the swimmer at this Sp with nothing against it."""
    return good_viscosities(_plan, Sp)


@st.cache_resource(max_entries=48, show_spinner=False)
def sizes(
    key: Key, size: str, f: float, Sp: float, _plan: Plan
) -> tuple[pd.DataFrame | None, Refusal | None]:
    """Which value of a size puts the swimmer at this Sp at a frequency, fluid by fluid; or why none does."""
    try:
        return inverse(_plan, size, f, Sp), None
    except Refusal as refusal:
        return None, refusal
