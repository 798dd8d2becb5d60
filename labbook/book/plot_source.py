"""How a plot reads the stored view: groups, conditions that SQLite scans well, the driver's own cursor."""

from dataclasses import replace

import numpy as np
from sqlalchemy import Connection, func, select

from labbook.book.asking import Question
from labbook.book.stored_view import column_of, resolved
from labbook.book.tables import fluid, material, run, swimmer
from labbook.errors import Refusal
from labbook.registry.group import Registry

CHUNK = 500  # rows turned into arrays at a time: few enough to stay in the processor's cache
GROUPS = ("swimmer", "fluid", "material", "by", "series")
BY_ID = {"swimmer": (resolved.c.swimmer_id, swimmer), "fluid": (resolved.c.fluid_id, fluid),
         "material": (resolved.c.material_id, material)}  # fmt: skip
_COVERED = {c.name for i in resolved.indexes if i.name == "ix_resolved_plot" for c in i.columns}


def check_group(group: str | None) -> None:
    """Refusal for what does not group runs."""
    if group is not None and group not in GROUPS:
        raise Refusal("colour", group, "runs are not grouped by it", f"one of {', '.join(GROUPS)}")


def group_column(group: str):
    """The column that tells the runs of a group: an id where the group is a record."""
    return BY_ID[group][0] if group in BY_ID else run.c[group]


def named(connection: Connection, group: str, values) -> np.ndarray:
    """Codes of a group's ids (NaN or None: none); texts stay as they are."""
    if group not in BY_ID:
        return np.array(values, dtype=object)
    ids = np.nan_to_num(np.array(values, dtype=float)).astype(np.int64)
    table = BY_ID[group][1]
    codes = dict(connection.execute(select(table.c.id, table.c.code)).all())
    code_of = np.full(max(codes, default=0) + 1, None, dtype=object)
    code_of[list(codes)] = list(codes.values())
    return code_of[ids]


def source(query, question: Question, group: str | None):
    """The query over the stored view, joined with the run where the question or the group needs it."""
    if question.needs_run() or group in ("by", "series"):
        return query.select_from(resolved.join(run, run.c.id == resolved.c.run_id))
    return query.select_from(resolved)


def conditions(question: Question, registry: Registry, used: set[str]) -> list:
    """The question's conditions, said so that SQLite scans where that is cheaper.

    Nearly every run is kept: the index of the regime query, whose first column is the state, would fetch
    nearly every row one by one. The plot's index serves where it holds all columns that are used.
    """
    if question.since or question.until or question.state == "all":
        return question.conditions(registry)
    banded = (band.number for name in question.regimes for band in registry.regime(name).bands)
    asked = {column_of(k) for k in (*question.ranges, *banded)}
    if used | asked <= _COVERED and not question.materials:
        return [*question.conditions(registry), resolved.c.swimmer_id.in_(select(swimmer.c.id))]
    state = func.coalesce(resolved.c.state, "") == question.state
    return [*replace(question, state="all").conditions(registry), state]


def blocks(connection: Connection, query, floats: int) -> tuple[np.ndarray, list]:
    """(a row of floats each, NaN where absent; the texts of the column after the floats, if there is one).

    Straight from the driver: a Row object each would cost more than the query.
    """
    compiled = query.compile(dialect=connection.dialect, compile_kwargs={"render_postcompile": True})
    parameters = compiled.params
    if compiled.positional:
        parameters = tuple(compiled.params[name] for name in compiled.positiontup)
    cursor = connection.exec_driver_sql(str(compiled), parameters).cursor
    with_text = len(query.selected_columns) > floats
    found, texts = [], []
    while rows := cursor.fetchmany(CHUNK):
        if with_text:
            *values, last = zip(*rows, strict=True)
            texts += last
            found.append(np.array(values, dtype=float).T)
        else:
            found.append(np.array(rows, dtype=float))
    return (np.concatenate(found) if found else np.empty((0, floats))), texts
