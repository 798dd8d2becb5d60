"""A run's track from file to reduction: read, completed by run and rig, reduced; nothing is written here."""

from collections.abc import Mapping

from labbook.book.track_settings import known, reduction
from labbook.errors import Refusal
from labbook.exchange.track_files import read_track
from labbook.exchange.track_words import axis_of, velocity_of
from labbook.registry.typed import printed

FROM_RIG = ("scale", "fps")


def reduce_track(
    content: bytes, name: str, settings: Mapping, given: Mapping[str, str]
) -> tuple:
    """(Reduction, settings it was made with) of a track for a run, as attaching.attach takes them.

    settings: columns {role: column of the file}, scale '3.2(1) um/px', fps '30 fps', f '0.5 Hz' or 'fit', axis in
    degrees from x towards y (text or number, 'auto'), drift '0.1(1),-0.2(1) um/s' or ((vx, vy), (ux, uy)) in m/s,
    trim 'auto' or cycles, still (t0, t1) in s. given: what run and rig say of f, scale and fps, used where the
    settings and the file do not; 'taken' of the settings returned names which of them were.
    Errors: Refusal for what cannot be read or reduced.
    """
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
    return found, told | {"columns": file.columns, "taken": taken}


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
