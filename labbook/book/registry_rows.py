"""The registry that a book goes by: the versions a group stored, read as one value."""

import json
from functools import lru_cache

from sqlalchemy import Connection, Text, cast, func, insert, select

from labbook.book.clock import now
from labbook.book.tables import registry_row
from labbook.registry.catalogue import Number
from labbook.registry.group import Registry
from labbook.registry.regimes import REGIMES, from_content


def registry_of(connection: Connection) -> Registry:
    """The registry as the book has it now: of each row the newest version, withdrawn ones left out."""
    row = registry_row.c
    stored = connection.execute(
        select(row.kind, row.key, row.version, cast(row.content, Text)).order_by(row.version, row.id)
    ).all()
    return _read(tuple(tuple(r) for r in stored))


@lru_cache(maxsize=16)
def _read(stored: tuple[tuple, ...]) -> Registry:
    newest = {(kind, key): (version, content) for kind, key, version, content in stored}
    own, versions, house = {}, {}, {}
    regimes = dict(REGIMES)
    for (kind, key), (version, text) in newest.items():
        content = json.loads(text) if text else None
        if kind == "regime":
            if content is None:
                regimes.pop(key, None)
            else:
                regimes[key] = from_content(content)
        elif content is None:
            continue
        elif kind == "number":
            own[key] = Number(key, **{**content, "only_drives": tuple(content["only_drives"])})
            versions[key] = version
        else:
            house[key] = content
    return Registry(own, versions, regimes, house)


def put_version(connection: Connection, kind: str, key: str, content: dict | None, by: str, why: str | None) -> int:
    """Store the next version of a registry row (None: withdrawn); returns its number."""
    row = registry_row.c
    last = connection.scalar(select(func.max(row.version)).where(row.kind == kind, row.key == key))
    if last is None:
        last = 1 if kind == "regime" and key in REGIMES or kind == "house" else 0  # version 1 came with labbook
    connection.execute(
        insert(registry_row).values(
            kind=kind, key=key, version=last + 1, content=content, at=now(), by=by, why=why
        )
    )
    return last + 1


def versions_of(connection: Connection, kind: str, key: str) -> list[dict]:
    """Every stored version of a registry row, newest first: version, content, at, by, why."""
    row = registry_row.c
    query = select(row.version, row.content, row.at, row.by, row.why).where(row.kind == kind, row.key == key)
    return [dict(r) for r in connection.execute(query.order_by(row.version.desc())).mappings()]
