"""What the book answers: frames of runs, counts by regime, the shelf and the ledger as tables."""

import json
from collections.abc import Iterable, Sequence

import numpy as np
import pandas as pd
from dateutil.tz import tzlocal
from sqlalchemy import Connection, case, func, select

from labbook.book.asking import Question, check_key, holds
from labbook.book.block_spread import section_of
from labbook.book.dialect_columns import Dialects, house_in_words, restated_frame
from labbook.book.registry_rows import registry_of
from labbook.book.shelf import document, item_of
from labbook.book.stored_view import SENTENCES, resolved, view_column
from labbook.book.tables import SHELF, fluid, ledger, ledger_run, material, reading, rig, run, swimmer
from labbook.errors import Refusal

# text columns of a frame of runs -> where they come from
RUN_TEXTS = ("code", "at", "by", "swimmer", "fluid", "material", "rig", "drive", "series", "video", "state",
             "why", "note")  # fmt: skip
_FROM_RUN = {c: run.c[c] for c in ("code", "by", "drive", "series", "video", "why", "note", "confirmed", "typed")}
_FROM_VIEW = {"at": resolved.c.at, "state": resolved.c.state, "marks": resolved.c.marks,
              "run_id": resolved.c.run_id, **{s: resolved.c[s] for s in SENTENCES}}  # fmt: skip
_BY_ID = {"swimmer": (resolved.c.swimmer_id, swimmer.c.code), "fluid": (resolved.c.fluid_id, fluid.c.code),
          "material": (resolved.c.material_id, material.c.code), "rig": (run.c.rig_id, rig.c.code),
          "form": (resolved.c.swimmer_id, swimmer.c.form)}  # fmt: skip


def frame(
    connection: Connection,
    question: Question,
    *,
    keys: Sequence[str] | None = None,
    texts: Sequence[str] = RUN_TEXTS,
    spread: bool = True,
    newest: int | None = None,
    dialects: Dialects | None = None,
) -> pd.DataFrame:
    """One row a run: text columns, then per key the SI value, u_, u_own_ and u_shared_ (if `spread`).

    keys: all of the book's where left out. Oldest first; with `newest`, only that many of the newest, newest first. NaN is absent.
    dialects: number -> choices: its columns are restated, and attrs['dialects'] says so; what is asked for is
    always read in the house dialect. attrs['units'] maps key to SI unit.
    """
    registry = registry_of(connection)
    keys = registry.keys if keys is None else keys
    for key in keys:
        check_key(key, registry)
    text_columns = [_column(name) for name in texts]
    if dialects:
        text_columns.append(resolved.c.swimmer_id)
    prefixes = ("", "u_own_", "u_shared_") if spread else ("",)
    floats = [view_column(k, p) for k in keys for p in prefixes]
    needs_run = question.needs_run() or any(n in _FROM_RUN or n == "rig" for n in texts)
    source = resolved.join(run, run.c.id == resolved.c.run_id) if needs_run else resolved
    query = select(*text_columns, *floats).select_from(source).where(*question.conditions(registry))
    if newest is not None:
        query = query.order_by(resolved.c.at.desc(), resolved.c.run_id.desc()).limit(newest)
    rows = _fetch(connection, query)
    if newest is None and len(texts) and rows and "at" in texts:
        at = list(texts).index("at")
        rows.sort(key=lambda r: r[at])
    ids = np.array([r[len(texts)] for r in rows], dtype=np.int64) if dialects else None
    table = _table(connection, rows, texts, keys, prefixes, len(text_columns))
    table.attrs["units"] = {k: registry.unit(k) for k in keys}
    table.attrs["dialects"] = house_in_words(registry, keys)
    return table if ids is None else restated_frame(connection, registry, table, ids, dialects)


def _column(name: str):
    if name in _BY_ID:
        return _BY_ID[name][0]
    return _FROM_RUN[name] if name in _FROM_RUN else _FROM_VIEW[name]


def _fetch(connection: Connection, query) -> list[tuple]:
    """Rows straight from the driver: a Row object each would cost more than the query."""
    compiled = query.compile(dialect=connection.dialect, compile_kwargs={"render_postcompile": True})
    parameters = compiled.params
    if compiled.positional:
        parameters = tuple(compiled.params[name] for name in compiled.positiontup)
    return connection.exec_driver_sql(str(compiled), parameters).cursor.fetchall()


def _table(connection, rows, texts, keys, prefixes, first_float: int) -> pd.DataFrame:
    width = len(prefixes)
    columns: dict[str, object] = {}
    lists = list(zip(*rows, strict=True)) if rows else [()] * (first_float + width * len(keys))
    for name, values in zip(texts, lists[: len(texts)], strict=True):
        # object, or pandas would turn an absent text into NaN beside one that is there
        columns[name] = pd.Series(_text_column(connection, name, values), dtype=None if name == "at" else object)
    for i, key in enumerate(keys):
        first = first_float + width * i
        numbers = [np.array(values, dtype=float) for values in lists[first : first + width]]
        columns[key] = numbers[0]
        if width == 3:
            columns[f"u_{key}"] = np.hypot(numbers[1], numbers[2])
            columns[f"u_own_{key}"], columns[f"u_shared_{key}"] = numbers[1], numbers[2]
    return pd.DataFrame(columns)


def _text_column(connection, name, values):
    if name in _BY_ID:
        told = _BY_ID[name][1]
        codes = dict(connection.execute(select(told.table.c.id, told)).all())
        ids = np.array([v or 0 for v in values], dtype=np.int64)
        unique, which = np.unique(ids, return_inverse=True)
        named = np.array([codes.get(int(i)) for i in unique], dtype=object)
        return named[which] if len(ids) else ids.astype(object)
    if name == "at":
        return pd.to_datetime(pd.Series(values, dtype=object), utc=True).dt.tz_convert(tzlocal())
    if name == "typed":
        return [document(v) for v in values]
    return np.array(values, dtype=object)


def refuse_unknown(connection: Connection, question: Question) -> None:
    """Refusal where a question names a fluid, swimmer or material that the shelf does not hold."""
    for name, codes in (("fluid", question.fluids), ("swimmer", question.swimmers), ("material", question.materials)):
        table = SHELF[name]
        known = set(connection.scalars(select(table.c.code).where(table.c.code.in_(codes)))) if codes else set()
        for code in codes:
            if code not in known:
                some = connection.scalars(select(table.c.code).order_by(table.c.id.desc()).limit(8)).all()
                raise Refusal(name, code, f"no {name} has this code", f"the book has {', '.join(some)}" if some else "")


def count(connection: Connection, question: Question) -> int:
    """How many runs the question finds."""
    conditions = question.conditions(registry_of(connection))
    return connection.scalar(_from(question, func.count()).where(*conditions))


def regime_counts(connection: Connection, question: Question) -> dict[str, int]:
    """For each regime, how many of the question's runs (its own regimes left aside) lie in it."""
    registry = registry_of(connection)
    sums = [func.sum(case((holds(r), 1), else_=0)).label(f"n{i}") for i, r in enumerate(registry.regimes.values())]
    if not sums:
        return {}
    row = connection.execute(_from(question, *sums).where(*question.conditions(registry, regimes=False))).one()
    return {name: int(n or 0) for name, n in zip(registry.regimes, row, strict=True)}


def key_counts(connection: Connection, keys: Iterable[str] | None = None) -> dict[str, int]:
    """For each key (all of the book's where none are named), how many kept runs have it."""
    registry = registry_of(connection)
    keys = [check_key(k, registry) for k in (registry.keys if keys is None else keys)]
    counts = [func.count(view_column(k)).label(f"n{i}") for i, k in enumerate(keys)]
    row = connection.execute(select(*counts).select_from(resolved).where(resolved.c.state == "kept")).one()
    return dict(zip(keys, row, strict=True))


def _from(question: Question, *what):
    query = select(*what).select_from(resolved)
    if question.needs_run():
        query = query.join(run, run.c.id == resolved.c.run_id)
    return query


def shelf_table(connection: Connection, name: str) -> pd.DataFrame:
    """Fluids, materials, swimmers or rigs: code, text columns, `typed` documents, how many runs, newest first."""
    table = SHELF[name]
    rows = connection.execute(select(table).order_by(table.c.retired, table.c.id.desc())).mappings().all()
    frame_ = pd.DataFrame([{**r, "typed": document(r["typed"])} for r in rows], columns=list(table.c.keys()), dtype=object)
    column = {"fluid": run.c.fluid_id, "swimmer": run.c.swimmer_id, "rig": run.c.rig_id}.get(name)
    if column is not None:
        used = dict(connection.execute(select(column, func.count()).group_by(column)).all())
        frame_["runs"] = [used.get(i, 0) for i in frame_["id"]]
    return frame_


def readings_table(connection: Connection, *, fluid_id=None, material_id=None) -> pd.DataFrame:
    """The readings of one batch, newest date first, void ones included."""
    where = reading.c.fluid_id == fluid_id if fluid_id is not None else reading.c.material_id == material_id
    query = select(reading).where(where).order_by(reading.c.on.desc(), reading.c.id)
    rows = connection.execute(query).mappings().all()
    return pd.DataFrame([{**r, "typed": document(r["typed"])} for r in rows], columns=list(reading.c.keys()), dtype=object)


def recent(connection: Connection, name: str, by: str | None = None) -> list[str]:
    """Codes of a kind that are in use, those of the latest runs first, retired ones left out."""
    table = SHELF[name]
    codes = dict(
        connection.execute(
            select(table.c.id, table.c.code).where(table.c.retired.is_(False)).order_by(table.c.id.desc())
        ).all()
    )  # fmt: skip
    column = run.c[f"{name}_id"]
    query = select(column).order_by(run.c.id.desc()).limit(300)
    if by is not None:
        query = query.where(run.c.by == by)
    used = [i for i in dict.fromkeys(connection.scalars(query)) if i in codes]
    return [codes[i] for i in dict.fromkeys([*used, *codes])]


def people(connection: Connection) -> list[str]:
    """Every handle that logged a run."""
    return list(connection.scalars(select(run.c.by).distinct().order_by(run.c.by)))


def series_labels(connection: Connection) -> list[str]:
    """Every series label."""
    return list(connection.scalars(select(run.c.series).where(run.c.series.is_not(None)).distinct().order_by(run.c.series)))


def choices(connection: Connection) -> dict[str, list[str]]:
    """What a question may name: fluids, swimmers and materials (retired ones last), people, series labels."""
    found = {}
    for name in ("fluid", "swimmer", "material"):
        table = SHELF[name]
        found[name] = list(connection.scalars(select(table.c.code).order_by(table.c.retired, table.c.id.desc())))
    return found | {"person": people(connection), "series": series_labels(connection)}


def swimmer_shape(connection: Connection, code: str) -> dict:
    """A swimmer as charts.drawings takes it: form, section, and its typed sizes in SI."""
    row = connection.execute(select(swimmer).where(swimmer.c.code == code)).mappings().one_or_none()
    if row is None:
        raise Refusal("swimmer", code, "the book has no such swimmer")
    item = item_of(row)
    return {"form": row["form"], "section": section_of(item), **{k: item.value(k) for k in item.typed}}


def ledger_lines(
    connection: Connection, *, by: str | None = None, act: str | None = None, code: str | None = None,
    newest: int = 200,
) -> pd.DataFrame:  # fmt: skip
    """Ledger lines, newest first; `code` of a run finds those that wrote it or derived it again."""
    query = select(ledger).order_by(ledger.c.id.desc()).limit(newest)
    if by:
        query = query.where(ledger.c.by == by)
    if act:
        query = query.where(ledger.c.act == act)
    if code:
        touched = select(ledger_run.c.ledger_id).join(run, run.c.id == ledger_run.c.run_id).where(run.c.code == code)
        query = query.where((ledger.c.subject == code) | ledger.c.id.in_(touched))
    rows = [dict(r) for r in connection.execute(query).mappings()]
    for row in rows:
        for side in ("before", "after"):
            row[side] = json.loads(row[side]) if row[side] else {}
    return pd.DataFrame(rows, columns=list(ledger.c.keys()), dtype=object)


def head(connection: Connection) -> str:
    """Digest of the newest ledger line: it changes with every act."""
    return connection.scalar(select(ledger.c.digest).order_by(ledger.c.id.desc()).limit(1)) or ""
