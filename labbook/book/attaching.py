"""A track attached to a run: file kept, result kept, its values in the run; one transaction, one ledger line."""

import hashlib
import json
import math
from collections.abc import Iterable, Mapping
from dataclasses import fields, is_dataclass

import numpy as np
from sqlalchemy import Connection, Engine, func, insert, select, update

from labbook.book import chain
from labbook.book.arrivals import Findings
from labbook.book.clock import now
from labbook.book.ledger import handle, reason, run_row, settle
from labbook.book.opening import reading, writing
from labbook.book.reduced_cells import (
    REDUCIBLE,
    entries,
    handy,
    let_go,
    reduced_keys,
    track_in_use,
    typed_before,
)
from labbook.book.run_rows import derive_again
from labbook.book.shelf import Typed as Document
from labbook.book.shelf import document
from labbook.book.tables import kept_file, rig, run, track
from labbook.book.track_doubts import doubts
from labbook.errors import Refusal
from labbook.physics.tracks import Reduction
from labbook.registry.typed import Typed, printed, read

LARGEST_FILE = 256 * 2**20  # bytes: a million frames are a quarter of it
LONGEST_NAME = 255


def conditions(engine: Engine, code: str) -> dict[str, str]:
    """The run's f, the rig's scale and fps as texts, as far as they are known, for reducing a track of the run.

    f as it would be without a track. Errors: Refusal for an unknown or void run.
    """
    with reading(engine) as connection:
        return _conditions(connection, _kept_run(connection, code))


def _conditions(connection, row) -> dict[str, str]:
    typed = typed_before(connection, row)
    of_rig = document(connection.scalar(select(rig.c.typed).where(rig.c.id == row["rig_id"])) or {})
    found = {"f": typed.get("f"), **{key: of_rig.get(key) for key in ("scale", "fps")}}
    return {key: printed(key, Typed(*entry)) for key, entry in found.items() if entry is not None}


def _kept_run(connection: Connection, code: str):
    row = run_row(connection, code)
    if row["state"] == "void":
        raise Refusal("run", code, f"is void: {row['why']}", "amend its state to kept first")
    return row


def attach(
    engine: Engine, code: str, content: bytes, name: str, reduction: Reduction, settings: Mapping,
    accept: Iterable[str], by: str, why: str | None = None, *, confirm: bool = False,
) -> str:  # fmt: skip
    """Attach a reduced track to a run and return its code; the values it replaces stay with it and in the ledger.

    settings: those it was made with, complete, scale with its unit where the file needed one; accept: which
    of U, A_tip and f enter the run, as far as the track has them (a given f is none of the track's). A track that
    was in use is replaced, and what only it had brought goes. The same track once more changes nothing.
    Errors: Refusal, Unconfirmed (warnings as of a typed value, that confirm=True would pass); nothing is attached then.
    """
    by, why = handle(by), reason(why) if why is not None else None
    name, digest = _name(name), hashlib.sha256(fitting(content)).hexdigest()
    result = result_of(reduction)
    scale = read("scale", settings["scale"]) if settings.get("scale") else None
    brought = entries(result, _accepted(accept, result), scale)
    with writing(engine) as connection:
        row = _kept_run(connection, code)
        _unchanged(_conditions(connection, row), settings)
        old, was = document(row["typed"]), typed_before(connection, row)
        typed, replaced = {**was, **brought}, {key: was.get(key) for key in brought if key in REDUCIBLE}
        earlier = track_in_use(connection, row["id"])
        file_id = _keep(connection, content, digest, name)
        settings = json.loads(json.dumps({**settings, "file": name}))
        if earlier and earlier["file_id"] == file_id and typed == old:
            return earlier["code"]
        before, after = _texts(old), _texts(typed)
        touched = [k for k in {**before, **after} if before.get(k) != after.get(k)]
        warned = doubts(connection, row, typed, touched)
        settle(Findings(warned=warned), confirm)
        let_go(connection, row["id"], why)
        serial = (connection.scalar(select(func.max(track.c.id))) or 0) + 1
        told = {"id": serial, "code": f"T-{serial:04d}", "run_id": row["id"], "file_id": file_id, "at": now(), "by": by}
        more = {"settings": settings, "result": result, "replaced": replaced, "state": "in use"}
        connection.execute(insert(track).values(**told, **more))
        values = {"typed": typed, "confirmed": _confirmed(row["confirmed"], touched, warned)}
        connection.execute(update(run).where(run.c.id == row["id"]).values(**values))
        changed = derive_again(connection, run.c.id == row["id"])
        of_track = {"track": told["code"], "file": name, "digest": digest}
        of_earlier = {"track": earlier["code"]} if earlier else {}
        before, after = _told(before, old, document(earlier["result"]) if earlier else {}), _told(after, typed, result)
        chain.append(
            connection, by, "reduce", "run", code, before={k: before.get(k) for k in touched} | of_earlier,
            after={k: after.get(k) for k in touched} | of_track, why=why, runs=changed or [(row["id"], code)],
        )  # fmt: skip
    return told["code"]


def fitting(content: bytes) -> bytes:
    """A file's content; Refusal for one that is too large to keep."""
    if len(content) > LARGEST_FILE:
        size, most = len(content) / 2**20, LARGEST_FILE // 2**20
        raise Refusal("track", f"{size:.0f} MB", f"a kept file has at most {most} MB", "cut the track to this trial")
    return content


def _name(name: str) -> str:
    """The file's name without its folder, checked."""
    last = str(name).replace("\\", "/").rpartition("/")[2].strip()
    if not last or len(last) > LONGEST_NAME or any(ord(c) < 32 for c in last):
        raise Refusal("track", last[:40], f"a file name of 1 to {LONGEST_NAME} characters is needed")
    return last


def _accepted(accept: Iterable[str], result: Mapping) -> list[str]:
    """What of a result enters the run, of what is asked for."""
    asked = [accept] if isinstance(accept, str) else list(dict.fromkeys(accept))
    for key in asked:
        if key not in REDUCIBLE:
            raise Refusal("accept", key, "does not come from a track", f"some of {', '.join(REDUCIBLE)}")
    if "U" in asked and not (result["U"] is not None and result["u_U"]):
        raise Refusal("U", None, "is not measured by this track", "look at its path, trim and axis")
    # a frequency that the fit was given has no uncertainty, and is none of the track's
    found = [key for key in asked if all(result[name] for name in REDUCIBLE[key][1:])]
    if not found:
        lacks = f"the track says nothing of {', '.join(asked)}" if asked else "nothing is accepted"
        raise Refusal("accept", None, lacks, "accept U, A_tip or f of a track that shows them")
    return found


def result_of(reduction: Reduction) -> dict:
    """A reduction by its fields' names, in SI, as JSON takes it: everything but the trace; null where it says nothing."""
    return {f.name: _plain(getattr(reduction, f.name)) for f in fields(reduction) if f.name != "trace"}


def _plain(value):
    if is_dataclass(value):
        return {f.name: _plain(getattr(value, f.name)) for f in fields(value)}
    if isinstance(value, list | tuple | np.ndarray):
        return [_plain(one) for one in value]
    if isinstance(value, np.generic):
        value = value.item()
    return None if isinstance(value, float) and not math.isfinite(value) else value


def _unchanged(given: Mapping[str, str], settings: Mapping) -> None:
    """Refusal where run or rig are not any more what the track was reduced with."""
    for key, source in settings.get("taken", {}).items():
        if given.get(key) != settings[key]:
            raise Refusal(key, settings[key], f"has changed on the {source} meanwhile", "reduce the track again")


def _keep(connection: Connection, content: bytes, digest: str, name: str) -> int:
    """The id of the kept file with this content; it is stored where it is new."""
    known = connection.scalar(select(kept_file.c.id).where(kept_file.c.digest == digest))
    if known is not None:
        return known
    told = {"digest": digest, "name": name, "size": len(content), "content": content}
    return connection.execute(insert(kept_file).values(**told)).inserted_primary_key[0]


def _texts(typed) -> dict[str, str]:
    return {key: printed("T" if key == "T_end" else key, Typed(*entry)) for key, entry in typed.items()}


def _told(texts: dict[str, str], typed: Document, result: Mapping) -> dict[str, str]:
    """The texts for the ledger: what comes from a track with its whole uncertainty, as a page writes it."""
    from_track = {k: handy(k, *(result[name] for name in REDUCIBLE[k])) for k in reduced_keys(typed) if result}
    return texts | from_track


def _confirmed(stored: str | None, touched, warned) -> str | None:
    """The confirmations of a run but for those of cells that were touched, and the new ones."""
    kept = [one for one in json.loads(stored or "[]") if one[0] not in touched] + warned
    return json.dumps(kept, ensure_ascii=False) if kept else None
