"""Runs that could be proposed, and proposals as they are handed on."""

from dataclasses import dataclass

import numpy as np
import pandas as pd

from labbook.book.plan_deriving import as_set, derived, value
from labbook.book.plan_limits import FORBIDDEN, GOOD, objections, verdicts
from labbook.book.plan_setting import Plan
from labbook.book.plan_targets import span_of
from labbook.book.planning import planned
from labbook.errors import Refusal

CANDIDATES_F = 60  # frequencies of the candidates, in each fluid


@dataclass(frozen=True, eq=False)
class Proposals:
    """The next runs as planning.planned tells them, with `why` (a sentence each) and their place on the axes.

    criterion: by what they were chosen, in a sentence; kept: the group's runs on the axes (code, swimmer, and
    the axes' keys); before, after: the widest gap in units of the axes' spans, or the standard uncertainty of
    the Sp of the maximum, relative (inf where it cannot be told); notes: what else to know.
    """

    runs: pd.DataFrame
    criterion: str
    kept: pd.DataFrame
    before: float
    after: float
    notes: tuple[str, ...] = ()


def candidates(plan: Plan, theta0, strict: bool) -> tuple[pd.DataFrame, dict[str, np.ndarray]]:
    """(fluid id, f, theta0 of each; every key's values) of runs that could be proposed."""
    f = np.unique(as_set(np.geomspace(*span_of(plan), CANDIDATES_F)))
    theta0 = np.atleast_1d(theta0)
    ids = np.array([x.id for x in plan.fluids])
    at = pd.MultiIndex.from_product([ids, f, theta0], names=["id", "f", "theta0"]).to_frame(index=False)
    found = derived(plan, at["f"].to_numpy(), at["id"].to_numpy(), theta0=at["theta0"].to_numpy())
    verdict = verdicts(objections(plan, found, at["f"].to_numpy()), len(at))
    keep = verdict == GOOD if strict else verdict != FORBIDDEN
    if not keep.any():
        raise Refusal(
            "plan",
            plan.swimmer.code,
            f"every run that could be proposed is {'doubtful or ' * strict}forbidden",
            "a thicker fluid or another drive; asking for single fluids says what stands against each",
        )
    values = {k: value(found, k)[keep] for k in found.keys}
    return at[keep].reset_index(drop=True), values


def as_planned(plan: Plan, at: pd.DataFrame, why, amplitude: bool) -> pd.DataFrame:
    theta0 = at["theta0"].to_numpy() if amplitude else None
    runs = planned(plan, at["f"].to_numpy(), at["id"].to_numpy(), theta0=theta0)
    runs["why"] = list(why)
    return runs
