"""The next n runs: those that fill a gap among the group's kept runs, or that pin down the maximum."""

from collections.abc import Mapping, Sequence

import pandas as pd
from sqlalchemy import Connection, select

from labbook.book.asking import Question, check_key
from labbook.book.plan_candidates import Proposals
from labbook.book.plan_gaps import filled
from labbook.book.plan_setting import Plan
from labbook.book.plan_top import pinned
from labbook.book.queries import frame
from labbook.book.tables import swimmer
from labbook.errors import Refusal

AXES_OF = {"helix": ("f_ratio", "Re_omega"), "undulating": ("f", "Re_omega")}


def propose(
    connection: Connection,
    plan: Plan,
    n: int = 5,
    *,
    fill: Sequence[str] = (),
    top: bool = False,
    within: Mapping[str, tuple[float, float]] | None = None,
    strict: bool = False,
) -> Proposals:
    """The next n runs of a swimmer that fill the widest gap, or with `top` pin down the scaled speed's maximum.

    fill: the two axes of the gap, those of the swimmer's form where left out; within: key -> (low, high) in
    SI, a part of the plane (of Sp alone for the maximum). Candidates are the plan's fluids at frequencies
    that the rig has run (planning.span_of), and where an axis is theta0 the amplitudes in THETA0; none that
    is forbidden, with `strict` none that is doubtful. Refuses unknown axes, a place that no candidate
    reaches, and a swimmer without a maximum.
    """
    if not 1 <= n <= 50:
        raise Refusal("n", n, "is how many runs to propose", "1 to 50")
    if top:
        return pinned(plan, _kept(connection, plan, ("Sp", "U_scaled")), n, within or {}, strict)
    fill = tuple(fill) or axes_of(plan)
    if len(fill) != 2 or fill[0] == fill[1]:
        raise Refusal("fill", ",".join(fill), "names no plane", "two keys, as Sp,Re_omega or Sp,theta0")
    for key in fill:
        check_key(key, plan.registry)
    return filled(plan, _kept(connection, plan, fill), fill, n, within or {}, strict)


def axes_of(plan: Plan) -> tuple[str, str]:
    """The axes of the gap where none are named: what governs a swimmer of this form."""
    return AXES_OF.get(plan.swimmer.texts["form"], ("Sp", "Re_omega"))


def _kept(connection, plan: Plan, keys) -> pd.DataFrame:
    """The kept runs of the swimmers of the same form, with the keys."""
    form = plan.swimmer.texts["form"]
    codes = tuple(connection.scalars(select(swimmer.c.code).where(swimmer.c.form == form)))
    if not codes:
        return pd.DataFrame(columns=["code", "swimmer", *keys, *(f"u_{k}" for k in keys)])
    return frame(connection, Question(swimmers=codes), keys=keys, texts=("code", "swimmer"))
