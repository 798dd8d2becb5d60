"""The command line's theory under a figure: which axes, from which runs, or the sentence why not."""

from collections.abc import Mapping

import pandas as pd

from labbook.api import Book
from labbook.book.asking import Question
from labbook.book.theory_runs import theory_runs
from labbook.charts.theory import Theory
from labbook.charts.theory_axes import WHERE, has_theory, reach, theory_on, why_none
from labbook.charts.theory_axes import takes as theory_takes
from labbook.errors import Refusal
from labbook.registry.dialects import CHOICES, completed


def refuse_axes(x: str, y: str) -> None:
    """Refusal for axes that no theory speaks of."""
    if not has_theory(x, y):
        raise Refusal("theory", f"{x} {y}", "theory has nothing to draw on these axes", WHERE)


def theory_under(
    opened: Book,
    question: Question,
    table: pd.DataFrame,
    x: str,
    y: str,
    *,
    colour: str,
    log: bool,
    dialects: Mapping[str, Mapping],
) -> Theory:
    """The theory for a figure of the table's rows; Refusal, with what would make one possible, else.

    dialects: as asked for on the command line.
    """
    registry = opened.registry
    spoken = {k: completed(k, dialects.get(k, {}), registry.house.get(k)) for k in (x, y) if k in CHOICES}
    why = why_none(x, y, registry.coefficient, spoken)
    if why:
        raise Refusal("theory", f"{x} {y}", why, "draw the house dialect, or leave --theory out")
    where = reach(table, x, y, colour, log_x=log, log_y=log, numbers=registry.numbers)
    if where is None:
        raise Refusal(
            "theory", f"{x} {y}", f"no run that was found can be drawn: {_lacking(opened, question, x, y)}"
        )
    keys, texts, spread = theory_takes(x, y)
    runs = opened.ask(
        theory_runs, question, keys, texts, group=colour, names=tuple(where.groups), spread=spread
    )
    found = theory_on(runs, where, x, y, group=colour, spoken=spoken, coefficient=registry.coefficient)
    if found.why:
        raise Refusal("theory", f"{x} {y}", found.why)
    return found


def _lacking(opened: Book, question: Question, x: str, y: str) -> str:
    """What the newest run of a question lacks for these axes."""
    for sheet in opened.sheets(question, 1):
        for key in (x, y):
            if key in sheet.why_absent:
                return f"{sheet.texts['code']}, the newest, has no {key}: {sheet.why_absent[key]}"
        return "the newest has a value that a log axis cannot show: try --linear"
    return "the question finds none"
