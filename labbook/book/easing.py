"""Where a question finds nothing: which single part of it, left out, would find runs."""

from dataclasses import replace

from sqlalchemy import Connection

from labbook.book.asking import Question
from labbook.book.queries import count

_PARTS = ("fluids", "swimmers", "materials", "people", "series", "since", "until", "text")


def eased(connection: Connection, question: Question) -> list[tuple[str, int, Question]]:
    """(what is left out, runs found then, that question), most runs first; only what would help."""
    plain, found = Question(), []
    for name in question.regimes:
        found.append((name, replace(question, regimes=tuple(r for r in question.regimes if r != name))))
    for key in question.ranges:
        found.append(
            (
                f"the range of {key}",
                replace(question, ranges={k: span for k, span in question.ranges.items() if k != key}),
            )
        )
    for name in _PARTS:
        if getattr(question, name):
            found.append((f"the {name}", replace(question, **{name: getattr(plain, name)})))
    if question.state != "all":
        found.append((f"only {question.state} runs", replace(question, state="all")))
    counted = [(what, count(connection, asked), asked) for what, asked in found]
    return sorted((c for c in counted if c[1]), key=lambda c: -c[1])
