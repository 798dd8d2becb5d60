"""Plan: the next run. A map of f and viscosity, what each fluid gives, proposals, which tail to build."""

import streamlit as st

from labbook.app import plan_controls, plan_next, plan_shown, plan_sizes, session
from labbook.app.plan_answers import (
    Answered,
    aim_of,
    best,
    codes,
    field_of,
    fluids_table,
    map_of,
    plan_for,
)
from labbook.app.plan_asked import asked as in_address
from labbook.app.plan_proposed import key_of_next, next_runs, usual_plane
from labbook.book.plan_zones import PlanMap
from labbook.physics.tails import THETA0_CHECKED

LOOKED_FOR = "plan:looked-for"  # what the proposals that were drawn last depend on


def page() -> None:
    """The page."""
    state = session.state_of_book()
    if not codes(state, "swimmer") or not codes(state, "fluid"):
        _empty()
        return
    asked, said = in_address()
    answered, wrong = _answered(asked, codes(state, "swimmer"), state)
    if answered.plan is None:
        for sentence in answered.said.values():
            session.say_refused(sentence)
        _empty()
        return
    st.html(plan_shown.SHEET)
    head = st.container()
    left, right = st.columns([0.64, 0.36], gap="medium")
    aim = aim_of(asked, answered)
    seen = map_of(answered.key, answered.plan)
    usual = usual_plane(answered.plan, seen)
    key = key_of_next(asked, answered, aim, usual)
    with left, st.container(key="lb-plan-map", height=470, border=False):  # the stylesheet fills the window
        # the map first, whatever stands above it: proposals that are not looked for yet come in later
        known = st.session_state.get(LOOKED_FOR) == key
        found = next_runs(key, answered) if known else None
        chart = plan_shown.draw(st, answered, aim, seen, found, key)
    table, unreachable = fluids_table(answered.key, aim.Sp, aim.f, answered.plan)
    with head:
        for sentence in (*said, *wrong):
            session.say_refused(sentence)
        beyond = {} if unreachable is None else {field_of(unreachable): str(unreachable)}
        plan_controls.fields(
            asked, answered, _best(answered), answered.said | beyond | aim.said, _doubts(answered, seen)
        )
        if aim.lacks and aim.lacks not in aim.said.values():
            session.note(aim.lacks)
    with right:
        plan_next.controls(asked, answered.plan, usual)
        if found is None:
            found = next_runs(key, answered)
            st.session_state[LOOKED_FOR] = key
            plan_shown.draw(chart, answered, aim, seen, found, key)
        plan_next.show(answered.plan, found, key)
    with left:
        plan_shown.key_of_map(answered.plan, seen, aim)
        plan_shown.table(answered, aim, table)
        plan_sizes.question(answered, asked, aim)


def _answered(asked, known: list[str], state: str) -> tuple[Answered, list[str]]:
    """The plan for the swimmer asked for, else for the last used, and what was wrong with the first."""
    first = asked.swimmer or known[0]
    answered = plan_for(asked, first, state)
    if answered.plan is None and first != known[0]:
        return plan_for(asked, known[0], state), list(answered.said.values())
    return answered, []


def _best(answered: Answered) -> str:
    """The target where none is typed."""
    Sp, _ = best(answered.key, answered.plan)
    return "none" if Sp is None else f"{Sp:.3g}, best"


def _doubts(answered: Answered, seen: PlanMap) -> dict[str, str]:
    """What stands against every run because of what is set, by field."""
    if not answered.plan.value("theta0") > THETA0_CHECKED:
        return {}
    return {"theta0": said for said in seen.everywhere if "angle" in said}


def _empty() -> None:
    """A plan needs a swimmer and a fluid: where they are added."""
    st.header("Nothing to plan with yet")
    st.markdown(
        "A plan needs a *swimmer* and a *fluid* that are on the shelf and not retired. Then this page says "
        "at which frequency a tail reaches its best sperm number in each fluid, and which runs are lacking."
    )
    st.page_link(st.session_state["pages"]["shelf"], label="To the shelf", icon=":material/add:")
    session.note("`labbook demo` opens an invented group to look around in.")
