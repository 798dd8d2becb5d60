"""A track on Bench: dropped beside what was seen, shown at once, attached to the trial when that is logged."""

from collections.abc import Mapping
from dataclasses import dataclass, field

import streamlit as st

from labbook.api import Book
from labbook.app import live, session, track_fields, track_shown
from labbook.app.track_reduced import Dropped, Reduced, accepted
from labbook.book.shelf_pages import on_shelf
from labbook.registry.typed import printed, read, reduced

PLACE = "bench"
ATTACH = "bench:attach"
OPENED = "bench:track-opened"
WAITS = "bench:attach-waits"  # the run that was logged last with a track, and the track
ENTERS = ("U", "A_tip")  # f is what was set


@dataclass(frozen=True)
class OnBench:
    """The file that waits for the trial, None for none; cells: U and A_tip as it says them, for the live numbers."""

    dropped: Dropped | None = None
    cells: dict[str, str] = field(default_factory=dict)
    reduced: Reduced = field(default_factory=Reduced)


def offer(cells: Mapping[str, str]) -> OnBench:
    """The drop zone; of a file the speed, and the fields that adjust it."""
    dropped = track_fields.file_dropped(PLACE, "or drop a track")
    if dropped is None:
        return OnBench()
    session.forget(ATTACH)  # what waited from the trial before is answered by the next file
    if track_fields.refusals(PLACE):  # and it stays open when they are mended
        st.session_state[OPENED] = True
    with st.expander("columns, axis, trim, drift", expanded=st.session_state.get(OPENED, False)):
        found = track_fields.adjusted(PLACE, dropped, _given(cells), across=3)
    if found is None:
        return OnBench(dropped)
    dropped, shown = found
    session.note(f"U {track_shown.speed(shown.result)} · {dropped.name}: replaces a typed U when the trial is logged; "
                 "both are kept.")  # fmt: skip
    return OnBench(dropped, _cells(shown.result), shown)


def chart(track: OnBench) -> None:
    """The position along the axis with its fit, small."""
    track_shown.chart(track.reduced.charts, "along", PLACE)


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
        given["f"] = printed("f", read("f", typed))  # as the run will say it
    return given


@st.cache_data(max_entries=8, show_spinner=False)
def _rigs(state: str) -> dict[str, dict[str, str]]:
    return {item.code: dict(item.cells) for item in session.book().ask(on_shelf, "rig")}


def attach(book: Book, code: str, track: OnBench) -> str:
    """Attach the waiting file to the run that was logged; returns words for the message, kept where it was refused."""
    if track.dropped is None:
        return ""
    track_fields.done_with(PLACE)
    return _attach(book, code, track, False)


def _attach(book: Book, code: str, track: OnBench, confirm: bool) -> str:
    one, st.session_state[WAITS] = track.dropped, (code, track)
    done = session.attempt(
        lambda: book.attach_track(code, one.content, one.name, one.settings, by=session.handle(), confirm=confirm,
                                  made=track.reduced.made), ATTACH,
    )  # fmt: skip
    if not done:
        return ""
    accepted(one, track.reduced)
    return f", U from {one.name}"


def refused() -> None:
    """What became of a track that was not attached: its run stays, and is a link; a warning waits for a touch."""
    code, track = st.session_state.get(WAITS, ("", None))
    doubts = session.warned(ATTACH)
    if doubts:
        session.warn([f"{code} is logged, and its track waits for one more touch.", *doubts])
        if st.button("It is right, attach the track", type="primary", key="bench:attach-anyway"):
            more = _attach(session.book(), code, track, True)
            session.keep_message(f"{code} has its track{more}")
            st.rerun()
    for sentence in session.refused(ATTACH).values():
        session.say_refused(f"{code} is logged, but its track is not attached: {sentence}")
    if session.refused(ATTACH):
        st.page_link(st.session_state["pages"]["runs"], label=f"{code}: drop it there", icon=":material/link:",
                     query_params={"run": code})  # fmt: skip
