"""What stands against a planned run: inertia, step-out, what the rig has run, and the theory's own doubts."""

from dataclasses import dataclass
from math import inf

import numpy as np

from labbook.book.derive import Derived
from labbook.book.plan_deriving import u, value
from labbook.book.plan_setting import Plan, plausible_frequencies
from labbook.physics.prediction_doubts import doubts
from labbook.registry.regimes import Regime
from labbook.registry.written import shown

GOOD, DOUBTFUL, FORBIDDEN = "good", "doubtful", "forbidden"
STEP_OUT_MARGIN = 2.0  # standard uncertainties
FRAMES_A_BEAT = 10  # common practice, no source
_SAID_ELSEWHERE = (
    "inertia",
    "not creeping",
    "step-out",
)  # by the book's own regimes, and with f_ratio's uncertainty
_ALWAYS = ("held base", "resistive force", "scatter")  # of the model, not of this run


@dataclass(frozen=True)
class Limit:
    """One limit on a key of a planned run.

    name: what it is about, limits of one name being grades of one thing; key: of the stored view, or f; low,
    high: beyond them it is broken; verdict: DOUBTFUL or FORBIDDEN; margin: standard uncertainties that are
    added before it is compared; why: what a value beyond means.
    """

    name: str
    key: str
    verdict: str
    why: str
    low: float = -inf
    high: float = inf
    margin: float = 0.0

    def broken(self, values, spread) -> np.ndarray:
        """Where values (with standard uncertainty) lie beyond; NaN breaks nothing."""
        room = self.margin * np.nan_to_num(spread)
        return (values + room > self.high) | (values - room < self.low)

    @property
    def says(self) -> str:
        """'Re_omega above 0.1: inertia begins to count (creeping ends there)'."""
        bounds = [
            f"{side} {shown(self.key, limit)}"
            for side, limit in (("below", self.low), ("above", self.high))
            if np.isfinite(limit)
        ]
        near = "within its uncertainty of being " if self.margin else ""
        return f"{self.key} {near}{' or '.join(bounds)}: {self.why}"


def limits_of(plan: Plan) -> list[Limit]:
    """The limits on f and on the numbers of a planned run, those that forbid first."""
    found = []
    if plan.swimmer.texts["form"] != "undulating":  # which swims by inertia
        found += _creeping(plan.registry.regimes)
    found += [
        Limit("step-out", "f_ratio", FORBIDDEN, "the magnet slips behind the field", high=1.0),
        Limit(
            "step-out",
            "f_ratio",
            DOUBTFUL,
            "the magnet may slip behind the field",
            high=1.0,
            margin=STEP_OUT_MARGIN,
        ),
    ]
    low, high = plausible_frequencies()
    found.append(Limit("out of reach", "f", FORBIDDEN, "no rig is likely to do that", low, high))
    if plan.rig is not None and plan.has_run.runs:
        code, has = plan.rig.code, plan.has_run
        slack = 1.0 + 1e-9
        found += [
            Limit(
                "rig frequency", "f", DOUBTFUL, f"slower than {code} has run so far", low=has.f_low / slack
            ),
            Limit(
                "rig frequency", "f", DOUBTFUL, f"faster than {code} has run so far", high=has.f_high * slack
            ),
        ]
        if np.isfinite(has.B_high):
            found.append(
                Limit(
                    "rig field",
                    "B",
                    DOUBTFUL,
                    f"stronger than {code} has run so far",
                    high=has.B_high * slack,
                )
            )
    fps = plan.rig.value("fps") if plan.rig is not None else None
    if fps:
        found += [
            Limit(
                "camera",
                "f",
                FORBIDDEN,
                "less than two frames a beat, the beat cannot be told (Nyquist)",
                high=fps / 2,
            ),
            Limit(
                "camera", "f", DOUBTFUL, f"less than {FRAMES_A_BEAT} frames a beat", high=fps / FRAMES_A_BEAT
            ),
        ]
    return sorted(found, key=lambda limit: limit.verdict != FORBIDDEN)


def _creeping(regimes: dict[str, Regime]) -> list[Limit]:
    """Where the book's regimes end the creeping range, and where they end the range next to it."""
    bands = sorted((r.low, r.high, r.name) for r in regimes.values() if r.numbers == ("Re_omega",))
    first = next((b for b in bands if b[0] == -inf), None)
    if first is None:
        return []
    _, end, name = first
    found = [Limit("inertia", "Re_omega", DOUBTFUL, f"inertia begins to count ({name} ends there)", high=end)]
    following = next((b for b in bands if b[0] == end and b[1] < inf), None)
    if following is not None:
        _, far, beside = following
        found.insert(
            0,
            Limit(
                "inertia", "Re_omega", FORBIDDEN, f"no Stokes flow any more ({beside} ends there)", high=far
            ),
        )
    return found


@dataclass(frozen=True, eq=False)
class Objection:
    """One thing that stands against some planned runs: what about, how gravely, where, and in which words."""

    name: str
    verdict: str
    where: np.ndarray
    says: str


def objections(plan: Plan, found: Derived, f) -> list[Objection]:
    """Everything that stands against any of some planned runs; of one name the gravest alone."""
    n, objected = len(f), []
    told: dict[str, np.ndarray] = {}
    for limit in limits_of(plan):
        values, spread = (
            (np.asarray(f, float), np.zeros(n))
            if limit.key == "f"
            else (value(found, limit.key), u(found, limit.key))
        )
        before = told.get(limit.name, np.zeros(n, bool))
        where = limit.broken(values, spread) & ~before
        told[limit.name] = before | where
        objected.append(Objection(limit.name, limit.verdict, where, limit.says))
    for doubt in theory_doubts(plan, found):
        objected.append(Objection(doubt.key, DOUBTFUL, np.broadcast_to(doubt.where, (n,)), doubt.says))
    beyond = np.array(['"mu": ["extrapolated"' in marks for marks in found.marks]) & np.isfinite(
        value(found, "mu")
    )
    objected.append(
        Objection(
            "mu", DOUBTFUL, beyond, "viscosity extrapolated: its readings do not reach this temperature"
        )
    )
    return [one for one in objected if one.where.any()]


def verdicts(objected: list[Objection], n: int) -> np.ndarray:
    """The verdict on each of n planned runs: the gravest of what stands against it."""
    verdict = np.full(n, GOOD, dtype=object)
    for grave in (DOUBTFUL, FORBIDDEN):
        for one in objected:
            if one.verdict == grave:
                verdict[one.where] = grave
    return verdict


def judged(plan: Plan, found: Derived, f) -> tuple[np.ndarray, list[list[str]]]:
    """(verdict, what stands against it: sentences) of each planned run."""
    objected = objections(plan, found, f)
    said = [[one.says for one in objected if one.where[i]] for i in range(len(f))]
    return verdicts(objected, len(f)), said


def theory_doubts(plan: Plan, found: Derived) -> list:
    """What speaks against the prediction of planned runs, but for what limits_of says better."""
    values = {k: value(found, k) for k in found.keys}
    with np.errstate(all="ignore"):
        values["Sp_model"] = values["L_tail"] * (values["zeta_n"] * values["omega"] / values["EI"]) ** 0.25
    of = doubts(
        form=plan.swimmer.texts["form"], drive=plan.drive, values=values, drag_model=plan.registry.coefficient
    )
    return [d for d in of if d.key not in (*_SAID_ELSEWHERE, *_ALWAYS)]


def caveats(plan: Plan, found: Derived) -> list[str]:
    """What holds of the model itself, whatever is run."""
    values = {k: value(found, k) for k in found.keys}
    of = doubts(
        form=plan.swimmer.texts["form"], drive=plan.drive, values=values, drag_model=plan.registry.coefficient
    )
    return [d.says for d in of if d.key in _ALWAYS and np.any(d.where)]
