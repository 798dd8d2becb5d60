"""Are the kept files what they were, do runs still say what their tracks say, and tracks what their files reduce to."""

import hashlib
import math
from collections.abc import Callable, Mapping

from sqlalchemy import Connection, Engine, Text, and_, cast, select

from labbook.book.attaching import result_of
from labbook.book.opening import reading
from labbook.book.reduced_cells import LENGTHS, entries, reduced_keys
from labbook.book.shelf import document
from labbook.book.tables import kept_file, run, track
from labbook.book.track_settings import SETTINGS
from labbook.errors import LabbookError, Refusal
from labbook.registry.typed import REDUCED, read

# a fit ends where its steps are small enough, and exp and log differ in the last bits between machines
SAME = 1e-6  # of a figure
SAME_OF_U = 1e-3  # of its standard uncertainty
NEVER = 1e-12  # probabilities below it are one


def tracks_wrong(connection: Connection) -> list[str]:
    """A sentence for each kept file that was changed, and for each run that differs from its track."""
    return _files(connection) + _runs(connection)


def _files(connection) -> list[str]:
    found = []
    heads = connection.execute(select(kept_file.c.id, kept_file.c.name, kept_file.c.digest, kept_file.c.size)).all()
    for file_id, name, digest, size in heads:  # one content at a time: together they may not fit into memory
        content = _content(connection, file_id)
        if len(content) != size or hashlib.sha256(content).hexdigest() != digest:
            found.append(f"file {name}: its content was changed, the digest {digest[:12]}... does not fit")
    return found


def _content(connection, file_id: int) -> bytes:
    content = connection.scalar(select(kept_file.c.content).where(kept_file.c.id == file_id))
    return content.encode() if isinstance(content, str) else bytes(content)  # a text was put there by hand


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


def reduced_otherwise(
    engine: Engine, again: Callable, progress: Callable[[int], None] = lambda n: None
) -> list[str]:
    """A sentence for each track, replaced ones included, whose stored figures its kept file does not reduce to.

    again(content, name, settings, {}) returns an object whose `reduction` is the Reduction of a file.
    A file whose content was changed is passed over: tracks_wrong says it.
    """
    with reading(engine) as connection:
        tracks = connection.execute(
            select(run.c.code.label("run"), track.c.code, track.c.settings, track.c.result, track.c.file_id,
                   kept_file.c.name, kept_file.c.digest)
            .select_from(track.join(run, run.c.id == track.c.run_id).join(kept_file, kept_file.c.id == track.c.file_id))
            .order_by(track.c.id)
        ).mappings().all()  # fmt: skip
        found = []
        for row in tracks:  # one content at a time, as above
            content = _content(connection, row["file_id"])
            if hashlib.sha256(content).hexdigest() == row["digest"]:
                found += [f"{row['run']}: {said}" for said in _against_file(row, content, again)]
            progress(1)
    return found


def _against_file(row, content, again) -> list[str]:
    try:
        settings, stored = document(row["settings"]), document(row["result"])
        made = again(content, settings.get("file", row["name"]), {k: settings[k] for k in SETTINGS if k in settings}, {})
        fresh = result_of(made.reduction)
        wrong = [k for k in {**fresh, **stored} if not _same(k, stored.get(k), fresh.get(k), fresh)]
    except (LabbookError, ArithmeticError, LookupError, TypeError, ValueError, AttributeError) as error:
        why = f" ({error})" if isinstance(error, LabbookError) else ""
        return [f"track {row['code']} cannot be reduced again: its settings were changed by hand{why}"]
    if not wrong:
        return []
    verb = "is" if len(wrong) == 1 else "are"
    return [f"{', '.join(wrong)} of track {row['code']} {verb} not what its file reduces to: changed by hand, or reduced "
            "by another labbook"]  # fmt: skip


def _same(key: str, stored, fresh, around: Mapping) -> bool:
    """Whether a stored figure is the fresh one, but for what another machine makes of it; lists and groups by their parts."""
    if isinstance(fresh, dict) and isinstance(stored, dict):
        return fresh.keys() == stored.keys() and all(_same(k, stored[k], fresh[k], fresh) for k in fresh)
    if isinstance(fresh, list) and isinstance(stored, list):
        sizes = [abs(v) for v in fresh if v is not None]
        u = around.get(f"u_{key}")
        u = u if isinstance(u, list) else [max(sizes, default=0.0) * SAME / SAME_OF_U] * len(fresh)
        return len(fresh) == len(stored) and all(
            _same(key, s, f, {f"u_{key}": one}) for s, f, one in zip(stored, fresh, u, strict=True)
        )
    if isinstance(fresh, int | float) and isinstance(stored, int | float):
        if key.startswith("p_"):
            return math.isclose(stored, fresh, rel_tol=SAME) or max(stored, fresh) < NEVER
        u = around.get(f"u_{key}") or 0.0
        return math.isclose(stored, fresh, rel_tol=SAME, abs_tol=SAME_OF_U * u)
    return fresh == stored
