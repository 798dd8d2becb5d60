"""The wide stored view: one row a run, per key a value, u_own and u_shared, built from the registry at any time."""

import hashlib
from collections.abc import Callable, Sequence
from functools import lru_cache

import numpy as np
from sqlalchemy import (
    Column,
    ColumnElement,
    Connection,
    Float,
    ForeignKey,
    Index,
    Integer,
    MetaData,
    String,
    Table,
    Text,
    column,
    update,
)
from sqlalchemy import inspect as inspect_database

from labbook.book.tables import metadata as facts
from labbook.registry.catalogue import NUMBERS
from labbook.registry.quantities import RESOLVED_KEYS

VIEW_NAME = "resolved"

BIRTH_KEYS: tuple[str, ...] = RESOLVED_KEYS + tuple(NUMBERS)
PREFIXES = ("", "u_own_", "u_shared_")


def column_of(key: str) -> str:
    """The column of a key: SQL names are blind to case, so T beside t needs another name."""
    return f"{key}_cap" if len(key) == 1 and key.isupper() else key


# copied from the run so that one covering index answers a query
COPIED = ("at", "state", "swimmer_id", "fluid_id", "material_id")
SENTENCES = ("mu_from", "rho_from", "lam_from", "E_from")
TOLD = ("run_id", *COPIED, *SENTENCES, "marks", "digest")  # what a row holds beside its floats


@lru_cache(maxsize=64)
def float_columns(keys: tuple[str, ...]) -> tuple[str, ...]:
    """The columns of some keys: value, u_own_, u_shared_ of each."""
    return tuple(p + column_of(k) for k in keys for p in PREFIXES)


def own_columns(key: str) -> tuple[str, ...]:
    """The columns of a group's own number; its digest stands apart, so that adding one touches no other's."""
    return (*float_columns((key,)), f"digest_{key}")


@lru_cache(maxsize=64)
def table_of(own: tuple[str, ...] = ()) -> Table:
    """The stored view of a book with these own numbers."""
    metadata = MetaData(naming_convention=facts.naming_convention)
    facts.tables["run"].to_metadata(metadata)
    for name in ("swimmer", "fluid", "material", "rig"):
        facts.tables[name].to_metadata(metadata)
    table = Table(
        VIEW_NAME,
        metadata,
        Column("run_id", ForeignKey("run.id"), primary_key=True),
        Column("at", String(20), nullable=False),
        Column("state", String(8), nullable=False),
        Column("swimmer_id", Integer, nullable=False),
        Column("fluid_id", Integer, nullable=False),
        Column("material_id", Integer),
        *(Column(name, Text) for name in SENTENCES),
        Column("marks", Text),
        Column("digest", String(32), nullable=False),
        *(Column(name, Float(53)) for name in float_columns(BIRTH_KEYS)),
        *(column for key in own for column in _own(key)),
    )
    # three covering indexes: the regime query, the plot of any swimmer, and the span of Re
    Index("ix_resolved_regimes", table.c.state, table.c.at, table.c.run_id, table.c.Re_omega, table.c.Sp,
          table.c.St)
    Index("ix_resolved_plot", table.c.swimmer_id, table.c.state, table.c.Sp, table.c.U_cap, table.c.stride,
          table.c.U_scaled, table.c.fluid_id)
    # the state comes last, or SQLite would at times take this index for the plot's query
    Index("ix_resolved_Re", table.c.swimmer_id, table.c.Re, table.c.state)
    return table


def _own(key: str) -> list[Column]:
    *floats, digest = own_columns(key)
    return [*(Column(name, Float(53)) for name in floats), Column(digest, String(32))]


# what every book has; columns of own numbers are asked for by `view_column`
resolved = table_of()


def view_column(key: str, prefix: str = "") -> ColumnElement:
    """The column of a key of any book's view, own numbers included (the key must be checked before)."""
    name = prefix + column_of(key)
    if name in resolved.c:
        return resolved.c[name]
    own = column(name, Float(53))
    own.table = resolved
    return own


def build(connection: Connection, own: tuple[str, ...] = ()) -> None:
    """Drop the stored view and make it again, empty, with columns for these own numbers."""
    resolved.drop(connection, checkfirst=True)
    table_of(own).create(connection)


def built(connection: Connection, own: tuple[str, ...] = ()) -> bool:
    """Whether the view stands with these columns; it may keep empty ones of withdrawn numbers."""
    return set(map(_folded(connection), table_of(own).c.keys())) <= _columns(connection)


def _columns(connection: Connection) -> set[str]:
    inspector = inspect_database(connection)
    there = inspector.get_columns(VIEW_NAME) if inspector.has_table(VIEW_NAME) else ()
    return {_folded(connection)(c["name"]) for c in there}


def _folded(connection: Connection) -> Callable[[str], str]:
    """A column's name as the database tells columns apart: to SQLite mg and Mg are one."""
    return str.lower if connection.dialect.name == "sqlite" else str


def add_number(connection: Connection, key: str) -> None:
    """Give the view the columns of an own number, empty."""
    there = _columns(connection)
    for new in (c for c in _own(key) if _folded(connection)(c.name) not in there):
        kind = new.type.compile(connection.dialect)
        connection.exec_driver_sql(f'ALTER TABLE {VIEW_NAME} ADD COLUMN "{new.name}" {kind}')


def empty_number(connection: Connection, key: str) -> None:
    """Empty the columns of a withdrawn number; dropping them would write the whole view anew for each."""
    view = table_of((key,))
    connection.execute(update(view).values(dict.fromkeys(own_columns(key))).where(view.c[f"digest_{key}"].is_not(None)))


def own_digests(run_ids: Sequence[int], key: str, floats: np.ndarray) -> list[str | None]:
    """One digest a row over its run id, an own number's key and the bits of its value and uncertainties."""
    return digests(run_ids, floats, [(key,)] * len(run_ids))


def digests(run_ids: Sequence[int], floats: np.ndarray, texts: Sequence[Sequence[str | None]]) -> list[str]:
    """One digest a row over its run id, its texts and the bits of its floats (NaN is absence)."""
    block = np.ascontiguousarray(floats, dtype="<f8") + 0.0  # -0.0 and 0.0 are one value to a database
    block[np.isnan(block)] = np.nan  # one bit pattern for absence
    bits, width = block.tobytes(), block.itemsize * block.shape[1]
    result = []
    for i, (run_id, text) in enumerate(zip(run_ids, texts, strict=True)):
        told = "\x1f".join([str(run_id), *[t or "" for t in text]]).encode()
        result.append(hashlib.blake2b(bits[i * width : (i + 1) * width] + told, digest_size=16).hexdigest())
    return result
