"""Are the kept files what they were, and do the runs that were reduced from them still say what the tracks say."""

import hashlib

from sqlalchemy import Connection, Text, and_, cast, select

from labbook.book.reduced_cells import LENGTHS, entries, reduced_keys
from labbook.book.shelf import document
from labbook.book.tables import kept_file, run, track
from labbook.errors import Refusal
from labbook.registry.typed import REDUCED, read


def tracks_wrong(connection: Connection) -> list[str]:
    """A sentence for each kept file that was changed, and for each run that differs from its track."""
    return _files(connection) + _runs(connection)


def _files(connection) -> list[str]:
    found = []
    heads = connection.execute(select(kept_file.c.id, kept_file.c.name, kept_file.c.digest, kept_file.c.size)).all()
    for file_id, name, digest, size in heads:  # one content at a time: together they may not fit into memory
        content = connection.scalar(select(kept_file.c.content).where(kept_file.c.id == file_id))
        content = content.encode() if isinstance(content, str) else bytes(content)
        if len(content) != size or hashlib.sha256(content).hexdigest() != digest:
            found.append(f"file {name}: its content was changed, the digest {digest[:12]}... does not fit")
    return found


def _runs(connection) -> list[str]:
    in_use = and_(track.c.run_id == run.c.id, track.c.state == "in use")
    query = (
        select(run.c.code, run.c.typed, track.c.code, track.c.settings, track.c.result, track.c.replaced)
        .select_from(run.outerjoin(track, in_use))
        .where(cast(run.c.typed, Text).like(f'%"{REDUCED}"%') | track.c.id.is_not(None))
        .order_by(run.c.id)
    )
    found, seen = [], set()
    for code, typed, *of_track in connection.execute(query):
        sentence = _differs(document(typed), *of_track)
        if code in seen:
            sentence = "has more than one track in use"
        seen.add(code)
        if sentence:
            found.append(f"{code}: {sentence}")
    return found


def _differs(typed, code, settings, result, replaced) -> str:
    keys = reduced_keys(typed)
    if code is None:
        return f"{', '.join(keys)} should come from a track, and it has none" if keys else ""
    if not keys:
        return f"track {code} is said to be in use, and nothing comes from it"
    try:
        settings, result, replaced = (document(d) for d in (settings, result, replaced))
        told = entries(result, keys, read("scale", settings["scale"]) if settings.get("scale") else None)
        wrong = [key for key in keys if list(typed[key]) != told[key] or key not in replaced]
    except (Refusal, ArithmeticError, LookupError, TypeError, ValueError, AttributeError):
        return f"track {code} was changed by hand and cannot be read"
    if set(keys) & set(LENGTHS) and typed.get("scale") != told.get("scale"):
        wrong.append("scale")
    return f"{', '.join(wrong)} is not what track {code} says" if wrong else ""
