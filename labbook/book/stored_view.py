"""The wide stored view: one row a run, per key a value, u_own and u_shared, built from the registry at any time."""

import hashlib
import json
from collections.abc import Sequence

import numpy as np
from sqlalchemy import Column, Connection, Float, ForeignKey, Index, Integer, MetaData, String, Table, Text
from sqlalchemy import inspect as inspect_database

from labbook.book.tables import metadata as facts
from labbook.registry.catalogue import NUMBERS
from labbook.registry.quantities import QUANTITIES, RESOLVED_KEYS
from labbook.registry.regimes import REGIMES

VIEW_NAME = "resolved"

KEYS: tuple[str, ...] = RESOLVED_KEYS + tuple(NUMBERS)


def column_of(key: str) -> str:
    """The column of a key: SQL names are blind to case, so T beside t needs another name."""
    return f"{key}_cap" if len(key) == 1 and key.isupper() else key


# the frame's names and the table's, in one order: value, u_own_, u_shared_ of each key
FRAME_COLUMNS: tuple[str, ...] = tuple(p + k for k in KEYS for p in ("", "u_own_", "u_shared_"))
FLOAT_COLUMNS: tuple[str, ...] = tuple(p + column_of(k) for k in KEYS for p in ("", "u_own_", "u_shared_"))
# copied from the run so that one covering index answers a query
COPIED = ("at", "state", "swimmer_id", "fluid_id", "material_id")
SENTENCES = ("mu_from", "rho_from", "lam_from", "E_from")
COLUMNS: tuple[str, ...] = ("run_id", *COPIED, *SENTENCES, "marks", "digest", *FLOAT_COLUMNS)


def registry_fingerprint() -> str:
    """Digest of everything that the stored numbers follow from: keys, formulas and bands."""
    told = [[k, q.unit, q.formula] for k, q in QUANTITIES.items()]
    told += [[k, n.formula, n.not_zero, list(n.only_drives)] for k, n in NUMBERS.items()]
    told += [[r.name, r.number, r.low, r.high] for r in REGIMES.values()]
    return hashlib.sha256(json.dumps(told).encode()).hexdigest()


def _table() -> Table:
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
        *(Column(name, Float(53)) for name in FLOAT_COLUMNS),
    )
    # three covering indexes: the regime query, the plot of any swimmer, and the span of Re
    Index("ix_resolved_regimes", table.c.state, table.c.at, table.c.run_id, table.c.Re_omega, table.c.Sp,
          table.c.St)
    Index("ix_resolved_plot", table.c.swimmer_id, table.c.state, table.c.Sp, table.c.U_cap, table.c.stride,
          table.c.U_scaled, table.c.fluid_id)
    # the state comes last, or SQLite would at times take this index for the plot's query
    Index("ix_resolved_Re", table.c.swimmer_id, table.c.Re, table.c.state)
    return table


resolved = _table()


def build(connection: Connection) -> None:
    """Drop the stored view and make it again, empty, with the registry's columns."""
    resolved.drop(connection, checkfirst=True)
    resolved.create(connection)


def built(connection: Connection) -> bool:
    """Whether the view stands with exactly the registry's columns."""
    inspector = inspect_database(connection)
    if not inspector.has_table(VIEW_NAME):
        return False
    return {c["name"] for c in inspector.get_columns(VIEW_NAME)} == set(COLUMNS)


def digests(run_ids: Sequence[int], floats: np.ndarray, texts: Sequence[Sequence[str | None]]) -> list[str]:
    """One digest a row over its run id, its texts and the bits of its floats (NaN is absence)."""
    block = np.ascontiguousarray(floats, dtype="<f8") + 0.0  # -0.0 and 0.0 are one value to a database
    block[np.isnan(block)] = np.nan  # one bit pattern for absence
    result = []
    for run_id, row, text in zip(run_ids, block, texts, strict=True):
        told = hashlib.blake2b(row.tobytes(), digest_size=16)
        told.update("\x1f".join([str(run_id), *(t or "" for t in text)]).encode())
        result.append(told.hexdigest())
    return result
