"""What a plot asks of the book: runs one by one, or counted on a grid by the database where they are many."""

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
import pandas as pd
from sqlalchemy import Connection, Integer, and_, case, cast, func, select

from labbook.book.asking import Question, check_key
from labbook.book.queries import count, frame
from labbook.book.stored_view import column_of, resolved
from labbook.book.tables import fluid, material, run, swimmer
from labbook.errors import Refusal
from labbook.registry.catalogue import NUMBERS
from labbook.registry.regimes import regime

MOST_ROWS = 5000  # runs given one by one
COLUMNS, ROWS = 96, 64  # cells of the grid along x and y
CHUNK = 500  # rows turned into arrays at a time: few enough to stay in the processor's cache
AT_ONCE = 900  # bound values in one statement

GROUPS = ("swimmer", "fluid", "material", "by", "series")
_BY_ID = {"swimmer": (resolved.c.swimmer_id, swimmer), "fluid": (resolved.c.fluid_id, fluid),
          "material": (resolved.c.material_id, material)}  # fmt: skip
_COVERED = {c.name for i in resolved.indexes if i.name == "ix_resolved_plot" for c in i.columns}
_DRAWN = -1
_MATHEMATICS = "ENABLE_MATH_FUNCTIONS"


@dataclass(frozen=True)
class PlotRows:
    """What a plot draws: a frame with code, state, group, x, y and u_ columns; {reason: runs} left out.

    A binned frame has one row per group and occupied cell, with n runs at their mean position (of the
    logarithms on a log axis); only a row of one run has code and u_ columns there.
    """

    frame: pd.DataFrame
    left_out: dict[str, int]
    binned: bool


def plot_frame(
    connection: Connection, question: Question, x: str, y: str, group: str | None = None, *,
    log_x: bool = True, log_y: bool = True, also: Sequence[str] = (), most: int = MOST_ROWS, numbers=NUMBERS,
) -> PlotRows:  # fmt: skip
    """The runs of a question for a plot of y against x; above `most` runs they are counted on a grid in SQL.

    also: further keys wanted beside single runs (a grid has none).
    Void runs that meet the rest of a question for kept ones are left out as 'void'; in a frame of single
    runs the other reasons are left to the chart. Errors: Refusal for an unknown key or group.
    """
    for key in (x, y):
        check_key(key)
    _check_group(group)
    if count(connection, question) > most:
        return _binned(connection, question, x, y, group, log_x, log_y, numbers)
    divisors = [numbers[k].not_zero for k in (x, y) if k in numbers and numbers[k].not_zero]
    texts = ("code", "state", "at", *([group] if group else []))
    rows = frame(connection, question, keys=tuple(dict.fromkeys((x, y, *divisors, *also))), texts=texts)
    left_out = {}
    if question.state == "kept":
        voided = count(connection, replace(question, state="void"))
        left_out = {"void": voided} if voided else {}
    return PlotRows(rows.drop(columns="at"), left_out, False)


def plot_columns(
    connection: Connection, question: Question, keys: Sequence[str], group: str | None = None
) -> dict[str, np.ndarray]:
    """One array a key (SI, NaN where absent), and one of the group's texts, over every run of a question.

    No order is promised. Errors: Refusal for an unknown key or group.
    """
    _check_group(group)
    columns = [resolved.c[column_of(check_key(k))] for k in keys]
    if group:
        columns.append(_group_column(group))
    used = {c.name for c in columns}
    query = _source(select(*columns), question, group).where(*_conditions(question, used))
    floats = len(keys) if group in ("by", "series") else len(columns)  # ids pass as floats, exactly
    blocks, texts = [], []
    cursor = _cursor(connection, query)
    while rows := cursor.fetchmany(CHUNK):
        if floats < len(columns):
            *values, last = zip(*rows, strict=True)
            texts += last
            blocks.append(np.array(values, dtype=float).T)
        else:
            blocks.append(np.array(rows, dtype=float))
    block = np.concatenate(blocks) if blocks else np.empty((0, floats))
    found = dict(zip(keys, block[:, : len(keys)].T, strict=True))
    if group:
        found[group] = _named(connection, group, texts if floats < len(columns) else block[:, -1])
    return found


def _check_group(group: str | None) -> None:
    if group is not None and group not in GROUPS:
        raise Refusal("colour", group, "runs are not grouped by it", f"one of {', '.join(GROUPS)}")


def _group_column(group: str):
    return _BY_ID[group][0] if group in _BY_ID else run.c[group]


def _named(connection: Connection, group: str, values) -> np.ndarray:
    """Codes of a group's ids (NaN or None: none); texts stay as they are."""
    if group not in _BY_ID:
        return np.array(values, dtype=object)
    ids = np.nan_to_num(np.array(values, dtype=float)).astype(np.int64)
    table = _BY_ID[group][1]
    codes = dict(connection.execute(select(table.c.id, table.c.code)).all())
    code_of = np.full(max(codes, default=0) + 1, None, dtype=object)
    code_of[list(codes)] = list(codes.values())
    return code_of[ids]


def _source(query, question: Question, group: str | None):
    if question.needs_run() or group in ("by", "series"):
        return query.select_from(resolved.join(run, run.c.id == resolved.c.run_id))
    return query.select_from(resolved)


def _conditions(question: Question, used: set[str]) -> list:
    """The question's conditions, said so that SQLite scans where that is cheaper.

    Nearly every run is kept: the index of the regime query, whose first column is the state, would fetch
    nearly every row one by one. The plot's index serves where it holds all columns that are used.
    """
    if question.since or question.until or question.state == "all":
        return question.conditions()
    asked = {column_of(k) for k in (*question.ranges, *(regime(r).number for r in question.regimes))}
    if used | asked <= _COVERED and not question.materials:
        return [*question.conditions(), resolved.c.swimmer_id.in_(select(swimmer.c.id))]
    state = func.coalesce(resolved.c.state, "") == question.state
    return [*replace(question, state="all").conditions(), state]


def _cursor(connection: Connection, query):
    """The driver's own cursor on a query: a Row object each would cost more than the query."""
    compiled = query.compile(dialect=connection.dialect, compile_kwargs={"render_postcompile": True})
    parameters = compiled.params
    if compiled.positional:
        parameters = tuple(compiled.params[name] for name in compiled.positiontup)
    return connection.exec_driver_sql(str(compiled), parameters).cursor


# ---- counted on a grid


def _reasons(x: str, y: str, log_x: bool, log_y: bool, numbers) -> list[tuple[str, object]]:
    """(reason, condition) in the order in which a run is counted: under the first that holds."""
    said = [("void", resolved.c.state == "void")]
    for key in dict.fromkeys((x, y)):
        column = resolved.c[column_of(key)]
        divisor = numbers[key].not_zero if key in numbers else ""
        if divisor:
            value, own, shared = (resolved.c[p + column_of(divisor)] for p in ("", "u_own_", "u_shared_"))
            near = value * value <= 4 * (own * own + shared * shared)
            said.append((f"with {divisor} consistent with 0, so without {key}", and_(column.is_(None), near)))
        said.append((f"without {key}", column.is_(None)))
    for key, log in ((x, log_x), (y, log_y)):
        if log:
            said.append((f"{key} zero or negative on a log axis", resolved.c[column_of(key)] <= 0))
    return said


def _binned(connection, question, x, y, group, log_x, log_y, numbers) -> PlotRows:
    _teach_logarithm(connection)
    # void runs are counted too, as a reason
    asked = replace(question, state="all") if question.state == "kept" else question
    used = {column_of(k) for k in (x, y)} | ({_group_column(group).name} if group else set())
    conditions = _conditions(asked, used)
    reasons = _reasons(x, y, log_x, log_y, numbers)
    a, b = resolved.c[column_of(x)], resolved.c[column_of(y)]
    reason = case(*((holds, i) for i, (_, holds) in enumerate(reasons)), else_=_DRAWN)
    told = select(reason.label("reason"), a.label("a"), b.label("b"))
    told = _source(told, question, None).where(*conditions).subquery()
    outer = (func.count(), func.min(told.c.a), func.max(told.c.a), func.min(told.c.b), func.max(told.c.b))
    counted = {r[0]: r[1:] for r in connection.execute(select(told.c.reason, *outer).group_by(told.c.reason))}
    left_out = {text: counted[i][0] for i, (text, _) in enumerate(reasons) if i in counted}
    columns = ["code", "state", *([group] if group else []), *dict.fromkeys((x, y)), "n"]
    if _DRAWN not in counted:
        return PlotRows(pd.DataFrame(columns=columns), left_out, True)
    _, low_x, high_x, low_y, high_y = counted[_DRAWN]
    across, column = _placed(a, low_x, high_x, log_x, COLUMNS)
    up, row = _placed(b, low_y, high_y, log_y, ROWS)
    name = _group_column(group) if group else resolved.c.state
    inner = select(name.label("g"), column.label("i"), row.label("j"), across.label("p"), up.label("q"),
                   resolved.c.run_id.label("run_id"))  # fmt: skip
    inner = _source(inner, question, group).where(*conditions, reason == _DRAWN).subquery()
    mean_x, mean_y = func.avg(inner.c.p), func.avg(inner.c.q)
    cells = select(inner.c.g, func.count(), mean_x, mean_y, func.min(inner.c.run_id))
    found = connection.execute(cells.group_by(inner.c.i, inner.c.j, inner.c.g)).fetchall()
    g, n, p, q, first = zip(*found, strict=True)
    table = pd.DataFrame({"code": None, "state": "kept"}, index=range(len(n)), dtype=object)
    if group:
        table[group] = _named(connection, group, g)
    table[x] = np.exp(p) if log_x else np.array(p, dtype=float)
    table[y] = np.exp(q) if log_y else np.array(q, dtype=float)
    table["n"] = np.array(n, dtype=np.int64)
    return PlotRows(_with_single_runs(connection, table, np.array(first), (x, y)), left_out, True)


def _placed(column, low: float, high: float, log: bool, cells: int):
    """A column's position on its axis, and the number of its cell."""
    position = func.ln(column) if log else column
    low, high = (math.log(low), math.log(high)) if log else (low, high)
    width = ((high - low) or 1.0) * (1 + 1e-9) / cells
    return position, cast(func.floor((position - low) / width), Integer)


def _with_single_runs(connection, table: pd.DataFrame, run_ids: np.ndarray, keys) -> pd.DataFrame:
    """The table with code and uncertainties where a row is one run: only those can be named."""
    single = np.flatnonzero(table["n"].to_numpy() == 1)
    prefixes = [f"{p}{k}" for k in dict.fromkeys(keys) for p in ("u_own_", "u_shared_")]
    columns = [resolved.c[f"{p}{column_of(k)}"] for k in dict.fromkeys(keys) for p in ("u_own_", "u_shared_")]
    query = select(run.c.id, run.c.code, *columns).join(resolved, resolved.c.run_id == run.c.id)
    known = {}
    for start in range(0, len(single), AT_ONCE):
        ids = run_ids[single[start : start + AT_ONCE]].tolist()
        known |= {r[0]: r[1:] for r in connection.execute(query.where(run.c.id.in_(ids)))}
    rows = [known[i] for i in run_ids[single].tolist()]
    table.loc[single, "code"] = np.array([r[0] for r in rows], dtype=object)
    for place, name in enumerate(prefixes, start=1):
        table[name] = np.nan
        table.loc[single, name] = np.array([r[place] for r in rows], dtype=float)
    for key in dict.fromkeys(keys):
        table[f"u_{key}"] = np.hypot(table[f"u_own_{key}"], table[f"u_shared_{key}"])
    return table


def _teach_logarithm(connection: Connection) -> None:
    """Give SQLite ln and floor where it was built without them; slower, but the same."""
    if connection.dialect.name != "sqlite":
        return
    options = {r[0] for r in connection.exec_driver_sql("PRAGMA compile_options")}
    if _MATHEMATICS not in options:
        driver = connection.connection.driver_connection
        driver.create_function("ln", 1, _ln, deterministic=True)
        driver.create_function("floor", 1, math.floor, deterministic=True)


def _ln(value: float | None) -> float | None:
    return math.log(value) if value is not None and value > 0 else None
