"""A track on Bench: dropped beside what was seen, shown at once, attached to the trial when that is logged."""

from collections.abc import Mapping
from dataclasses import dataclass, field

import streamlit as st

from labbook.api import Book
from labbook.app import live, session, track_fields, track_shown
from labbook.app.track_reduced import Dropped
from labbook.book.shelf_pages import on_shelf
from labbook.registry.typed import reduced

PLACE = "bench"
ATTACH = "bench:attach"
ENTERS = ("U", "A_tip")  # f is what was set


@dataclass(frozen=True)
class OnBench:
    """The file that waits for the trial, None for none; cells: U and A_tip as it says them, for the live numbers."""

    dropped: Dropped | None = None
    cells: dict[str, str] = field(default_factory=dict)
    charts: dict[str, dict] = field(default_factory=dict)


def offer(cells: Mapping[str, str]) -> OnBench:
    """The drop zone; of a file the speed, and the fields that adjust it."""
    dropped = track_fields.file_dropped(PLACE, "or drop a track")
    if dropped is None:
        return OnBench()
    session.forget(ATTACH)
    with st.expander("columns, axis, trim, drift", expanded=bool(track_fields.refusals(PLACE))):
        found = track_fields.adjusted(PLACE, dropped, _given(cells), across=3)
    if found is None:
        return OnBench(dropped)
    dropped, shown = found
    session.note(f"U {track_shown.speed(shown.result)} · {dropped.name}: replaces a typed U when the trial is logged; "
                 "both are kept.")  # fmt: skip
    return OnBench(dropped, _cells(shown.result), shown.charts)


def chart(track: OnBench) -> None:
    """The position along the axis with its fit, small."""
    track_shown.chart(track.charts, "along", PLACE)


def _cells(result: Mapping) -> dict[str, str]:
    """What the track measures, written as it could be typed."""
    return {
        key: reduced(key, result[key], result[f"u_{key}"]).text
        for key in ENTERS
        if result[key] is not None and result[f"u_{key}"] and (key == "U" or result[key])
    }


def _given(cells: Mapping[str, str]) -> dict[str, str]:
    """Scale and frame rate of the rig that is chosen, and f as typed."""
    known = _rigs(session.state_of_book()).get(cells.get("rig", ""), {})
    given = {key: known[key] for key in ("scale", "fps") if known.get(key)}
    typed = cells.get("f", "")
    if typed and live.refused_in("f", dict(cells)) is None:
        given["f"] = typed
    return given


@st.cache_data(max_entries=8, show_spinner=False)
def _rigs(state: str) -> dict[str, dict[str, str]]:
    return {item.code: dict(item.cells) for item in session.book().ask(on_shelf, "rig")}


def attach(book: Book, code: str, track: OnBench) -> str:
    """Attach the waiting file to the run that was logged; returns words for the message, kept where it was refused."""
    if track.dropped is None:
        return ""
    one = track.dropped
    done = session.attempt(
        lambda: book.attach_track(code, one.content, one.name, one.settings, by=session.handle()), ATTACH
    )
    st.session_state["bench:attach-of"] = code
    track_fields.done_with(PLACE)
    return f", U from {one.name}" if done else ""


def refused() -> None:
    """What became of a track that was not attached: its run stays, and is a link."""
    for sentence in session.refused(ATTACH).values():
        code = st.session_state.get("bench:attach-of", "")
        session.say_refused(f"{code} is logged, but its track is not attached: {sentence}")
        st.page_link(st.session_state["pages"]["runs"], label=f"{code}: drop it there", icon=":material/link:",
                     query_params={"run": code})  # fmt: skip
