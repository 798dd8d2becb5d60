"""What a track brings into a run's typed document, what stood there before, and how it goes again."""

from collections.abc import Iterable, Mapping
from math import sqrt

from sqlalchemy import Connection, select, update

from labbook.book.shelf import Typed as Document
from labbook.book.shelf import document
from labbook.book.tables import track
from labbook.errors import Refusal
from labbook.registry.quantities import QUANTITIES
from labbook.registry.typed import REDUCED, Typed, read, reduced
from labbook.registry.written import written_in

LENGTHS = ("U", "A_tip")  # whose uncertainty has a part from the camera's scale
REDUCIBLE = {"U": ("U", "u_U"), "A_tip": ("A_tip", "u_A_tip"), "f": ("f_beat", "u_f_beat")}  # key -> in a result
FINER = {"U": ("mm/s", "um/s", 1e-4), "A_tip": ("mm", "um", 1e-4)}  # key -> unit, unit below this SI value
DIGEST_SHOWN = 12  # characters of a file's digest, for people
_LEAST_OWN = 1e-6  # of u: less is what rounding leaves of a difference of squares


def entries(result: Mapping, accepted: Iterable[str], scale: Typed | None) -> Document:
    """The accepted keys of a track's result as typed entries, u without the scale's part; the scale beside them.

    That part is taken off in squares, so that the run's u, own and shared together, is the result's.
    Errors: Refusal for a value that the track does not measure.
    """
    relative = scale.u / scale.value if scale is not None else 0.0
    found = {}
    for key in accepted:
        value, u = (result[name] for name in REDUCIBLE[key])
        if key in LENGTHS:
            u = max(sqrt(max(u * u - (relative * value) ** 2, 0.0)), _LEAST_OWN * u)
        found[key] = list(reduced(key, value, u))
    if scale is not None and found.keys() & set(LENGTHS):
        found["scale"] = list(scale._replace(origin=REDUCED))
    return found


def in_short(key: str, text: str) -> str:
    """A ledger's text for people: a track's value in a handy unit, the first letters of a file's digest.

    What somebody typed comes back as it is. The text that the book keeps of a track's value has the run's own part of
    u alone, so it is left out.
    """
    if key == "digest":
        return text[:DIGEST_SHOWN]
    if key not in REDUCIBLE:
        return text
    try:
        found = read(key, text)
        is_reduced = reduced(key, found.value, found.u).text == text
    except Refusal:
        return text
    unit = handy_unit(key, found.value, found.u)
    return written_in(key, found.value, None, unit) if is_reduced else text


def handy_unit(key: str, value: float, u: float | None) -> str:
    """The unit that suits the size of a track's speed, length or frequency (key U, A_tip or f)."""
    if key not in FINER:
        return QUANTITIES[key].unit
    large, small, below = FINER[key]
    return small if max(abs(value), u or 0.0) < below else large


def handy(key: str, value: float | None, u: float | None) -> str:
    """A track's speed, length or frequency (key U, A_tip or f) as a page writes it; empty where absent."""
    return "" if value is None else written_in(key, value, u, handy_unit(key, value, u))


def reduced_keys(typed: Document) -> list[str]:
    """The keys of a run whose values come from a track."""
    return [key for key, entry in typed.items() if entry[4] == REDUCED and key in REDUCIBLE]


def scale_kept(old: Document, typed: Document) -> Document:
    """A changed document with the old one's scale, as long as a length in it comes from the track."""
    if "scale" in old and set(reduced_keys(typed)) & set(LENGTHS):
        return typed | {"scale": old["scale"]}
    return typed


def without_track(typed: Document, replaced: Mapping | None) -> Document:
    """A run's document as it would be without its track; replaced: what the track in use took the place of."""
    from_track = reduced_keys(typed)
    rest = {k: entry for k, entry in typed.items() if k != "scale" and k not in from_track}
    return rest | {k: entry for k in from_track if (entry := (replaced or {}).get(k)) is not None}


def typed_before(connection: Connection, row) -> Document:
    """The document of a row of `run` as it would be without its track."""
    typed = document(row["typed"])
    if not reduced_keys(typed):
        return typed
    used = track_in_use(connection, row["id"])
    return without_track(typed, document(used["replaced"]) if used is not None else None)


def track_in_use(connection: Connection, run_id: int):
    """The row of the track that a run's values come from, or None."""
    query = select(track).where(track.c.run_id == run_id, track.c.state == "in use")
    return connection.execute(query).mappings().one_or_none()


def let_go(connection: Connection, run_id: int, why: str | None) -> None:
    """Nothing of the run comes from its track any more, or another takes its place: it stays, as replaced."""
    mine = (track.c.run_id == run_id, track.c.state == "in use")
    connection.execute(update(track).where(*mine).values(state="replaced", why=why))
