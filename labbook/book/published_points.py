"""Points that others printed: added, loaded, withdrawn, and drawn restated beside the group's runs."""

from collections.abc import Callable, Sequence

import numpy as np
import pandas as pd
from sqlalchemy import Connection, Engine, func, insert, select, update

from labbook.book import chain
from labbook.book.arrivals import Findings
from labbook.book.dialect_columns import Dialects, away
from labbook.book.dialect_grid import reason_lost
from labbook.book.drafts import Draft, read_draft, whole
from labbook.book.ledger import handle, reason, settle
from labbook.book.opening import writing
from labbook.book.records import KINDS
from labbook.book.registry_rows import registry_of
from labbook.book.shelf import document
from labbook.book.tables import published
from labbook.errors import Refusal
from labbook.registry.dialects import AT_BIRTH, Choices, completed, read_choices
from labbook.registry.group import Registry
from labbook.registry.restating import restate
from labbook.registry.swimmer_share import DIMENSIONS

AXES = ("x", "y")


def add_point(engine: Engine, cells, by: str, *, confirm: bool = False) -> str:
    """Add one published point from cells as typed; returns its series. The same point again adds nothing."""
    by = handle(by)
    draft = whole(read_draft("published", cells))
    with writing(engine) as connection:
        findings = Findings()
        added = put_points(connection, [(draft, "")], findings)
        settle(findings, confirm)
        if added:
            chain.append(connection, by, "add", "published", draft.texts["series"], after=draft.content())
    return draft.texts["series"]


def put_points(connection: Connection, drafts: Sequence[tuple[Draft, str]], findings: Findings) -> int:
    """Insert the points that the book does not hold; returns how many. Each comes with where it stands."""
    registry = registry_of(connection)
    known = set(connection.scalars(select(published.c.sheet_row)))
    next_id = (connection.scalar(select(func.max(published.c.id))) or 0) + 1
    citations = dict(connection.execute(select(published.c.series, published.c.citation)).all())
    added = 0
    for draft, where in drafts:
        texts, mark = draft.texts, draft.fingerprint()
        if not set(KINDS["published"].required) <= {*texts, *draft.typed}:
            continue  # refused when the sheet was read
        findings.warned += [(c, f"{where}, {s}" if where else s) for c, s in draft.warned]
        try:
            _understood(draft, registry)
            if citations.setdefault(texts["series"], texts["citation"]) != texts["citation"]:
                raise Refusal("citation", texts["citation"][:60], f"series {texts['series']} cites "
                              f"{citations[texts['series']]!r}", "one series, one citation")  # fmt: skip
        except Refusal as refusal:
            findings.refuse(where, refusal)
            continue
        if mark in known or findings.refused:
            continue
        known.add(mark)
        columns = {
            c: texts.get(c) for c in ("series", "citation", "x", "x_dialect", "y", "y_dialect", "note")
        }
        connection.execute(
            insert(published).values(
                id=next_id + added, typed=draft.document(), state="kept", sheet_row=mark, **columns
            )
        )
        added += 1
    return added


def _understood(draft: Draft, registry: Registry) -> None:
    """Refusal, at its column, where an axis names no number, or its dialect or value cannot be."""
    for axis in AXES:
        number, text = draft.texts[axis], draft.texts.get(f"{axis}_dialect", "")
        _at(axis, lambda number=number: registry.number(number))
        _at(f"{axis}_dialect", lambda number=number, text=text: choices_of(number, text))
        value = draft.typed[f"{axis}_value"]
        if value.value < 0 and number not in registry.own and not registry.number(number).signed:
            raise Refusal(f"{axis}_value", value.text, f"{number} is never negative")
    if draft.texts["x"] == draft.texts["y"]:
        raise Refusal("y", draft.texts["y"], "is the number of x already", "name another")


def _at(column: str, check: Callable[[], object]) -> None:
    """A check whose refusal stands at a column."""
    try:
        check()
    except Refusal as found:
        raise Refusal(column, found.typed, found.reason, found.remedy) from None


def choices_of(number: str, text: str | None) -> dict[str, object]:
    """The dialect a point was printed in, from 'rate:f,power:1'; what is left out is the one at birth."""
    text = (text or "").strip()
    if number not in AT_BIRTH:
        if text:
            raise Refusal("dialect", text, f"{number} has no dialects", "leave it empty")
        return {}
    if text == "house":  # a group's house dialect may change, what is printed does not
        remedy = "name the choices, e.g. rate:f, or leave it empty for labbook's own definition"
        raise Refusal("dialect", text, "is the group's choice and no dialect of a print", remedy)
    return completed(number, read_choices(f"{number}={text or 'house'}")[1])


def withdraw_series(engine: Engine, series: str, why: str, by: str) -> int:
    """Mark every point of a series void, with a reason; returns how many there were."""
    by, why = handle(by), reason(why)
    with writing(engine) as connection:
        mine = (published.c.series == series, published.c.state == "kept")
        count = connection.scalar(select(func.count()).where(*mine))
        if not count:
            known = ", ".join(all_series(connection)) or "none so far"
            raise Refusal("series", series, "the book has no such published series", f"it has {known}")
        # withdrawn points may be loaded again: their marks go
        connection.execute(update(published).where(*mine).values(state="void", why=why, sheet_row=None))
        chain.append(connection, by, "void", "published", series, before={"points": count}, why=why)
    return count


def all_series(connection: Connection) -> dict[str, str]:
    """Series -> citation of the published points in use."""
    query = select(published.c.series, published.c.citation).where(published.c.state == "kept")
    return dict(connection.execute(query.order_by(published.c.series)).all())


def series_table(connection: Connection) -> list[dict]:
    """One row a series and pair of numbers: series, citation, x, y, points in use."""
    row = published.c
    keys = (row.series, row.citation, row.x, row.y)
    query = (
        select(*keys, func.count().label("points")).where(row.state == "kept").group_by(*keys).order_by(*keys)
    )
    return [dict(r) for r in connection.execute(query).mappings()]


def points(
    connection: Connection, x: str, y: str, dialects: Dialects | None = None, series: str | None = None
) -> pd.DataFrame:  # fmt: skip
    """The published points for a plot of y against x: series, citation, note, and by key x, y, u_x, u_y.

    Each is restated from the dialect it was printed in to the one asked for (left out: the group's house),
    with its own u; that of the lengths given beside it is left out, as it may be in the print already.
    printed_<key> and dialect_<key>: texts as printed. series: one of them alone.
    attrs['lost']: {reason: points} for those that have no value there.
    """
    registry = registry_of(connection)
    pairs = ((published.c.x == x) & (published.c.y == y)) | ((published.c.x == y) & (published.c.y == x))
    query = (
        select(published)
        .where(pairs, published.c.state == "kept")
        .order_by(published.c.series, published.c.id)
    )
    if series is not None:
        query = query.where(published.c.series == series)
    rows = connection.execute(query).mappings().all()
    told = [document(row["typed"]) for row in rows]
    inputs = {k: np.array([t[k][2] if k in t else np.nan for t in told]) for k in DIMENSIONS}
    spoken = away(registry, dialects)
    table = {name: [row[name] for row in rows] for name in ("series", "citation")}
    missing: list[str] = [""] * len(rows)
    for key in (x, y):
        axes = ["x" if row["x"] == key else "y" for row in rows]
        printed = [
            (*t[f"{a}_value"][2:4], row[f"{a}_dialect"] or "")
            for t, a, row in zip(told, axes, rows, strict=True)
        ]
        table[key], table[f"u_{key}"], why = _restated(
            key, printed, spoken.get(key, registry.choices(key)), inputs
        )
        table[f"printed_{key}"] = [t[f"{a}_value"][0] for t, a in zip(told, axes, strict=True)]
        table[f"dialect_{key}"] = [p[2] for p in printed]
        missing = [m or w for m, w in zip(missing, why, strict=True)]
    found = pd.DataFrame(table | {"note": [row["note"] or "" for row in rows]})
    found = found[np.array([not m for m in missing], dtype=bool)].reset_index(drop=True)
    found.attrs["lost"] = {m: missing.count(m) for m in dict.fromkeys(missing) if m}
    return found


def _restated(key: str, printed, wanted: Choices, inputs) -> tuple[np.ndarray, np.ndarray, list[str]]:
    """Values, u and, '' where there is a value, why there is none, of one coordinate of some points.

    printed: value, u and dialect of each; wanted: every choice of the number, {} where it has none.
    """
    value, u = (np.array([p[i] for p in printed], dtype=float) for i in (0, 1))
    why = [""] * len(printed)
    if not wanted:
        return value, u, why
    spoken = np.array([p[2] for p in printed], dtype=object)
    for text in dict.fromkeys(spoken):
        here = np.flatnonzero(spoken == text)
        dims = {k: column[here] for k, column in inputs.items()}
        told = restate(
            key, value[here], u[here], None, choices=wanted, house=choices_of(key, text), inputs=dims
        )
        for j, i in enumerate(here):
            if not np.isfinite(told.value[j]):
                # a power has no place for zero or less
                why[i] = reason_lost(
                    key, (told.why is not None and told.why[j]) or f"printed as {value[i]:g}"
                )
        value[here], u[here] = told.value, told.u_own
    return value, u, why
