"""The runs that a theory under a plot is worked out from: a question's newest, and each swimmer named."""

from collections.abc import Sequence
from dataclasses import replace

import pandas as pd
from sqlalchemy import Connection

from labbook.book.asking import Question
from labbook.book.queries import frame

NEWEST = 2000  # runs that a curve's swimmers are looked up in
OF_ONE = 50  # newest runs of a swimmer that is named and has none among those


def theory_runs(
    connection: Connection,
    question: Question,
    keys: Sequence[str],
    texts: Sequence[str],
    *,
    group: str | None = None,
    names: Sequence[str] = (),
    spread: bool = True,
) -> pd.DataFrame:
    """The NEWEST newest runs of a question with some keys and texts, and the group's column beside them.

    names: of the groups that the plot names; a swimmer without a run among those has its newest ones looked
    up.
    """
    wanted = dict(keys=keys, texts=tuple(dict.fromkeys((*texts, *([group] if group else ())))), spread=spread)
    found = frame(connection, question, newest=NEWEST, **wanted)
    found.attrs = {}  # units and dialects of every key: pandas would copy them with every step
    if group != "swimmer" or len(found) < NEWEST:
        return found
    missing = [name for name in names if name not in set(found["swimmer"])]
    more = [
        frame(connection, replace(question, swimmers=(name,)), newest=OF_ONE, **wanted) for name in missing
    ]
    return pd.concat([found, *more], ignore_index=True)
