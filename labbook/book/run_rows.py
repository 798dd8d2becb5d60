"""Runs written and derived again: the rows of `run` and of the stored view, always together."""

import json
from collections.abc import Callable, Iterator

import numpy as np
from sqlalchemy import Connection, bindparam, delete, select

from labbook.book.bulk import write_many
from labbook.book.derive import BATCH, Derived, derive
from labbook.book.run_facts import RunFacts, facts_from
from labbook.book.shelf import Shelf, document, read_shelf
from labbook.book.stored_view import COLUMNS, FLOAT_COLUMNS, SENTENCES, digests, resolved
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


def stored_rows(rows, facts: RunFacts, derived: Derived) -> tuple[tuple[str, ...], list[tuple]]:
    """(columns, rows) of the stored view of runs selected as FACTS; NaN where a value is absent.

    Columns that no run of a large batch has a value for are left out: a third of them is, as a rule.
    """
    ids = [r[0] for r in rows]
    said = [derived.sentences[k] for k in SENTENCES]
    texts = [
        (r[5], r[8], str(r[2]), str(r[3]), *(s[i] for s in said), derived.marks[i])
        for i, r in enumerate(rows)
    ]
    block = derived.floats
    told = digests(ids, block, [(*t, facts_text(r)) for t, r in zip(texts, rows, strict=True)])
    material = derived.material.tolist()
    present = ~np.isnan(block).all(axis=0) if len(rows) >= MANY else np.ones(block.shape[1], bool)
    columns = (*COLUMNS[: -len(FLOAT_COLUMNS)], *np.array(FLOAT_COLUMNS)[present].tolist())
    floats = block[:, present].tolist()
    return columns, [
        (r[0], r[5], r[8], r[2], r[3], material[i] or None, *texts[i][4:], told[i], *floats[i])
        for i, r in enumerate(rows)
    ]


def write_stored(connection: Connection, columns: tuple[str, ...], rows: list[tuple]) -> None:
    """Insert rows as stored_rows gives them; absence is NULL."""
    if connection.dialect.name != "sqlite":  # SQLite itself stores NaN as NULL
        rows = [tuple(None if cell != cell else cell for cell in row) for row in rows]
    write_many(connection, resolved, columns, rows)


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
    changed: list[tuple[int, str]] = []
    for rows in batches(connection, *where):
        facts = facts_of(rows)
        columns, fresh = stored_rows(rows, facts, derive(facts, shelf_for(connection, rows)))
        place = COLUMNS.index("digest")
        known = _digests_between(connection, rows[0][0], rows[-1][0])
        new = [(row, r) for row, r in zip(fresh, rows, strict=True) if known.get(r[0]) != row[place]]
        gone = [{"gone": r[0]} for _, r in new if r[0] in known]
        if gone:
            connection.execute(delete(resolved).where(resolved.c.run_id == bindparam("gone")), gone)
        write_stored(connection, columns, [row for row, _ in new])
        changed += [(r[0], r[1]) for _, r in new]
        if progress is not None:
            progress(len(rows))
    return changed


def _digests_between(connection, first, last) -> dict[int, str]:
    query = select(resolved.c.run_id, resolved.c.digest).where(resolved.c.run_id.between(first, last))
    return dict(connection.execute(query).all())
