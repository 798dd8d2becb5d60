"""Many runs counted on a grid over a plot's axes in another dialect: columns read, restated, counted."""

import numpy as np
import pandas as pd
from sqlalchemy import Connection, select

from labbook.book.asking import Question
from labbook.book.dialect_columns import Dialects, restated, swimmer_inputs
from labbook.book.plot_grid import (
    COLUMNS,
    ROWS,
    VOID,
    Grid,
    X,
    Y,
    as_case,
    every_state,
    not_on_log,
    nothing,
    reasons_of,
    with_single_runs,
)
from labbook.book.plot_source import BY_ID, blocks, group_column, named, source
from labbook.book.registry_rows import registry_of
from labbook.book.stored_view import resolved, view_column


def reason_lost(number: str, why: str) -> str:
    """Why a run is not drawn that has a number, but not in the dialect asked for."""
    return f"no {number} in this dialect ({why})"


def dialect_grid(
    connection: Connection, question: Question, x, y, group, log_x, log_y, dialects: Dialects
) -> Grid:
    """The grid with x, y or both in dialects away from the house: columns read, restated, counted in arrays.

    dialects: number -> every choice. A run that has a number in the house dialect and none in this one is
    counted as left out, with the reason.
    """
    registry = registry_of(connection)
    asked, where = every_state(question, registry, x, y, group)
    reasons = reasons_of(x, y, False, False, registry.numbers)
    read = [as_case(reasons), resolved.c.run_id, resolved.c.swimmer_id, view_column(x), view_column(y)]
    query = source(select(*read, *([group_column(group)] if group else [])), asked, group).where(*where)
    block, texts = blocks(connection, query, len(read) + (group in BY_ID))
    reason, run_ids, swimmers = (block[:, i].astype(np.int64) for i in range(3))
    house = {x: block[:, 3], y: block[:, 4]}
    inputs = swimmer_inputs(connection, swimmers)
    spoken = {k: restated(registry, k, dialects[k], inputs, v) for k, v in house.items() if k in dialects}
    values = house | {k: found.value for k, found in spoken.items()}

    waiting, left_out = np.ones(len(block), bool), {}

    def leave(which: np.ndarray, why: str) -> None:
        count = int((waiting & which).sum())
        if count:
            left_out[why] = left_out.get(why, 0) + count
            waiting[which] = False

    for stage, key in ((VOID, None), (X, x), (Y, y)):
        for i, (at, why, _) in enumerate(reasons):
            if at == stage:
                leave(reason == i, why)
        lost = spoken[key].why if key in spoken else None
        for sentence in dict.fromkeys(filter(None, [] if lost is None else lost)):
            leave(lost == sentence, reason_lost(key, sentence))
    for key, log in ((x, log_x), (y, log_y)):
        if log:
            leave(values[key] <= 0, not_on_log(key))
    if not waiting.any():
        return nothing(x, y, group), left_out
    told = block[waiting, 5] if group in BY_ID else np.array(texts, dtype=object)[waiting] if group else None
    labels, names = pd.factorize(told, use_na_sentinel=False) if group else (0, None)
    p, i = _cells(values[x][waiting], log_x, COLUMNS)
    q, j = _cells(values[y][waiting], log_y, ROWS)
    _, first, cell, n = np.unique((labels * COLUMNS + i) * ROWS + j, return_index=True, return_inverse=True,
                                  return_counts=True)  # fmt: skip
    table = pd.DataFrame({"code": None, "state": "kept"}, index=range(len(n)), dtype=object)
    if group:
        table[group] = named(connection, group, names)[labels[first]]
    for key, place, log in ((x, p, log_x), (y, q, log_y)):
        mean = np.bincount(cell, weights=place) / n
        table[key] = np.exp(mean) if log else mean
    table["n"] = n
    drawn = np.flatnonzero(waiting)[first]
    table = with_single_runs(connection, table, run_ids[drawn], (x, y))
    return _spreads_restated(registry, table, dialects, {k: v[drawn] for k, v in house.items()},
                             {k: v[drawn] for k, v in inputs.items()}), left_out  # fmt: skip


def _cells(values: np.ndarray, log: bool, cells: int) -> tuple[np.ndarray, np.ndarray]:
    """Positions on an axis, and the number of the cell of each."""
    position = np.log(values) if log else values
    low, high = position.min(), position.max()
    width = ((high - low) or 1.0) * (1 + 1e-9) / cells
    return position, ((position - low) / width).astype(np.int64)


def _spreads_restated(registry, table: pd.DataFrame, dialects: Dialects, house, inputs) -> pd.DataFrame:
    """The table with the uncertainties of its single runs restated; house: their values there."""
    for key in house:
        if key in dialects:
            own, shared = table[f"u_own_{key}"], table[f"u_shared_{key}"]
            found = restated(registry, key, dialects[key], inputs, house[key], own, shared)
            table[f"u_own_{key}"], table[f"u_shared_{key}"] = found.u_own, found.u_shared
            table[f"u_{key}"] = np.hypot(found.u_own, found.u_shared)
    return table
