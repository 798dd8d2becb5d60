"""What the Ledger page asks: lines with what each changed, filters and their choices, the chain's state."""

import json
from dataclasses import dataclass

from sqlalchemy import Connection, Select, func, select

from labbook.book.chain import first_broken, how_many
from labbook.book.clock import local, now
from labbook.book.tables import SHELF, ledger, ledger_run, reading, run

PAGE = 25


@dataclass(frozen=True)
class Line:
    """One ledger line as read.

    changes: (column, before, after), '' where there is none; runs: the codes it touched as ranges, n_runs
    how many; place: (kind, code) of the shelf record or run it is about, None where nothing can be opened.
    """

    id: int
    at: str
    by: str
    act: str
    kind: str
    subject: str
    changes: tuple[tuple[str, str, str], ...]
    why: str
    runs: str
    n_runs: int
    place: tuple[str, str] | None

    @property
    def when(self) -> str:
        """Local date and time to the minute."""
        return f"{local(self.at):%Y-%m-%d %H:%M}"


def ledger_page(
    connection: Connection, *, by: str = "", act: str = "", code: str = "", page: int = 1, size: int = PAGE
) -> tuple[list[Line], int]:
    """A page of ledger lines, newest first, and how many lines there are in all.

    code: of a run, finding every line that wrote it or derived it again, or of a shelf record or reading.
    """
    found = []
    if by:
        found.append(ledger.c.by == by)
    if act:
        found.append(ledger.c.act == act)
    if code:
        touched = (
            select(ledger_run.c.ledger_id)
            .join(run, run.c.id == ledger_run.c.run_id)
            .where(run.c.code == code)
        )
        found.append((ledger.c.subject == code) | ledger.c.id.in_(touched))
    total = connection.scalar(select(func.count()).select_from(ledger).where(*found))
    query = (
        select(ledger)
        .where(*found)
        .order_by(ledger.c.id.desc())
        .limit(size)
        .offset((max(page, 1) - 1) * size)
    )
    return lines_from(connection, query), total


def lines_from(connection: Connection, query: Select) -> list[Line]:
    """The lines of a query over the ledger."""
    rows = connection.execute(query).mappings().all()
    owners = _owners(connection, [r["subject"] for r in rows if r["kind"] == "reading"])
    return [_line(row, owners) for row in rows]


def _line(row, owners) -> Line:
    before, after = (json.loads(row[side]) if row[side] else {} for side in ("before", "after"))
    told = ((k, _text(before.get(k)), _text(after.get(k))) for k in {**before, **after})
    changes = tuple(c for c in told if c[1] != c[2])
    place = (row["kind"], row["subject"]) if row["kind"] in (*SHELF, "run") else owners.get(row["subject"])
    return Line(
        row["id"], row["at"], row["by"], row["act"], row["kind"], row["subject"], changes, row["why"] or "",
        row["runs"] or "", how_many(row["runs"] or ""), place,
    )  # fmt: skip


_COUNTED = {*SHELF, "reading", "run", "published point"}  # what a load adds


def _owners(connection: Connection, codes: list[str]) -> dict[str, tuple[str, str]]:
    """Code of a reading -> (kind, code) of the batch it is of."""
    found = {}
    for name in ("fluid", "material") if codes else ():
        table = SHELF[name]
        query = select(reading.c.code, table.c.code).join(table, table.c.id == reading.c[f"{name}_id"])
        found |= {code: (name, of) for code, of in connection.execute(query.where(reading.c.code.in_(codes)))}
    return found


def _text(value) -> str:
    if value is None:
        return ""
    if isinstance(value, dict):
        if set(value) <= _COUNTED:
            return ", ".join(f"{n} {k}{'s' if n != 1 else ''}" for k, n in value.items())
        return ", ".join(f"{k} {_text(v)}" for k, v in value.items())
    if isinstance(value, float):
        return f"{value:.4g}"
    if isinstance(value, list):
        return (
            f"{len(value)} warning{'s' if len(value) != 1 else ''}: {'; '.join(map(str, value))}"
            if value
            else ""
        )
    if isinstance(value, bool):
        return "yes" if value else "no"
    return str(value)


def people_and_acts(connection: Connection) -> tuple[list[str], list[str]]:
    """Every handle and every act that stands in the ledger."""
    return tuple(
        list(connection.scalars(select(c).distinct().order_by(c))) for c in (ledger.c.by, ledger.c.act)
    )


def newest_line(connection: Connection) -> Line | None:
    """The newest ledger line: what the act just done left."""
    found = lines_from(connection, select(ledger).order_by(ledger.c.id.desc()).limit(1))
    return found[0] if found else None


def chain_state(connection: Connection) -> tuple[int, int | None, str]:
    """(number of lines, id of the first that does not follow from the one before or None, when verified)."""
    return connection.scalar(select(func.count()).select_from(ledger)), first_broken(connection), now()
