"""Many rows at once through the driver: the one place that bypasses SQLAlchemy's per-row work."""

from collections.abc import Sequence
from functools import lru_cache

from sqlalchemy import Connection, Dialect, Table, insert


@lru_cache(maxsize=32)
def _statement(table: Table, columns: tuple[str, ...], dialect: Dialect) -> str:
    # compiling a statement of 150 columns takes as long as all the rest of logging a run
    statement = insert(table).values({c: None for c in columns})
    return str(statement.compile(dialect=dialect, column_keys=list(columns)))


def write_many(connection: Connection, table: Table, columns: Sequence[str], rows: Sequence[Sequence]) -> None:
    """Insert rows given as tuples in the order of `columns` (values as the driver takes them)."""
    if not rows:
        return
    dialect = connection.dialect
    compiled = _statement(table, tuple(columns), dialect)
    order = [c.name for c in table.columns if c.name in columns]
    if dialect.positional:
        if order != list(columns):
            places = [list(columns).index(c) for c in order]
            rows = [tuple(row[i] for i in places) for row in rows]
        connection.exec_driver_sql(compiled, [tuple(row) for row in rows])
    else:
        connection.exec_driver_sql(compiled, [dict(zip(columns, row, strict=True)) for row in rows])
