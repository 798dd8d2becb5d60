"""Is the book as it should be: the ledger's chain, kept files, every stored row's digest, every number derived again."""

import json
from collections.abc import Callable

import numpy as np
from sqlalchemy import Engine, Text, cast, delete, func, select, text, update

from labbook.book import chain, stored_view
from labbook.book.derive import derive
from labbook.book.opening import reading, writing
from labbook.book.registry_rows import registry_of
from labbook.book.run_rows import batches, derive_again, facts_of, facts_text, shelf_for
from labbook.book.stored_view import (
    BIRTH_KEYS,
    COPIED,
    PREFIXES,
    SENTENCES,
    TOLD,
    digests,
    float_columns,
    own_columns,
    own_digests,
    resolved,
)
from labbook.book.tables import SHELF, book, run
from labbook.book.tables import reading as reading_table
from labbook.book.track_checking import tracks_wrong

# exp and log differ in the last bits between machines
SAME = 1e-9


def check(engine: Engine, progress: Callable[[int], None] = lambda n: None) -> list[str]:
    """Everything that is wrong with a book, one sentence each; an empty list is a clean book."""
    found = []
    with reading(engine) as connection:
        if engine.dialect.name == "sqlite":
            for line in connection.execute(text("PRAGMA integrity_check")).scalars():
                if line != "ok":
                    found.append(f"file: {line}")
            for row in connection.execute(text("PRAGMA foreign_key_check")).all():
                found.append(f"{row[0]} row {row[1]} refers to a record of {row[2]} that is not there")
        broken = chain.first_broken(connection)
        if broken is None:
            found += chain.runs_missing(connection)
        else:
            found.append(f"ledger line {broken} was changed or removed after it was written")
        unreadable = _malformed(connection)
        found += unreadable
        if unreadable:
            return found  # what cannot be read cannot be derived again
        found += tracks_wrong(connection)
        registry = registry_of(connection)
        if not stored_view.built(connection, tuple(registry.own)):
            found.append("the stored view does not have the registry's columns: open the book to rebuild it")
            return found
        runs = connection.scalar(select(func.count()).select_from(run))
        rows = connection.scalar(select(func.count()).select_from(resolved))
        if rows > runs:
            found.append(f"the stored view has {rows} rows for {runs} runs")
        for batch in batches(connection):
            found += _batch(connection, batch, registry)
            progress(len(batch))
    return found


def _malformed(connection) -> list[str]:
    """Records whose typed quantities cannot be read, with their codes."""
    found = []
    for table in (*SHELF.values(), reading_table, run):
        for code, stored in connection.execute(select(table.c.code, cast(table.c.typed, Text))):
            if not _whole(stored):
                found.append(f"{table.name} {code}: what was typed was changed by hand and cannot be read")
    return found


def _whole(stored) -> bool:
    try:
        typed = json.loads(stored) if isinstance(stored, str) else stored
        return all(
            len(entry) == 5 and all(isinstance(x, int | float) for x in entry[2:4]) for entry in typed.values()
        )
    except (ValueError, TypeError, AttributeError):
        return False


def _batch(connection, rows, registry) -> list[str]:
    view = stored_view.table_of(tuple(registry.own))
    floats_at = [view.c[c] for c in float_columns(registry.keys)]
    told_at = [*(view.c[c] for c in TOLD), *(view.c[own_columns(key)[-1]] for key in registry.own)]
    stored = connection.execute(
        select(*told_at, *floats_at).where(view.c.run_id.between(rows[0][0], rows[-1][0]))
    ).fetchall()
    by_id = {r[0]: r for r in stored}
    derived = derive(facts_of(rows), shelf_for(connection, rows), registry)
    have = [by_id.get(r[0]) for r in rows]
    found = [f"{r[1]}: has no stored numbers" for r, h in zip(rows, have, strict=True) if h is None]
    held = [(i, h) for i, h in enumerate(have) if h is not None]
    if not held:
        return found
    floats = _floats([h[len(told_at) :] for _, h in held])
    changed = _changed(rows, held, floats, registry)
    fresh = derived.floats[[i for i, _ in held]]
    differs = ~(np.isclose(floats, fresh, rtol=SAME, atol=0.0) | (np.isnan(floats) & np.isnan(fresh)))
    for j, (i, row) in enumerate(held):
        code = rows[i][1]
        said = tuple(derived.sentences[s][i] for s in SENTENCES)
        if changed[j]:
            where = f" ({_frame_name(int(differs[j].argmax()), registry)})" if differs[j].any() else ""
            found.append(f"{code}: a stored number or what was typed was changed by hand{where}")
        elif differs[j].any():
            name = _frame_name(int(differs[j].argmax()), registry)
            found.append(f"{code}: {name} is stale, deriving it again differs")
        elif tuple(row[1:6]) != (*(rows[i][n] for n in (5, 8, 2, 3)), int(derived.material[i]) or None):
            found.append(f"{code}: the stored view holds another time, state, swimmer, fluid or material than the run")
        elif tuple(row[1 + len(COPIED) : 1 + len(COPIED) + len(SENTENCES)]) != said:
            found.append(f"{code}: what it was resolved from is stale")
        elif row[TOLD.index("marks")] != derived.marks[i]:
            found.append(f"{code}: its marks are stale")
    return found


def _changed(rows, held, floats, registry) -> list[bool]:
    """Whether a stored row's digests, its own numbers' included, differ from what they are digests of."""
    ids = [h[0] for _, h in held]
    birth = len(float_columns(BIRTH_KEYS))
    texts = [(*_told(h), facts_text(rows[i])) for i, h in held]
    columns = [digests(ids, floats[:, :birth], texts)]
    for n, key in enumerate(registry.own):
        columns.append(own_digests(ids, key, floats[:, birth + 3 * n : birth + 3 * n + 3]))
    stored = [(h[TOLD.index("digest")], *h[len(TOLD) : len(TOLD) + len(registry.own)]) for _, h in held]
    return [told != was for told, was in zip(zip(*columns, strict=True), stored, strict=True)]


def _floats(rows) -> np.ndarray:
    try:
        return np.array(rows, dtype=float)
    except (TypeError, ValueError):  # SQLite keeps a text that was put there by hand
        return np.array([[v if isinstance(v, int | float) else np.nan for v in row] for row in rows], dtype=float)


def _told(row) -> tuple:
    """The texts that a stored row's digest covers, from the row itself."""
    sentences = row[1 + len(COPIED) : 1 + len(COPIED) + len(SENTENCES)]
    marks = row[TOLD.index("marks")]
    return (row[1], row[2], str(row[3]), str(row[4]), *sentences, marks)


def _frame_name(column: int, registry) -> str:
    return PREFIXES[column % 3] + registry.keys[column // 3]


def out_of_date(engine: Engine) -> bool:
    """Whether the stored view was built from another registry than the book's present one."""
    with reading(engine) as connection:
        registry = registry_of(connection)
        stands = stored_view.built(connection, tuple(registry.own))
        return not stands or connection.scalar(select(book.c.registry)) != registry.fingerprint


def rebuild(engine: Engine, by: str, why: str, progress: Callable[[int], None] = lambda n: None) -> int:
    """Make the stored view anew from facts and registry, in one transaction; returns the number of runs."""
    with writing(engine) as connection:
        registry = registry_of(connection)
        if stored_view.built(connection, tuple(registry.own)):
            connection.execute(delete(resolved))
        else:
            stored_view.build(connection, tuple(registry.own))
        changed = derive_again(connection, progress=progress)
        connection.execute(update(book).values(registry=registry.fingerprint))
        chain.append(connection, by, "rebuild", "view", "stored view", after={"runs": len(changed)}, why=why)
    return len(changed)
