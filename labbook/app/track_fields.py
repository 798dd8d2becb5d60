"""A track is dropped: the file, its columns where their names say nothing, and how it is to be reduced."""

from collections.abc import Mapping, Sequence
from dataclasses import replace

import streamlit as st

from labbook.app import session
from labbook.app.track_reduced import Dropped, Reduced, digest_of, drift_of_dropped, header, of_dropped
from labbook.app.track_shown import velocity
from labbook.book.track_settings import FIT
from labbook.errors import Refusal
from labbook.exchange.track_columns import ROLES
from labbook.exchange.track_header import known_by_name, needs

LARGEST_MB = 64  # what a page reads
MOST_MB = 256  # what it lets in, to say so: beyond it Streamlit refuses, in a word that wants hovering
NEEDED = ("t", "frame", "x", "y")
FIELDS = ("scale", "fps", "f", "axis", "trim")
OF_DRIFT = ("drift", "still")
LABELS = {
    "scale": "scale, from the rig", "fps": "fps, from the rig", "f": "beat, or fit", "trim": "trim, cycles",
    "axis": "axis, ° from x to y", "drift": "drift to take off", "still": "or still from, to",
}  # fmt: skip
EXAMPLES = {
    "scale": "3.2(1) um/px", "fps": "30 fps", "f": "fit", "axis": "auto", "trim": "auto", "drift": "none",
    "still": "none",
}  # fmt: skip
SAID = ("Left as they stand, the camera is the rig's and f is what was set. Beat: 'fit' takes it from the track. Axis: "
        "degrees towards the head. Trim: leading cycles to drop. Drift, of the whole picture: a velocity, 0.1(1),-0.2(1) um/s; "
        "or seconds at either end in which the swimmer stood still, 0 to 4 s; or the track of a tracer or the empty tank.")  # fmt: skip
DRIFT_TRACK = "or the drift's own track"
UNITS = "Type a column with its unit where the header says none, e.g. time [ms]."


def version(place: str) -> str:
    """The place of the file that is dropped now: it changes when one is done with, so that its fields empty."""
    return f"{place}:track:{st.session_state.get(f'{place}:track-version', 0)}"


def done_with(place: str) -> None:
    """Let go of the file and of what was typed about it."""
    st.session_state[f"{place}:track-version"] = st.session_state.get(f"{place}:track-version", 0) + 1


def file_dropped(place: str, label: str, name: str = "file") -> Dropped | None:
    """The file in the drop zone, without settings; None where there is none or it is too large for a page."""
    at = version(place)
    with st.container(key=f"lb-dropzone-{place}-{name}".replace(":", "-")):
        file = st.file_uploader(f"{label}, up to {LARGEST_MB} MB", key=f"{at}:{name}", max_upload_size=MOST_MB)
    if file is None:
        return None
    if file.size > LARGEST_MB * 2**20:
        session.say_refused(too_large(file.name, file.size))
        return None
    known = st.session_state.get(f"{at}:{name}:digest")
    if known is None or known[0] != file.file_id:
        with st.spinner(f"Reading {file.name} …"):
            known = st.session_state[f"{at}:{name}:digest"] = (file.file_id, digest_of(file.getvalue()))
    return Dropped(file.name, file.getvalue(), known[1], {})


def too_large(name: str, size: int) -> str:
    """The sentence for a file that a page does not take."""
    return (f"{name} has {size / 2**20:.0f} MB, and this page takes {LARGEST_MB}; the command line takes up to {MOST_MB} "
            "(labbook reduce FILE --run CODE).")  # fmt: skip


def adjusted(
    place: str, dropped: Dropped, given: Mapping[str, str], across: int
) -> tuple[Dropped, Reduced] | None:
    """The file with its settings and what it reduces to, with the fields to change them; None where it is refused.

    given: texts of f, scale, fps as far as run and rig say them; across: fields a row.
    """
    cells, asked, lacking = _columns(place, dropped, min(across, 5))
    # the fields come first on the page, and what they are refused for is known after them: it is kept a run long
    said, reduced = refusals(place), Reduced(refused=("file", lacking or ""))
    if not lacking:
        settings, refused = _settings(place, cells, asked, given, said, across)
        dropped = replace(dropped, settings=settings)
        reduced = Reduced(refused=("drift_track", refused)) if refused else of_dropped(dropped, given)
    now = {_place_of(reduced.refused[0]): reduced.refused[1]} if reduced.refused else {}
    if now != said:
        st.session_state[f"{version(place)}:said"] = now
        st.rerun()
    if "file" in now:
        session.say_refused(now["file"])
    return None if reduced.refused else (dropped, reduced)


def refusals(place: str) -> dict[str, str]:
    """Field -> sentence of what the file that is dropped now was refused for."""
    return st.session_state.get(f"{version(place)}:said", {})


def _columns(place: str, dropped: Dropped, across: int) -> tuple[list[str], dict[str, str], str | None]:
    """(header, role -> column where it was chosen, sentence that refuses both or None)."""
    cells, refused = header(dropped.digest, dropped.name, dropped.content)
    if refused:
        return [], {}, refused
    by_name = known_by_name(cells)
    lacking = _sentence(cells, {})
    of_header = digest_of("\n".join(cells).encode())[:12]  # another file with the same columns keeps the choice
    with st.expander("columns" + ("" if lacking else f": {', '.join(by_name.values())}"), expanded=bool(lacking)):
        asked = {}
        for start in range(0, len(ROLES), across):
            row = ROLES[start : start + across]
            for column, role in zip(st.columns(across), row, strict=False):
                with column:
                    chosen = _column(f"{version(place)}:{of_header}:{role}", role, cells, by_name.get(role))
                if chosen and chosen != by_name.get(role):
                    asked[role] = chosen
        session.note(UNITS)
    return cells, asked, _sentence(cells, asked)


def _column(key: str, role: str, cells: list[str], known: str | None) -> str | None:
    """One role's column; a unit can be typed behind it where the header has none."""
    return st.selectbox(
        role, cells, index=cells.index(known) if known else None, key=key, accept_new_options=True,
        placeholder="which?" if role in NEEDED else "none",
    )  # fmt: skip


def _sentence(cells: Sequence[str], asked: Mapping[str, str]) -> str | None:
    try:
        needs(cells, asked)
    except Refusal as refusal:
        return str(refusal)
    return None


def _settings(
    place: str, cells: Sequence[str], asked: Mapping[str, str], given: Mapping[str, str], refused: Mapping[str, str],
    across: int,
) -> tuple[dict, str]:  # fmt: skip
    """(settings as the fields have them, sentence that refuses the drift's track or ''); each field refused at its place.

    What stands as given is left to the rig or run. given: texts of f, scale, fps as far as run and rig say them;
    refused: field -> sentence; across: fields a row.
    """
    wanted = needs(cells, asked)
    fields = [f for f in FIELDS if f not in ("scale", "fps") or getattr(wanted, f)]
    told: dict = {"columns": dict(asked)} if asked else {}
    for start in range(0, len(fields), across):
        _row(place, fields[start : start + across], st.columns(across), given, refused, told)
    drift, still, *beside = st.columns([1, 1, 2] if across > 3 else 2)
    _row(place, OF_DRIFT, (drift, still), given, refused, told)
    told = {k: v for k, v in told.items() if v not in ("auto", "none")}
    with beside[0] if beside else st.container():
        said = _drift_track(place, told, given)
    session.note(SAID)
    return told, said


def _row(place, fields, columns, given, refused, told) -> None:
    for column, field in zip(columns, fields, strict=False):
        with column:
            text = _field(place, field, given)
            if field in refused:
                session.say_refused(refused[field])
        if text and text != given.get(field):
            told[field] = text
        elif field == "f" and not text:
            told["f"] = FIT


def _drift_track(place: str, told: dict, given: Mapping[str, str]) -> str:
    """The drop zone of a drift track, whose velocity enters the settings; returns the sentence that refuses it, or ''."""
    dropped = file_dropped(place, DRIFT_TRACK, "drift-track")
    if dropped is None:
        return ""
    typed = [LABELS[key] for key in OF_DRIFT if key in told]
    if typed:
        found = f"{dropped.name}: the drift stands in '{typed[0]}' too; give one of them."
    else:
        found = drift_of_dropped(dropped, told, given)
    if isinstance(found, str):
        session.say_refused(found)
        return found
    told |= {"drift": found, "drift_from": dropped.name}
    session.note(f"Drift {velocity(found)} from {dropped.name}")
    return ""


def _field(place: str, field: str, given: Mapping[str, str]) -> str:
    key = f"{version(place)}:{field}"
    usual = given.get(field, "") if field in ("scale", "fps", "f") else "none" if field in OF_DRIFT else "auto"
    if st.session_state.get(f"{key}:usual") != usual:  # the rig or the frequency was changed: its value comes in
        st.session_state[f"{key}:usual"] = st.session_state[key] = usual
    elif key not in st.session_state:  # the field was away for a while
        st.session_state[key] = st.session_state[f"{key}:typed"]
    text = st.text_input(LABELS[field], key=key, placeholder=EXAMPLES[field]) or ""
    st.session_state[f"{key}:typed"] = text
    return text.strip()


def _place_of(field: str) -> str:
    """Where a refusal of the reduction stands: a field of this form, else the file with its columns."""
    places = (*FIELDS, *OF_DRIFT, "drift_track")
    return "scale" if field == "scale_u" else field if field in places else "file"
