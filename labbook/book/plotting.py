"""What a plot asks of the book: runs one by one, or counted on a grid where they are many, in any dialect."""

from collections.abc import Sequence
from dataclasses import dataclass, field, replace

import numpy as np
import pandas as pd
from sqlalchemy import Connection, select

from labbook.book.asking import Question, check_key
from labbook.book.dialect_columns import Dialects, away, in_words
from labbook.book.dialect_grid import dialect_grid, reason_lost
from labbook.book.plot_grid import sql_grid
from labbook.book.plot_source import BY_ID, blocks, check_group, conditions, group_column, named, source
from labbook.book.queries import count, frame
from labbook.book.registry_rows import registry_of
from labbook.book.stored_view import view_column

MOST_ROWS = 5000  # runs given one by one


@dataclass(frozen=True)
class PlotRows:
    """What a plot draws: a frame with code, state, group, x, y and u_ columns; {reason: runs} left out.

    A binned frame has one row per group and occupied cell, with n runs at their mean position (of the
    logarithms on a log axis); only a row of one run has code and u_ columns there.
    dialects: words of the axes that are not in the house dialect, by number.
    """

    frame: pd.DataFrame
    left_out: dict[str, int]
    binned: bool
    dialects: dict[str, str] = field(default_factory=dict)


def plot_frame(
    connection: Connection, question: Question, x: str, y: str, group: str | None = None, *,
    log_x: bool = True, log_y: bool = True, most: int = MOST_ROWS, dialects: Dialects | None = None,
) -> PlotRows:  # fmt: skip
    """The runs of a question for a plot of y against x; above `most` runs they are counted on a grid.

    dialects: number -> choices; an axis of that number is restated, with its uncertainties, and a run that
    has no value there is left out with the reason. The question is read in the house dialect.
    Void runs that meet the rest of a question for kept ones are left out as 'void'; in a frame of single
    runs the other reasons are left to the chart. Errors: Refusal for an unknown key, group or dialect.
    """
    registry = registry_of(connection)
    for key in (x, y):
        check_key(key, registry)
    numbers = registry.numbers
    check_group(group)
    spoken = {k: choices for k, choices in away(registry, dialects).items() if k in (x, y)}
    words = in_words(registry, spoken)
    if count(connection, question) > most:
        plane = (x, y, group, log_x, log_y)
        if spoken:
            return PlotRows(*dialect_grid(connection, question, *plane, spoken), True, words)
        return PlotRows(*sql_grid(connection, question, *plane), True)
    divisors = [numbers[k].not_zero for k in (x, y) if k in numbers and numbers[k].not_zero]
    texts = ("code", "state", "at", *([group] if group else []))
    keys = tuple(dict.fromkeys((x, y, *divisors)))
    rows = frame(connection, question, keys=keys, texts=texts, dialects=spoken)
    left_out = {}
    if question.state == "kept":
        voided = count(connection, replace(question, state="void"))
        left_out = {"void": voided} if voided else {}
    kept, lost = _without_lost(rows.drop(columns="at"), x, y)
    return PlotRows(kept, left_out | lost, False, words)


def _without_lost(rows: pd.DataFrame, x: str, y: str) -> tuple[pd.DataFrame, dict[str, int]]:
    """The rows less those whose number has no value in its dialect, and {reason: runs} for these."""
    waiting, left_out = (rows["state"] != "void").to_numpy(), {}
    gone = np.zeros(len(rows), bool)
    for key in dict.fromkeys((x, y)):
        why = rows.attrs.get("lost", {}).get(key)
        for sentence in dict.fromkeys(filter(None, [] if why is None else why)):
            # a run without x is counted as that, whatever its y
            here = waiting & ~gone & (why == sentence) & (np.isfinite(rows[x].to_numpy()) | (key == x))
            gone |= here
            if here.any():
                left_out[reason_lost(key, sentence)] = int(here.sum())
    kept = rows[~gone] if gone.any() else rows
    kept.attrs = {}  # a sentence a run: pandas would copy it with every step
    return kept, left_out


def plot_columns(
    connection: Connection, question: Question, keys: Sequence[str], group: str | None = None
) -> dict[str, np.ndarray]:
    """One array a key (SI, NaN where absent), and one of the group's texts, over every run of a question.

    No order is promised. Errors: Refusal for an unknown key or group.
    """
    check_group(group)
    registry = registry_of(connection)
    columns = [view_column(check_key(k, registry)) for k in keys]
    if group:
        columns.append(group_column(group))
    used = {c.name for c in columns}
    query = source(select(*columns), question, group).where(*conditions(question, registry, used))
    block, texts = blocks(connection, query, len(keys) + (group in BY_ID))  # ids pass as floats, exactly
    found = dict(zip(keys, block[:, : len(keys)].T, strict=True))
    if group:
        found[group] = named(connection, group, block[:, -1] if group in BY_ID else texts)
    return found
