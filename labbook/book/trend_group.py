"""The runs that statistics of a trend are over: one form's, kept, with x and y that can be told from zero."""

from dataclasses import dataclass, replace

import numpy as np
from sqlalchemy import Connection

from labbook.book.asking import Question
from labbook.book.queries import count
from labbook.book.trend_source import TrendRuns, trend_runs
from labbook.errors import Refusal
from labbook.physics.trend_points import Points

EVERY = "all"  # in place of a form
NO_FAMILY = "none"
# what a family may be, the first where nothing is chosen: a maximum has an interval over its swimmers
FAMILIES = ("material", "swimmer", "fluid", NO_FAMILY)
NAMELESS = "no material"


@dataclass(frozen=True, eq=False)
class TrendGroup:
    """Runs of one form, or of all.

    runs: those of the form, usable or not; points: the usable ones; form: '' for all; forms: form -> usable
    runs, most first; excluded: reason -> runs, of all that the question finds and of the void ones beside
    them; found: how many it finds.
    """

    runs: TrendRuns
    points: Points
    form: str
    forms: dict[str, int]
    excluded: dict[str, int]
    found: int

    def owners(self, family: str) -> np.ndarray:
        """The family of each run; Refusal for no kind of family."""
        if family not in FAMILIES:
            raise Refusal("family", family, "is no kind of family", f"one of {', '.join(FAMILIES)}")
        if family == NO_FAMILY:
            return np.full(len(self.runs), "", object)
        names = getattr(self.runs, family)
        return np.where(names == "", NAMELESS, names).astype(object)


def kept_only(question: Question) -> Question:
    """The question without void runs; Refusal where it asks for nothing else."""
    if question.state == "void":
        raise Refusal("state", "void", "void runs stay out of statistics", "ask for kept runs")
    return replace(question, state="kept")


def trend_group(connection: Connection, question: Question, x: str, y: str, form: str = "") -> TrendGroup:
    """The runs of a question for statistics of y against x, house dialect; form: as of_form takes it.

    Errors: Refusal for an unknown key or form, for void runs, for more than 16 000 runs and where none can
    be used.
    """
    asked = kept_only(question)
    group = of_form(trend_runs(connection, asked, x, y), form)
    voided = count(connection, replace(question, state="void"))
    return replace(group, excluded=({"void": voided} if voided else {}) | group.excluded)


def of_form(runs: TrendRuns, form: str = "") -> TrendGroup:
    """The runs of one form: a rigid control or a helix says nothing of a flexible tail's maximum.

    form: which; left out: the one with most usable runs; 'all': all of them as one. Errors: Refusal for a
    form that no run is of, and where no run can be used.
    """
    usable = runs.points()
    forms = _counted(runs.form[usable.index])
    if form not in ("", EVERY) and form not in set(runs.form):
        raise Refusal("form", form, "no run that was found is of this form", _offered(runs.form))
    chosen = "" if form == EVERY else form or next(iter(forms), "")
    if not forms or (chosen and not forms.get(chosen)):
        other = "choose other axes, or widen the filter"
        raise Refusal("runs", f"{runs.y_key} against {runs.x_key}", _why_none(runs, chosen), other)
    excluded = {}
    if chosen:
        excluded = {f"of form {other}": n for other, n in _counted(runs.form).items() if other != chosen}
    own = runs.where(runs.form == chosen) if chosen else runs
    points = own.points()
    return TrendGroup(own, points, chosen, forms, excluded | points.left_out, len(runs))


def _counted(texts: np.ndarray) -> dict[str, int]:
    """text -> how many, most first."""
    names, counts = np.unique(texts.astype(str), return_counts=True)
    return {str(names[k]): int(counts[k]) for k in np.argsort(-counts, kind="stable")}


def _offered(forms: np.ndarray) -> str:
    return f"one of {', '.join(_counted(forms))}, or {EVERY}" if len(forms) else ""


def _why_none(runs: TrendRuns, form: str) -> str:
    if not len(runs):
        return "no kept run was found"
    n, whose = (int(np.sum(runs.form == form)), f" of form {form}") if form else (len(runs), "")
    return f"none of the {n} runs{whose} that were found has both clearly above zero"
