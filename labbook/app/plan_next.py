"""The Plan page's next runs: by what they are chosen, and the list with its reasons."""

import html
import math

import streamlit as st

from labbook.app import session
from labbook.app.plan_asked import MOST, PLANES, TARGET, TOP, Asked
from labbook.app.plan_out import show_coverage, take_out
from labbook.app.plan_proposed import Next
from labbook.app.plan_shown import say
from labbook.book.plan_setting import Plan
from labbook.book.planning import in_common
from labbook.charts.axes import label
from labbook.exchange.plan_sheets import expected
from labbook.registry.group import Registry


def controls(asked: Asked, plan: Plan, usual: str) -> None:
    """By what the runs are chosen, how many, whether doubtful ones count, and which part of the plane."""
    registry = plan.registry
    planes = PLANES if usual in PLANES else ()
    how = asked.how or usual
    offered = list(dict.fromkeys([usual, *planes, TOP, TARGET, how]))
    first, second = st.columns([0.7, 0.3])
    with first:
        st.session_state["plan:next"] = how
        st.selectbox(
            "Next runs",
            offered,
            key="plan:next",
            on_change=_write_next,
            args=(usual,),
            format_func=lambda word: _said(word, registry),
        )
    with second:
        st.session_state["plan:n"] = asked.n
        st.number_input("how many", 1, MOST, key="plan:n", on_change=_write_n)
    first, second = st.columns(2, vertical_alignment="center")
    with first:
        st.session_state["plan:strict"] = asked.strict
        st.toggle("nothing doubtful", key="plan:strict", on_change=_write_strict)
    keys = () if how == TARGET else ("Sp",) if how == TOP else tuple(how.split(","))
    if keys:
        with (
            second,
            st.popover(
                "Part of the plane" if not asked.within else f"Part: {len(asked.within)}", width="stretch"
            ),
        ):
            _part(asked, keys)


def _said(how: str, registry: Registry) -> str:
    if how == TOP:
        return "pin down the maximum"
    if how == TARGET:
        return "the target, fluid by fluid"
    known = {*registry.numbers, *registry.keys}
    return "fill the gap in " + ", ".join(
        label(k, registry.numbers) if k in known else k for k in how.split(",")
    )


def _part(asked: Asked, keys) -> None:
    """Limits on the axes, in the usual unit of each."""
    spans = {k: (low, high) for k, low, high in asked.within}
    for key in keys:
        for column, end, word in zip(st.columns(2), (0, 1), ("from", "to"), strict=True):
            with column:
                name = f"plan:within:{key}:{end}"
                st.session_state[name] = spans.get(key, ("", ""))[end]
                st.text_input(
                    f"{key} {word}", key=name, placeholder="no limit", on_change=_write_part, args=(keys,)
                )


def _write_next(usual: str) -> None:
    chosen = st.session_state["plan:next"]
    session.set_address(next=chosen if chosen != usual else None, within=None)


def _write_n() -> None:
    session.set_address(n=str(st.session_state["plan:n"]))


def _write_strict() -> None:
    session.set_address(strict="on" if st.session_state["plan:strict"] else None)


def _write_part(keys) -> None:
    parts = []
    for key in keys:
        low, high = (st.session_state[f"plan:within:{key}:{end}"].strip() for end in (0, 1))
        if low or high:
            parts.append(f"{key}:{low}:{high}")
    session.set_address(within=parts or None)


# ---- the list


def show(plan: Plan, found: Next, key: tuple) -> None:
    """The list, its criterion, the ways out, and the coverage; key: what the runs depend on (key_of_next)."""
    if found.refused is not None:
        session.say_refused(str(found.refused))
        return
    runs = found.runs.to_dict("records")
    varies = len({run["cells"].get("theta0") for run in runs}) > 1
    common = in_common(found.runs)
    st.html("".join(_item(i, run, varies, common) for i, run in enumerate(runs, start=1)))
    said = [*(f"every run: {s}" for s in common), *told(found, key[1])]
    take_out(plan, found.runs, said)
    say(said)
    if found.found is not None:
        show_coverage(plan, found, key)


def _item(i: int, run: dict, amplitude: bool, common: list[str]) -> str:
    head = ", ".join([run["fluid"], run["f_typed"], *([f"θ₀ {run['cells']['theta0']}"] if amplitude else [])])
    why = "; ".join(
        [*([run["why"]] if run.get("why") else []), *(s for s in run["against"] if s not in common)]
    )
    return (
        f'<div class="lb-next"><div class="h"><span class="p">{i}</span><b>{html.escape(head)}</b> '
        f'<span class="v">{run["verdict"]}</span></div><div>{html.escape(expected(run))}</div>'
        + (f'<div class="w">{html.escape(why)}</div>' if why else "")
        + "</div>"
    )


def told(found: Next, how: str) -> list[str]:
    """The criterion, what it goes by, and what the proposals are worth."""
    if found.found is None:
        return []
    proposals = found.found
    return [
        f"Criterion: {proposals.criterion}",
        gain(proposals.before, proposals.after, how == TOP),
        *proposals.notes,
    ]


def gain(before: float, after: float, top: bool) -> str:
    """What proposals are worth, before and after them."""
    if top:
        now = f"{100 * before:.2g} %" if math.isfinite(before) else "not known"
        return (
            f"Sp of the maximum known to (one standard uncertainty) {now} now, {100 * after:.2g} % with these"
        )
    now = f"{100 * before:.2g} %" if math.isfinite(before) else "all"
    return f"widest gap, as a share of the plane: {now} now, {100 * after:.2g} % with these"
