"""The ledger's chain: each line carries the digest of the one before, so that a changed line shows."""

import hashlib
import json
from collections.abc import Iterable

from sqlalchemy import Connection, func, insert, select

from labbook.book.bulk import write_many
from labbook.book.clock import now
from labbook.book.tables import ledger, ledger_run

FIRST = "0" * 64
_TOLD = ("at", "by", "act", "kind", "subject", "before", "after", "why", "runs", "previous")


def digest_of(line) -> str:
    """Digest over every field of a line, the previous line's digest included."""
    return hashlib.sha256(json.dumps([line[k] for k in _TOLD], ensure_ascii=False).encode()).hexdigest()


def append(
    connection: Connection,
    by: str,
    act: str,
    kind: str,
    subject: str,
    *,
    before: dict | None = None,
    after: dict | None = None,
    why: str | None = None,
    runs: Iterable[tuple[int, str]] = (),
) -> int:
    """Add one line and return its id; `runs` are the (id, code) that the act wrote or derived again."""
    runs = list(runs)
    line = {
        "at": now(),
        "by": by,
        "act": act,
        "kind": kind,
        "subject": subject[:128],
        "before": _text(before),
        "after": _text(after),
        "why": why,
        "runs": ranges([code for _, code in runs]) or None,
        "previous": connection.scalar(select(ledger.c.digest).order_by(ledger.c.id.desc()).limit(1)) or FIRST,
    }
    line["digest"] = digest_of(line)
    line_id = connection.execute(insert(ledger).values(**line)).inserted_primary_key[0]
    write_many(connection, ledger_run, ("run_id", "ledger_id"), [(run_id, line_id) for run_id, _ in runs])
    return line_id


def _text(cells: dict | None) -> str | None:
    return None if cells is None else json.dumps(cells, ensure_ascii=False)


def first_broken(connection: Connection) -> int | None:
    """Id of the first line that does not follow from the one before, None where the chain holds.

    A line cut from the end leaves no gap in the chain; ids show one cut from the middle.
    """
    previous, expected = FIRST, None
    for line in connection.execute(select(ledger).order_by(ledger.c.id)).mappings():
        if expected is not None and line["id"] != expected:
            return expected
        if line["previous"] != previous or line["digest"] != digest_of(line):
            return line["id"]
        previous, expected = line["digest"], line["id"] + 1
    return None


def ranges(codes: list[str]) -> str:
    """'R-0001..R-0003, R-0007' of codes; runs of consecutive numbers are drawn together."""
    parts: list[list[str]] = []
    last: tuple[str, int] | None = None
    for code in codes:
        stem, _, number = code.rpartition("-")
        here = (stem, int(number)) if number.isdigit() else None
        if here and last and here == (last[0], last[1] + 1):
            parts[-1][1:] = [code]
        else:
            parts.append([code])
        last = here
    return ", ".join("..".join(p) for p in parts)


def runs_missing(connection: Connection) -> list[str]:
    """A sentence for each line that names more runs than the book still holds for it."""
    held = dict(connection.execute(select(ledger_run.c.ledger_id, func.count()).group_by(ledger_run.c.ledger_id)).all())
    found = []
    for line_id, runs in connection.execute(select(ledger.c.id, ledger.c.runs).where(ledger.c.runs.is_not(None))):
        named = how_many(runs)
        if named != held.get(line_id, 0):
            found.append(f"ledger line {line_id} names {named} runs, and {held.get(line_id, 0)} of them are there")
    return found


def how_many(runs: str) -> int:
    """How many codes stand in ranges such as 'R-0001..R-0003, R-0007'."""
    count = 0
    for part in filter(None, runs.split(", ")):
        first, _, last = part.partition("..")
        count += int(last.rpartition("-")[2]) - int(first.rpartition("-")[2]) + 1 if last else 1
    return count
