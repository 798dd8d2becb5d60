"""The Plan page's map with its key, and the table of what each fluid gives."""

import html

import numpy as np
import pandas as pd
import streamlit as st

from labbook.app import bench_plan, session
from labbook.app.plan_answers import Aim, Answered, Key, viscosities
from labbook.app.plan_proposed import Next
from labbook.book.plan_setting import Plan
from labbook.book.plan_zones import PlanMap
from labbook.book.planning import best_first, in_common
from labbook.charts.bands import limits_of
from labbook.charts.plan_map import RUN_COLUMNS, ground, plan_map
from labbook.exchange.plan_sheets import duration
from labbook.registry.typed import read
from labbook.registry.written import shown

SHEET = """<style>
.st-key-lb-plan-more { margin-top: 1.72rem; }
[data-testid="stLayoutWrapper"]:has(> .st-key-lb-plan-map), .st-key-lb-plan-map {
  height: calc(100vh - 19.5rem) !important; min-height: 23rem; max-height: 44rem;
  flex: none !important; overflow: hidden !important; }
.lb-key { font-size: 0.86rem; line-height: 1.5; display: flex; flex-wrap: wrap; gap: 0.1rem 1.1rem; }
.lb-key span.k { white-space: nowrap; }
.lb-key i { display: inline-block; width: 1.5rem; height: 0.85rem; margin-right: 0.4rem;
  vertical-align: -0.1rem; box-sizing: border-box; }
.lb-key i.dot { width: 0.55rem; height: 0.55rem; border-radius: 50%; background: currentColor;
  opacity: 0.8; vertical-align: 0.02rem; }
.lb-key i.ring, .lb-key i.wait, .lb-key i.done { width: 0.95rem; height: 0.95rem; border-radius: 50%;
  border: 2px solid light-dark(#0B6E75, #4FB3B8); }
.lb-key i.wait { border-style: dashed; }
.lb-key i.done { background: light-dark(#0B6E75, #4FB3B8); width: 0.8rem; height: 0.8rem; }
.lb-key i.aim { height: 0; border-top: 3.5px solid light-dark(#0B6E75, #4FB3B8); vertical-align: 0.22rem; }
.lb-key i.level { height: 0; border-top: 1.5px solid light-dark(#0B6E75, #4FB3B8); vertical-align: 0.22rem; }
.lb-key i.fluid { height: 0; border-top: 1.5px dashed currentColor; vertical-align: 0.22rem; }
.lb-key i.doubtful { background: rgba(230,159,0,0.25); border: 1px dotted rgba(128,128,128,0.9); }
.lb-key i.forbidden { border: 1px solid rgba(128,128,128,0.9); background: repeating-linear-gradient(135deg,
  rgba(128,128,128,0.25) 0 4px, rgba(128,128,128,0.75) 4px 5px); }
h3.lb-plan { margin: 0.7rem 0 -0.4rem 0; }
.lb-next { border-top: 1px solid rgba(128,128,128,0.25); padding: 0.3rem 0 0.35rem 0;
  font-size: 0.9rem; line-height: 1.35; }
.lb-next .p { display: inline-block; min-width: 1.25rem; font-weight: 600; }
.lb-next .v { opacity: 0.85; font-weight: 600; }
.lb-next div { padding-left: 1.25rem; font-size: 0.86rem; }
.lb-next div.h { padding-left: 0; font-size: 0.9rem; }
.lb-next div.w { opacity: 0.8; }
</style>"""
EMPTY = pd.DataFrame(columns=[*RUN_COLUMNS, "place"])
NO_RUNS = EMPTY[list(RUN_COLUMNS)]
COLUMNS = ("fluid", "f", "Sp", "Re_ω", "U expected", "settles in", "verdict")


# ---- the map


@st.cache_resource(max_entries=24, show_spinner=False)
def _ground(key: Key, _seen: PlanMap) -> dict[str, list[dict]]:
    return ground(f=_seen.f, mu=_seen.mu, zones=_seen.zones, fluids=_seen.fluids, runs=_seen.runs)


@st.cache_data(max_entries=48, show_spinner=False)
def _specification(key: Key, target, levels, marks, dark, _seen: PlanMap, _proposed, _waiting, _done) -> dict:
    """The chart, kept for the reruns that change nothing in it."""
    return plan_map(
        f=_seen.f,
        mu=_seen.mu,
        below=_ground(key, _seen),
        surface=_seen.grid["Sp"],
        zones=_seen.zones,
        levels=levels,
        target=target,
        proposed=_proposed,
        waiting=_waiting,
        done=_done,
        dark=dark,
    )


def draw(place, answered: Answered, aim: Aim, seen: PlanMap, found: Next | None, key):
    """The map, which is returned; found: the next runs, which depend on `key`; None while they are sought.

    place: where it goes: st, or the map that it is drawn over (an emptied place would let go of the drawing).
    """
    waiting, done = lines_on_map(answered.plan, seen)
    runs = None if found is None else found.runs
    proposed = EMPTY if runs is None else runs.assign(place=range(1, len(runs) + 1), code="")
    marks = (runs is not None and key, tuple(waiting.itertuples(index=False)), tuple(done["code"]))
    target = None if aim.Sp is None else float(f"{aim.Sp:.4g}")
    levels = tuple(limits_of("Sp", answered.plan.registry.regimes.values()))
    spec = _specification(
        answered.key, target, levels, marks, session.is_dark(), seen, proposed, waiting, done
    )
    return place.vega_lite_chart(spec=spec, theme=None, width="stretch", height="stretch")


def lines_on_map(plan: Plan, seen: PlanMap) -> tuple[pd.DataFrame, pd.DataFrame]:
    """(planned runs of this swimmer that wait on Bench, runs that were logged from such), with f and mu."""
    mine = [line for line in bench_plan.lines() if line.cells["swimmer"] == plan.swimmer.code]
    if not mine:
        return NO_RUNS, NO_RUNS
    mu = seen.fluids.set_index("code")["mu"].to_dict()
    rows = [
        {
            "code": "",
            "fluid": x.cells["fluid"],
            "f": read("f", x.cells["f"]).value,
            "mu": mu[x.cells["fluid"]],
        }
        for x in mine
        if not x.code and x.cells["fluid"] in mu
    ]
    codes = [line.code for line in mine if line.code]
    return pd.DataFrame(rows, columns=list(RUN_COLUMNS)), seen.runs[seen.runs["code"].isin(codes)]


def key_of_map(plan: Plan, seen: PlanMap, aim: Aim) -> None:
    """What the marks and shades mean, each zone with its reason, and what holds everywhere."""
    waiting, done = lines_on_map(plan, seen)
    n, all_ = len(seen.runs), len(plan.own)
    lost = f", {all_ - n} without f or viscosity" if all_ > n else ""
    whose = f" of {plan.swimmer.code} as it is" if plan.built else ""
    items = [("dot", f"{n} earlier kept run{'s' if n != 1 else ''}{whose}{lost}"), ("ring", "proposed")]
    items += [("wait", f"{len(waiting)} on Bench")] if len(waiting) else []
    items += [("done", f"{len(done)} logged from the plan")] if len(done) else []
    Sp = seen.grid["Sp"]
    there = np.isfinite(Sp).any()
    if aim.Sp and there:
        outside = "" if np.nanmin(Sp) <= aim.Sp <= np.nanmax(Sp) else ", outside this map"
        items.append(("aim", f"target Sp {aim.Sp:.3g}{outside}"))
    items += [("level", "Sp where regimes end")] if there else []
    items += [("fluid", f"fluids at {shown('T', seen.T)}")]
    swatches = "".join(f'<span class="k"><i class="{c}"></i>{html.escape(text)}</span>' for c, text in items)
    zones = "".join(
        f'<span><i class="{v}"></i><b>{html.escape(name)}</b> {v}: {html.escape(why)}</span>'
        for name, v, why in dict.fromkeys((z.name, z.verdict, z.why) for z in seen.zones)
    )
    st.html(f'<div class="lb-key">{swatches}</div><div class="lb-key">{zones}</div>')
    more = [f"in every run: {s}" if not s.startswith("in part") else s for s in seen.everywhere]
    if more:
        session.note("; ".join(more))


# ---- the table


def table(answered: Answered, aim: Aim, found: pd.DataFrame | None) -> None:
    """What each fluid gives at the target, the best first; found: None where the target was refused."""
    st.html(f"<h3 class='lb-plan'>{html.escape(f'What each fluid gives, {aim.words}')}</h3>")
    if found is None:
        session.note("Nothing: what would do stands under the target.")
        return
    ordered = best_first(found)
    session.table(COLUMNS, [_row(r) for r in ordered.to_dict("records")], numeric=(1, 2, 3, 4, 5))
    said = remarks(ordered)
    if aim.Sp and aim.f is None:
        said = [s for s in [viscosities(answered.key, aim.Sp, answered.plan)] if s] + said
    say(said)


def remarks(table: pd.DataFrame) -> list[str]:
    """What stands against the rows of a table, each sentence once: of every fluid, then with its fluids."""
    common = in_common(table)
    found: dict[str, list[str]] = {}
    for fluid, against in zip(table["fluid"], table["against"], strict=True):
        for sentence in against:
            if sentence not in common:
                found.setdefault(sentence, []).append(fluid)
    return [f"every fluid: {s}" for s in common] + [f"{', '.join(codes)}: {s}" for s, codes in found.items()]


def say(sentences: list[str]) -> None:
    """Quiet lines, one below the other."""
    if sentences:
        st.html(
            '<div class="lb-note">' + "".join(f"<div>{html.escape(s)}</div>" for s in sentences) + "</div>"
        )


def _row(row: dict) -> list[str]:
    return [
        row["fluid"],
        row["f_typed"] or shown("f", row["f"]),
        shown("Sp", row["Sp"], row["u_Sp"]),
        shown("Re_omega", row["Re_omega"], row["u_Re_omega"]),
        shown("U", row["U_model"], row["u_U_model"]),
        duration(row["t_settle"]),
        row["verdict"],
    ]
