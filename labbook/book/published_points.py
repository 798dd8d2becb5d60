"""Points that others printed: added, loaded, withdrawn, and drawn restated beside the group's runs."""

from collections.abc import Sequence

import numpy as np
import pandas as pd
from sqlalchemy import Connection, Engine, func, insert, select, update

from labbook.book import chain
from labbook.book.arrivals import Findings
from labbook.book.dialect_columns import Dialects, away
from labbook.book.drafts import Draft, read_draft, whole
from labbook.book.ledger import handle, reason, settle
from labbook.book.opening import writing
from labbook.book.records import KINDS
from labbook.book.registry_rows import registry_of
from labbook.book.shelf import document
from labbook.book.tables import published
from labbook.errors import Refusal
from labbook.registry.dialects import AT_BIRTH, completed, read_choices
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
        columns = {c: texts.get(c) for c in ("series", "citation", "x", "x_dialect", "y", "y_dialect", "note")}
        connection.execute(
            insert(published).values(
                id=next_id + added, typed=draft.document(), state="kept", sheet_row=mark, **columns
            )
        )
        added += 1
    return added


def _understood(draft: Draft, registry: Registry) -> None:
    """Refusal where an axis names no number, or its dialect cannot be read."""
    for axis in AXES:
        number, text = draft.texts[axis], draft.texts.get(f"{axis}_dialect", "")
        registry.number(number)
        choices_of(number, text)
    if draft.texts["x"] == draft.texts["y"]:
        raise Refusal("y", draft.texts["y"], "is the number of x already", "name another")


def choices_of(number: str, text: str | None) -> dict[str, object]:
    """The dialect a point was printed in, from 'rate:f,power:1'; what is left out is the one at birth."""
    text = (text or "").strip()
    if number not in AT_BIRTH:
        if text:
            raise Refusal("dialect", text, f"{number} has no dialects", "leave it empty")
        return {}
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
    query = select(*keys, func.count().label("points")).where(row.state == "kept").group_by(*keys).order_by(*keys)
    return [dict(r) for r in connection.execute(query).mappings()]


def points(connection: Connection, x: str, y: str, dialects: Dialects | None = None) -> pd.DataFrame:
    """The published points for a plot of y against x: series, citation, x, y, u_x, u_y under the keys' names.

    Each is restated from the dialect it was printed in to the one asked for (left out: the group's house).
    attrs['lost']: sentence -> how many points have no value there.
    """
    registry = registry_of(connection)
    pairs = ((published.c.x == x) & (published.c.y == y)) | ((published.c.x == y) & (published.c.y == x))
    rows = connection.execute(select(published).where(pairs, published.c.state == "kept")).mappings().all()
    wanted = {key: away(registry, dialects).get(key, registry.choices(key)) for key in (x, y)}
    table = {name: [] for name in ("series", "citation", x, y, f"u_{x}", f"u_{y}", "note")}
    lost: dict[str, int] = {}
    for row in rows:
        typed, missing = document(row["typed"]), ""
        for name in ("series", "citation", "note"):
            table[name].append(row[name])
        for axis in AXES:
            key = row[axis]
            value, u, why = _restated(key, typed, row, axis, wanted[key])
            table[key].append(value)
            table[f"u_{key}"].append(u)
            missing = missing or why
        if missing:
            lost[missing] = lost.get(missing, 0) + 1
    found = pd.DataFrame(table)
    found.attrs["lost"] = lost
    return found.dropna(subset=[x, y]).reset_index(drop=True) if len(found) else found


def _restated(key, typed, row, axis, wanted) -> tuple[float, float, str]:
    """(value, u, '') of one coordinate in the wanted dialect, or NaN with the reason."""
    value, u = typed[f"{axis}_value"][2:4]
    if not wanted:
        return value, u, ""
    inputs = {k: np.array([typed[k][2]]) for k in DIMENSIONS if k in typed}
    found = restate(
        key, np.array([value]), np.array([u]), None, choices=wanted,
        house=choices_of(key, row[f"{axis}_dialect"]), inputs=inputs,
    )  # fmt: skip
    why = found.why[0] if found.why is not None else ""
    return float(found.value[0]), float(found.u_own[0]), f"{key}: {why}" if why else ""
