"""Runs written and derived again: the rows of `run` and of the stored view, always together."""

import json
from collections.abc import Callable, Iterator
from typing import NamedTuple

import numpy as np
from sqlalchemy import Connection, bindparam, delete, select

from labbook.book.bulk import write_many
from labbook.book.derive import BATCH, Derived, derive
from labbook.book.registry_rows import registry_of
from labbook.book.run_facts import RunFacts, facts_from
from labbook.book.shelf import Shelf, document, read_shelf
from labbook.book.stored_view import (
    BIRTH_KEYS,
    SENTENCES,
    TOLD,
    digests,
    float_columns,
    own_columns,
    own_digests,
    resolved,
    table_of,
)
from labbook.book.tables import run

FACTS = (run.c.id, run.c.code, run.c.swimmer_id, run.c.fluid_id, run.c.rig_id, run.c.at, run.c.drive,
         run.c.typed, run.c.state, run.c.by, run.c.series, run.c.video, run.c.note, run.c.why)  # fmt: skip
MANY = 500  # rows from which leaving empty columns out pays for another statement
TYPED_TEXT = len(FACTS)  # a row that is being logged carries its typed quantities in JSON here


def facts_of(rows) -> RunFacts:
    """The columns of facts of some rows selected as FACTS."""
    return facts_from([(r[2], r[3], r[4], r[5], r[6], document(r[7])) for r in rows])


def shelf_for(connection: Connection, rows) -> Shelf:
    """The part of the shelf that rows selected as FACTS refer to."""
    return read_shelf(
        connection,
        swimmers={r[2] for r in rows},
        fluids={r[3] for r in rows},
        rigs={r[4] for r in rows if r[4]},
    )


def facts_text(row) -> str:
    """What was typed on a run selected as FACTS, as one text: the stored row's digest covers it too."""
    typed = row[TYPED_TEXT] if len(row) > TYPED_TEXT else json.dumps(document(row[7]), ensure_ascii=False)
    return "\x1e".join([typed, *(cell or "" for cell in row[9:TYPED_TEXT])])


class StoredRows(NamedTuple):
    """Rows for the stored view: the view's own numbers, the columns given, a tuple a run."""

    own: tuple[str, ...]
    columns: tuple[str, ...]
    rows: list[tuple]


def stored_rows(rows, derived: Derived) -> StoredRows:
    """The stored view's rows of runs selected as FACTS; NaN where a value is absent.

    Columns that no run of a large batch has a value for are left out: a third of them is, as a rule.
    """
    facts = list(zip(*rows, strict=True))
    ids, swimmers, fluids, at, state = (facts[i] for i in (0, 2, 3, 5, 8))
    said = [*(derived.sentences[k] for k in SENTENCES), derived.marks]
    birth = float_columns(BIRTH_KEYS)
    block = derived.floats[:, : len(birth)]
    typed = [facts_text(row) for row in rows]
    told = digests(ids, block, zip(at, state, map(str, swimmers), map(str, fluids), *said, typed, strict=True))
    material = [i or None for i in derived.material.tolist()]
    present = ~np.isnan(block).all(axis=0) if len(rows) >= MANY else np.ones(block.shape[1], bool)
    columns = (*TOLD, *np.array(birth)[present].tolist())
    heads = zip(ids, at, state, swimmers, fluids, material, *said, told, strict=True)
    written = [(*head, *floats) for head, floats in zip(heads, block[:, present].tolist(), strict=True)]
    for key in derived.own:
        columns += own_columns(key)
        more = own_cells(ids, derived, key)
        written = [(*row, *cells) for row, cells in zip(written, more, strict=True)]
    return StoredRows(derived.own, columns, written)


def own_cells(ids, derived: Derived, key: str) -> list[tuple]:
    """What a group's own number has in the stored view, a tuple a run: value, own, shared, digest."""
    three = derived.of(key)
    told = own_digests(ids, key, three)
    return [(*cells, digest) for cells, digest in zip(three.tolist(), told, strict=True)]


def write_stored(connection: Connection, own: tuple[str, ...], columns: tuple[str, ...], rows: list[tuple]) -> None:
    """Insert rows as stored_rows gives them; absence is NULL."""
    write_many(connection, table_of(own), columns, with_nulls(connection, rows))


def with_nulls(connection: Connection, rows: list[tuple]) -> list[tuple]:
    """The rows with None for NaN, where the database would not do so itself."""
    if connection.dialect.name == "sqlite":
        return rows
    return [tuple(None if cell != cell else cell for cell in row) for row in rows]


def batches(connection: Connection, *where) -> Iterator[list]:
    """The runs that meet the conditions, selected as FACTS, oldest first, a batch at a time."""
    last = 0
    while True:
        query = select(*FACTS).where(run.c.id > last, *where).order_by(run.c.id).limit(BATCH)
        rows = connection.execute(query).fetchall()
        if not rows:
            return
        last = rows[-1][0]
        yield rows


def derive_again(
    connection: Connection, *where, progress: Callable[[int], None] | None = None
) -> list[tuple[int, str]]:
    """Derive the runs that meet the conditions; write those whose stored row changes and return them."""
    registry = registry_of(connection)
    changed: list[tuple[int, str]] = []
    for rows in batches(connection, *where):
        own, columns, fresh = stored_rows(rows, derive(facts_of(rows), shelf_for(connection, rows), registry))
        places = [i for i, c in enumerate(columns) if c in _digest_columns(own)]
        known = _digests_between(connection, own, rows[0][0], rows[-1][0])
        new = [
            (row, r) for row, r in zip(fresh, rows, strict=True)
            if known.get(r[0]) != tuple(row[i] for i in places)
        ]  # fmt: skip
        gone = [{"gone": r[0]} for _, r in new if r[0] in known]
        if gone:
            connection.execute(delete(resolved).where(resolved.c.run_id == bindparam("gone")), gone)
        write_stored(connection, own, columns, [row for row, _ in new])
        changed += [(r[0], r[1]) for _, r in new]
        if progress is not None:
            progress(len(rows))
    return changed


def _digest_columns(own: tuple[str, ...]) -> tuple[str, ...]:
    return ("digest", *(own_columns(key)[-1] for key in own))


def _digests_between(connection, own, first, last) -> dict[int, tuple]:
    view = table_of(own)
    query = select(view.c.run_id, *(view.c[c] for c in _digest_columns(own)))
    return {r[0]: tuple(r[1:]) for r in connection.execute(query.where(view.c.run_id.between(first, last)))}
