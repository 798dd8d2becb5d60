"""Many runs counted on a grid over a plot's axes by the database, in the house dialect."""

import math
from collections.abc import Mapping
from dataclasses import replace

import numpy as np
import pandas as pd
from sqlalchemy import Connection, Integer, and_, case, cast, func, select

from labbook.book.asking import Question
from labbook.book.plot_source import conditions, group_column, named, source
from labbook.book.registry_rows import registry_of
from labbook.book.stored_view import PREFIXES, column_of, resolved, view_column
from labbook.book.tables import run
from labbook.registry.catalogue import Number
from labbook.registry.group import Registry

COLUMNS, ROWS = 96, 64  # cells of the grid along x and y
AT_ONCE = 900  # bound values in one statement
DRAWN = -1
VOID, X, Y, LOG = range(4)  # the stages in which a run is left out
_MATHEMATICS = "ENABLE_MATH_FUNCTIONS"

Grid = tuple[pd.DataFrame, dict[str, int]]  # the rows, and {reason: runs} for those that have no place


def reasons_of(x: str, y: str, log_x: bool, log_y: bool, numbers: Mapping[str, Number]) -> list[tuple]:
    """(stage, reason, condition) in the order in which a run is counted: under the first that holds."""
    said = [(VOID, "void", resolved.c.state == "void")]
    for key, stage in ({x: X} | ({} if x == y else {y: Y})).items():
        column = view_column(key)
        divisor = numbers[key].not_zero if key in numbers else ""
        if divisor:
            value, own, shared = (view_column(divisor, p) for p in PREFIXES)
            near = value * value <= 4 * (own * own + shared * shared)
            reason = f"with {divisor} consistent with 0, so without {key}"
            said.append((stage, reason, and_(column.is_(None), near)))
        said.append((stage, f"without {key}", column.is_(None)))
    for key, log in ((x, log_x), (y, log_y)):
        if log:
            said.append((LOG, not_on_log(key), view_column(key) <= 0))
    return said


def not_on_log(key: str) -> str:
    """Why a run that has a number is not drawn on a log axis."""
    return f"{key} zero or negative on a log axis"


def sql_grid(connection: Connection, question: Question, x, y, group, log_x, log_y) -> Grid:
    """The grid in the house dialect, counted by the database."""
    registry = registry_of(connection)
    _teach_logarithm(connection)
    asked, where = every_state(question, registry, x, y, group)
    reasons = reasons_of(x, y, log_x, log_y, registry.numbers)
    a, b = view_column(x), view_column(y)
    reason = as_case(reasons)
    told = select(reason.label("reason"), a.label("a"), b.label("b"))
    told = source(told, asked, None).where(*where).subquery()
    outer = (func.count(), func.min(told.c.a), func.max(told.c.a), func.min(told.c.b), func.max(told.c.b))
    counted = {r[0]: r[1:] for r in connection.execute(select(told.c.reason, *outer).group_by(told.c.reason))}
    left_out = {text: counted[i][0] for i, (_, text, _) in enumerate(reasons) if i in counted}
    if DRAWN not in counted:
        return nothing(x, y, group), left_out
    _, low_x, high_x, low_y, high_y = counted[DRAWN]
    across, column = _placed(a, low_x, high_x, log_x, COLUMNS)
    up, row = _placed(b, low_y, high_y, log_y, ROWS)
    name = group_column(group) if group else resolved.c.state
    inner = select(name.label("g"), column.label("i"), row.label("j"), across.label("p"), up.label("q"),
                   resolved.c.run_id.label("run_id"))  # fmt: skip
    inner = source(inner, asked, group).where(*where, reason == DRAWN).subquery()
    mean_x, mean_y = func.avg(inner.c.p), func.avg(inner.c.q)
    cells = select(inner.c.g, func.count(), mean_x, mean_y, func.min(inner.c.run_id))
    found = connection.execute(cells.group_by(inner.c.i, inner.c.j, inner.c.g)).fetchall()
    g, n, p, q, first = zip(*found, strict=True)
    table = pd.DataFrame({"code": None, "state": "kept"}, index=range(len(n)), dtype=object)
    if group:
        table[group] = named(connection, group, g)
    table[x] = np.exp(p) if log_x else np.array(p, dtype=float)
    table[y] = np.exp(q) if log_y else np.array(q, dtype=float)
    table["n"] = np.array(n, dtype=np.int64)
    return with_single_runs(connection, table, np.array(first), (x, y)), left_out


def every_state(question: Question, registry: Registry, x, y, group) -> tuple[Question, list]:
    """The question with void runs, which are counted too, as a reason; and its conditions."""
    asked = replace(question, state="all") if question.state == "kept" else question
    used = {column_of(k) for k in (x, y)} | ({group_column(group).name} if group else set())
    return asked, conditions(asked, registry, used)


def as_case(reasons):
    """The place of the first reason that holds, DRAWN where none does."""
    return case(*((holds, i) for i, (_, _, holds) in enumerate(reasons)), else_=DRAWN)


def nothing(x: str, y: str, group: str | None) -> pd.DataFrame:
    """A grid without a run."""
    return pd.DataFrame(columns=["code", "state", *([group] if group else []), *dict.fromkeys((x, y)), "n"])


def _placed(column, low: float, high: float, log: bool, cells: int):
    """A column's position on its axis, and the number of its cell."""
    position = func.ln(column) if log else column
    low, high = (math.log(low), math.log(high)) if log else (low, high)
    width = ((high - low) or 1.0) * (1 + 1e-9) / cells
    return position, cast(func.floor((position - low) / width), Integer)


def with_single_runs(connection, table: pd.DataFrame, run_ids: np.ndarray, keys) -> pd.DataFrame:
    """The table with code and uncertainties where a row is one run: only those can be named."""
    single = np.flatnonzero(table["n"].to_numpy() == 1)
    prefixes = [f"{p}{k}" for k in dict.fromkeys(keys) for p in ("u_own_", "u_shared_")]
    columns = [view_column(k, p) for k in dict.fromkeys(keys) for p in ("u_own_", "u_shared_")]
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
