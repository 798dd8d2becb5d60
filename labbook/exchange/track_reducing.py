"""A run's track from file to reduction: read, completed by run and rig, reduced; nothing is written here."""

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from labbook.book.track_settings import known, reduction, velocity_of_positions
from labbook.errors import Refusal
from labbook.exchange.track_files import read_track
from labbook.exchange.track_words import axis_of, velocity_of
from labbook.registry.typed import printed

FROM_RIG = ("scale", "fps")
OF_A_TRACER = ("t", "frame", "x", "y")


@dataclass(frozen=True, eq=False)
class Made:
    """A Reduction, the settings it was made with, what reading the file had to say, and what it was made from.

    settings: as attaching.attach takes them, 'taken' of them names what run and rig brought; said: one sentence each;
    digest: SHA-256 of the file; asked: settings as given and what run and rig said, as one text.
    """

    reduction: object
    settings: dict
    said: tuple[str, ...]
    digest: str
    asked: str


def reduce_track(
    content: bytes, name: str, settings: Mapping, given: Mapping[str, str], made: Made | None = None
) -> Made:  # fmt: skip
    """A track reduced for a run; made: a reduction that serves again where it was made from all the same.

    settings: columns {role: column of the file}, scale '3.2(1) um/px', fps '30 fps', f '0.5 Hz' or 'fit', axis in
    degrees from x towards y (text or number, 'auto'), drift '0.1(1),-0.2(1) um/s' or ((vx, vy), (ux, uy)) in m/s,
    drift_from: what that drift was taken from, trim 'auto' or cycles, still '0 to 4 s' or (t0, t1) in s. given: what
    run and rig say of f, scale and fps, used where the settings and the file do not.
    Errors: Refusal for what cannot be read or reduced.
    """
    asked = json.dumps([known(settings), dict(given)], sort_keys=True)
    digest = hashlib.sha256(content).hexdigest()
    if made is not None and (made.asked, made.digest) == (asked, digest):
        return made
    told = known(settings)
    rig = {key: given.get(key) for key in FROM_RIG}
    file = read_track(
        content, name=name, columns=told.get("columns"), fps=told.get("fps"), scale=told.get("scale"), rig=rig
    )
    taken = {}
    for key in FROM_RIG:
        typed = getattr(file, key)
        if typed is not None and key not in told:
            taken[key] = "rig"
        told.pop(key, None)
        if typed is not None:
            told[key] = printed(key, typed)
    if "f" not in told and "f" in given:
        told["f"], taken["f"] = given["f"], "run"
    axis = None if "axis" not in told else axis_of(str(told["axis"]))
    found = reduction(
        file.keywords(), f=told.get("f"), axis=axis, drift=_drift(told.get("drift")),
        trim=_trim(told.get("trim", "auto")), still=told.get("still"),
    )  # fmt: skip
    told |= {"columns": file.columns, "taken": taken}
    return Made(found, told, tuple(file.report()), digest, asked)


def drift_of_track(source: str | Path | bytes, name: str, settings: Mapping, given: Mapping[str, str]) -> tuple:
    """((vx, vy), (ux, uy)) in m/s of a tracer's or an empty tank's track, filmed as the swimmer was.

    Of settings, columns, scale and fps serve as far as the file needs them; given: what the rig says of both.
    Errors: Refusal for what cannot be read, or is no steady drift.
    """
    columns = {role: one for role, one in (settings.get("columns") or {}).items() if role in OF_A_TRACER}
    rig = {key: settings.get(key) or given.get(key) for key in FROM_RIG}
    return velocity_of_positions(read_track(source, name=name, columns=columns, rig=rig).positions())


def _drift(given) -> tuple | None:
    if given is None:
        return None
    if isinstance(given, str):
        return tuple(velocity_of(given))
    try:
        (vx, vy), (ux, uy) = given
        return (float(vx), float(vy)), (float(ux), float(uy))
    except (TypeError, ValueError):
        raise Refusal("drift", given, "is no velocity", "give ((vx, vy), (ux, uy)) in m/s") from None


def _trim(given):
    if not isinstance(given, str) or given == "auto":
        return given
    try:
        return float(given)
    except ValueError:
        raise Refusal("trim", given, "is neither auto nor a number of cycles", "e.g. 2") from None
