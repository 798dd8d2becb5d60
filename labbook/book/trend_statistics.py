"""Statistics of a trend, piece by piece: maxima of group and families, slopes, changes, outliers, repeats."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
import pandas as pd

from labbook.book.repeat_groups import RepeatGroups, grouped
from labbook.book.trend_group import NO_FAMILY, TrendGroup
from labbook.book.trend_suspects import suspects
from labbook.errors import Refusal
from labbook.physics.trend_causes import Outliers, outliers
from labbook.physics.trend_change import Change, changes
from labbook.physics.trend_curve import curve
from labbook.physics.trend_maximum import Maximum, maximum
from labbook.physics.trend_slope import PowerLaw, power_law

MOST_FAMILIES = 24  # those with most usable runs
BELOW, BEYOND, WHOLE, CHOSEN = "below the top", "beyond the top", "all runs", "range chosen"
# what a caller may show while it waits, in this order
STEPS = ("maximum", "families", "slopes", "changes", "outliers", "repeats")


@dataclass(frozen=True, eq=False)
class Top:
    """The maximum of a family ('' the whole group) of n usable runs; None with the reason why."""

    name: str
    n: int
    maximum: Maximum | None
    why: str = ""


@dataclass(frozen=True, eq=False)
class Slope:
    """A power law in a range, None with the reason why; where: which range."""

    where: str
    law: PowerLaw | None
    why: str = ""


@dataclass(frozen=True, eq=False)
class Changed:
    """Changes over time of each owner, a material batch or a swimmer; none with the reason why."""

    owner: str
    rows: tuple[Change, ...] = ()
    why: str = ""


@dataclass(frozen=True, eq=False)
class Outlying:
    """Outliers of the group, their index in group.runs; None with the reason why."""

    found: Outliers | None
    why: str = ""


@dataclass(frozen=True, eq=False)
class Statistics:
    """All that is told of a trend; more_families: those beyond the largest, not looked at."""

    group: TrendGroup
    family: str
    top: Top
    tops: tuple[Top, ...]
    more_families: int
    slopes: tuple[Slope, ...]
    changed: Changed
    outlying: Outlying
    repeats: RepeatGroups


def statistics(
    group: TrendGroup, family: str, between: tuple[float, float] | None = None,
    step: Callable[[str], None] = lambda what: None,
) -> Statistics:  # fmt: skip
    """Everything about a group; between: the range of the slope, both sides of the top where left out.

    step is told each of STEPS as it begins.
    """
    group.owners(family)  # refuses an unknown one before anything is worked out
    step("maximum")
    top = top_of(group)
    step("families")
    names, more = family_names(group, family)
    tops = tuple(top_of(group, family, name) for name in names)
    step("slopes")
    found = slopes(group, top.maximum, between)
    step("changes")
    changed = changed_over_time(group, family)
    step("outliers")
    outlying = outlying_runs(group)
    step("repeats")
    return Statistics(group, family, top, tops, more, found, changed, outlying, repeated_runs(group))


def family_names(group: TrendGroup, family: str) -> tuple[tuple[str, ...], int]:
    """The MOST_FAMILIES families with most usable runs, by name, and how many more there are."""
    if family == NO_FAMILY:
        return (), 0
    names, counts = np.unique(group.owners(family)[group.points.index].astype(str), return_counts=True)
    largest = np.argsort(-counts, kind="stable")[:MOST_FAMILIES]
    return tuple(sorted(str(names[k]) for k in largest)), max(0, len(names) - MOST_FAMILIES)


def top_of(group: TrendGroup, family: str = NO_FAMILY, name: str = "") -> Top:
    """The maximum of one family, or of the whole group."""
    points = group.points
    if family != NO_FAMILY:
        points = points.where(keep=group.owners(family)[points.index] == name)
    n = len(points.x)
    if not n:
        return Top(name, 0, None, "no usable run")
    try:
        return Top(name, n, maximum(points=points))
    except Refusal as refusal:
        return Top(name, n, None, _reason(refusal))


def slopes(
    group: TrendGroup, top: Maximum | None, between: tuple[float, float] | None = None
) -> tuple[Slope, ...]:
    """The power law between two x; left out: on both sides of the maximum's window, or of all where none is.

    Errors: Refusal for ends that are not in order; of a range with too few runs the reason is told.
    """
    if between is not None:
        if not between[0] < between[1]:
            written = f"{between[0]:g} to {between[1]:g}"
            raise Refusal("between", written, "is no range", "give the lower end first")
        return (_slope(group, CHOSEN, *between),)
    if top is None or not top.found:
        return (_slope(group, WHOLE, 0.0, np.inf),)
    return _slope(group, BELOW, 0.0, top.window[0]), _slope(group, BEYOND, top.window[1], np.inf)


def _slope(group: TrendGroup, where: str, low: float, high: float) -> Slope:
    try:
        return Slope(where, power_law(points=group.points, low=low, high=high))
    except Refusal as refusal:
        return Slope(where, None, _reason(refusal))


def changed_over_time(group: TrendGroup, family: str) -> Changed:
    """Whether batches change, or swimmers one by one where these are the family."""
    owner = "swimmer" if family == "swimmer" else "material"
    try:
        rows = changes(points=group.points, days=group.runs.day, owner=group.owners(owner))
    except Refusal as refusal:
        return Changed(owner, why=_reason(refusal))
    return Changed(owner, rows)


def outlying_runs(group: TrendGroup) -> Outlying:
    """Runs far from the group's own curve, with the likeliest cause of each."""
    runs = group.runs
    try:
        fit = curve(points=group.points).fit
        return Outlying(outliers(fit=fit, causes=suspects(runs), names=runs.code))
    except Refusal as refusal:
        return Outlying(None, _reason(refusal))


def _reason(refusal: Refusal) -> str:
    """Why a piece is not told, in words that stand without the refused value's name."""
    if refusal.field == "runs":
        return f"{refusal.typed} usable runs, and {refusal.reason}"
    return refusal.reason.replace("lie in it", "lie in the range")


def repeats_placed(group: TrendGroup, groups: RepeatGroups) -> pd.DataFrame:
    """Where the repeat groups of a group stand on its plot: x, y, scatter of y, n, name; a row a group.

    x is the mean of those of its runs that have one, NaN where none has.
    """
    x, table = group.runs.x, groups.table
    mine = [x[(groups.found.group == g) & np.isfinite(x)] for g in range(len(table))]
    middle = [float(m.mean()) if len(m) else np.nan for m in mine]
    names = [f"{row.swimmer} in {row.fluid}" for row in table.itertuples()]
    return pd.DataFrame({"x": middle, "y": table["mean"], "scatter": table["scatter"], "n": table["n"],
                         "name": names})  # fmt: skip


def repeated_runs(group: TrendGroup) -> RepeatGroups:
    """Repeats among all runs of the group that have a y, near zero or not."""
    runs = group.runs
    return grouped(runs.y_key, code=runs.code, swimmer=runs.swimmer, fluid=runs.fluid, settings=runs.settings,
                   T=runs.T, y=runs.y, own_y=runs.own_y)  # fmt: skip
