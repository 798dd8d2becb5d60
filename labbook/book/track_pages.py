"""What the book answers about tracks: a run's track, the kept file, all tracks as a table."""

from collections.abc import Sequence
from dataclasses import asdict, dataclass

import pandas as pd
from sqlalchemy import Connection, select

from labbook.book.reduced_cells import reduced_keys
from labbook.book.shelf import document
from labbook.book.tables import kept_file, rig, run, track
from labbook.errors import Refusal
from labbook.registry.typed import Typed, printed

_AT_ONCE = 500  # codes in one query
# what a table of tracks takes from their results
TOLD = ("U", "u_U", "U_low", "U_high", "f_beat", "net_per_cycle", "p_zero", "A_tip", "cycles", "frames")
_COLUMNS = (
    track.c.code, run.c.code.label("run"), kept_file.c.name.label("file"), kept_file.c.digest, kept_file.c.size,
    track.c.settings, track.c.result, track.c.replaced, track.c.at, track.c.by, track.c.state, track.c.why,
)  # fmt: skip
_FROM = track.join(run, run.c.id == track.c.run_id).join(kept_file, kept_file.c.id == track.c.file_id)


@dataclass(frozen=True)
class TrackSheet:
    """The track that a run's values come from.

    file, digest, size: name, SHA-256 and bytes of the kept file; settings: what it was reduced with; result: by the
    names of a Reduction, SI; accepted: keys that come from it now; replaced: key -> typed entry that stood there
    before, None for nothing; stale: a sentence for each thing that is not any more as it was reduced with.
    """

    code: str
    run: str
    file: str
    digest: str
    size: int
    settings: dict
    result: dict
    accepted: list[str]
    replaced: dict[str, list | None]
    at: str
    by: str
    stale: list[str]

    def row(self) -> dict:
        """As one JSON object; what was replaced as it was typed."""
        texts = {key: printed(key, Typed(*entry)) if entry else None for key, entry in self.replaced.items()}
        return asdict(self) | {"replaced": texts}


def track_of(connection: Connection, code: str) -> TrackSheet | None:
    """The track in use of one run; None where none of the run's values come from one."""
    return tracks_of(connection, [code]).get(code)


def tracks_of(connection: Connection, codes: Sequence[str]) -> dict[str, TrackSheet]:
    """Run code -> its track in use, for those of the runs that have one."""
    found = {}
    more = (run.c.typed, rig.c.code.label("rig"), rig.c.typed.label("of_rig"))
    query = select(*_COLUMNS, *more).select_from(_FROM.outerjoin(rig, rig.c.id == run.c.rig_id))
    for start in range(0, len(codes), _AT_ONCE):
        part = query.where(track.c.state == "in use", run.c.code.in_(codes[start : start + _AT_ONCE]))
        found |= {row["run"]: _sheet(row) for row in connection.execute(part).mappings()}
    return found


def units_before(connection: Connection, codes: Sequence[str]) -> dict[tuple[str, str], str]:
    """(run, key) -> the unit of what was typed before a track in use took its place, of those runs."""
    found = {}
    query = select(run.c.code, track.c.replaced).select_from(_FROM).where(track.c.state == "in use")
    for start in range(0, len(codes), _AT_ONCE):
        for code, replaced in connection.execute(query.where(run.c.code.in_(codes[start : start + _AT_ONCE]))):
            found |= {(code, key): entry[1] for key, entry in document(replaced).items() if entry}
    return found


def _sheet(row) -> TrackSheet:
    settings, result, replaced, typed = (document(row[c]) for c in ("settings", "result", "replaced", "typed"))
    return TrackSheet(
        row["code"], row["run"], settings.get("file", row["file"]), row["digest"], row["size"], settings, result,
        reduced_keys(typed), replaced, row["at"], row["by"], _stale(settings, result, typed, row),
    )  # fmt: skip


def _stale(settings, result, typed, row) -> list[str]:
    """What the run or its rig says otherwise than when the track was reduced."""
    said = []
    given = result["f_beat"] is not None and not result["u_f_beat"]
    if given and "f" in typed and typed["f"][2] != result["f_beat"]:
        now = printed("f", Typed(*typed["f"]))
        said.append(f"reduced with f = {result['f_beat']:g} Hz, and the run says {now}: reduce it again")
    if settings.get("taken", {}).get("scale"):
        entry = (document(row["of_rig"]) or {}).get("scale")
        now = printed("scale", Typed(*entry)) if entry else "none"
        if now != settings["scale"]:
            said.append(f"reduced with scale {settings['scale']}, and rig {row['rig']} says {now}: reduce it again")
    return said


def file_content(connection: Connection, digest: str) -> bytes:
    """A kept file, byte for byte; Refusal for an unknown digest."""
    content = connection.scalar(select(kept_file.c.content).where(kept_file.c.digest == digest))
    if content is None:
        raise Refusal("file", digest, "the book keeps no file with this digest")
    return bytes(content)


def tracks_table(connection: Connection) -> pd.DataFrame:
    """Every track, replaced ones included, newest first: code, run, file, digest, size, at, by, state, why, TOLD in SI."""
    rows = connection.execute(select(*_COLUMNS).select_from(_FROM).order_by(track.c.id.desc())).mappings().all()
    told = []
    for row in rows:
        result, name = document(row["result"]), document(row["settings"]).get("file", row["file"])
        texts = {c: row[c] for c in ("code", "run", "digest", "size", "at", "by", "state", "why")}
        told.append({**texts, "file": name, **{key: result.get(key) for key in TOLD}})
    names = ("code", "run", "file", "digest", "size", "at", "by", "state", "why", *TOLD)
    return pd.DataFrame(told, columns=names).astype(dict.fromkeys(TOLD, float))
