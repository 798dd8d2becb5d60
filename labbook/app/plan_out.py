"""The ways out of a plan, to paper, sheet or Bench, and the coverage that it adds to."""

from datetime import date

import pandas as pd
import streamlit as st

from labbook.app import bench_plan, session
from labbook.app.plan_asked import TOP
from labbook.app.plan_proposed import Next
from labbook.book.plan_setting import Plan
from labbook.charts.plan_coverage import HEIGHT, coverage
from labbook.exchange.plan_sheets import as_page, as_run_sheet

PREDICTED = {"U_scaled": "U_scaled_model"}  # what the theory has in place of what is measured


def take_out(plan: Plan, runs: pd.DataFrame, said: list[str]) -> None:
    """Print, CSV and Bench; a tail that is not on the shelf can be printed alone."""
    code, day = plan.swimmer.code, f"{date.today():%Y-%m-%d}"
    title, series = f"Planned runs of {code}, {session.book().name}, {day}", f"plan {code} {day}"
    with st.container(key="lb-plan-out", horizontal=True, gap="small"):
        st.download_button(
            "Print",
            lambda: as_page(plan, runs, title, said),
            f"plan-{code}.html",
            "text/html",
            key="plan:print",
            on_click="ignore",
            width="stretch",
            icon=":material/print:",
            help="A page with cautions and tick boxes",
        )
        st.download_button(
            "CSV",
            lambda: as_run_sheet(runs, series),
            f"plan-{code}.csv",
            "text/csv",
            key="plan:csv",
            on_click="ignore",
            width="stretch",
            icon=":material/download:",
            disabled=plan.built,
        )
        st.button(
            "To Bench",
            key="plan:bench",
            type="primary",
            width="stretch",
            disabled=plan.built,
            on_click=_put,
            args=(as_run_sheet(runs, series), f"plan-{code}.csv"),
        )
    if plan.built:
        session.note(
            "Sheet and Bench wait until this tail is on the shelf: its runs would be logged as another's."
        )
        st.page_link(
            st.session_state["pages"]["shelf"],
            label="Add it to the shelf",
            icon=":material/add:",
            query_params={"kind": "swimmer", "add": "swimmer"},
        )
    for sentence in session.refused("plan:bench").values():
        session.say_refused(sentence)
    waiting = sum(not line.code for line in bench_plan.lines())
    if waiting:
        st.page_link(
            st.session_state["pages"]["bench"],
            label=f"{waiting} planned on Bench",
            icon=":material/edit_note:",
        )


def _put(sheet: str, name: str) -> None:
    """Put the list on Bench by way of its sheet, so that both ways give the same lines."""
    put: list[int] = []
    if session.attempt(lambda: put.append(bench_plan.put(sheet, name)), "plan:bench"):
        st.session_state["plan:address"] = dict(st.query_params)
        session.keep_message(f"{put[0]} planned run{'s' if put[0] > 1 else ''} on Bench")


# ---- the coverage


@st.cache_data(max_entries=48, show_spinner=False)
def _specification(
    key, done: tuple, dark: bool, _plan: Plan, _found: Next, _x: str, _y: str
) -> tuple[dict, int]:
    runs = _found.runs.assign(place=range(1, len(_found.runs) + 1))
    return coverage(
        kept=_found.found.kept,
        proposed=runs,
        x=_x,
        y=_y,
        swimmer=_plan.swimmer.code,
        done=done,
        numbers=_plan.registry.numbers,
        proposed_y=PREDICTED.get(_y, _y),
        dark=dark,
    )


def show_coverage(plan: Plan, found: Next, key: tuple) -> None:
    """Where the group has kept runs on the axes of the gap, or about the maximum."""
    how = key[1]
    x, y = ("Sp", "U_scaled") if how == TOP else how.split(",")
    if not {x, PREDICTED.get(y, y)} <= set(found.runs.columns):
        session.note(f"No picture of {x} and {y}: what is planned is not told in them.")
        return
    done = tuple(line.code for line in bench_plan.lines() if line.code)
    spec, n = _specification(key, done, session.is_dark(), plan, found, x, y)
    st.vega_lite_chart(spec=spec, theme=None, width="stretch", height=HEIGHT)
    lost = len(found.found.kept) - n
    session.note(
        f"{n} kept runs of {plan.swimmer.texts['form']} swimmers, dark those of {plan.swimmer.code}"
        + (f"; {lost} without a place on these axes" if lost else "")
        + "."
    )
