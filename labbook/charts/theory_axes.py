"""Which axes have a theory, what it takes from the runs, and that theory for the runs that a plot draws."""

from collections.abc import Mapping
from dataclasses import dataclass

import pandas as pd

from labbook.charts import drawable, theory, theory_residual
from labbook.charts.palette import OTHER
from labbook.charts.theory import CURVES, NOTHING, Theory, X
from labbook.charts.theory_residual import RATIO
from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS, Number
from labbook.registry.dialects import Choices

WHERE = f"{' and '.join(CURVES)} over {X}, and {RATIO} over anything, have a theory"


def has_theory(x: str, y: str) -> bool:
    """Whether theory has anything to draw on two axes, whatever their dialects."""
    return (x == X and y in CURVES) or (y == RATIO and x != RATIO)


def why_none(x: str, y: str, coefficient: str, spoken: Mapping[str, Choices]) -> str:
    """Why theory draws nothing on these axes in these dialects (every choice named); '' where it does."""
    if not has_theory(x, y):
        return f"only {WHERE}"
    return (
        "" if y == RATIO else theory.why_no_curve(coefficient, {k: spoken[k] for k in (x, y) if k in spoken})
    )


def takes(x: str, y: str) -> tuple[tuple[str, ...], tuple[str, ...], bool]:
    """Keys and texts of runs that a theory takes, and whether their u too; Refusal for axes without one."""
    if not has_theory(x, y):
        raise Refusal("theory", f"{y} over {x}", "theory has nothing to draw on these axes", WHERE)
    if y == RATIO:
        return tuple(dict.fromkeys((x, *theory_residual.inputs()))), theory_residual.TEXTS, False
    return theory.INPUTS, theory.TEXTS, True


@dataclass(frozen=True)
class Reach:
    """Where the rows of a plot lie along x: all of them, and each group that the legend names."""

    whole: tuple[float, float]
    groups: Mapping[str, tuple[float, float]]


def reach(
    frame: pd.DataFrame,
    x: str,
    y: str,
    group: str | None,
    *,
    log_x: bool,
    log_y: bool,
    numbers: Mapping[str, Number] = NUMBERS,
) -> Reach | None:
    """The Reach of the rows that a plot has a place for, None without any; group: a column or None."""
    shown, _ = drawable.split(frame, x=x, y=y, log_x=log_x, log_y=log_y, numbers=numbers)
    if shown.empty:
        return None
    at, named = shown[x].astype(float), None
    if group:
        told, names = drawable.named_groups(shown[group], drawable.runs_of(shown))
        named = at.groupby(told).agg(["min", "max"]).loc[[name for name in names if name != OTHER]]
    groups = (
        {} if named is None else {str(n): (float(r["min"]), float(r["max"])) for n, r in named.iterrows()}
    )
    return Reach((float(at.min()), float(at.max())), groups)


def theory_on(
    runs: pd.DataFrame,
    where: Reach | None,
    x: str,
    y: str,
    *,
    group: str | None,
    spoken: Mapping[str, Choices],
    coefficient: str,
) -> Theory:
    """The theory of two axes under the rows of a plot; runs: as `takes` says, with the group's column.

    group, spoken, coefficient: as theory.tail_curves takes them.
    """
    why = why_none(x, y, coefficient, spoken)
    if why or where is None:
        return Theory(NOTHING, why=why or f"no run found has both {x} and {y}")
    if y == RATIO:
        return theory_residual.residual_line(runs[runs[x].notna()], *where.whole)
    return theory.tail_curves(
        runs,
        *where.whole,
        y=y,
        family=group,
        spans=where.groups,
        coefficient=coefficient,
        spoken={k: spoken[k] for k in (x, y) if k in spoken},
    )
