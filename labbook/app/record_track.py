"""A run's track on its record: what it said and its file; dropping one, adjusting it, accepting what it says."""

from collections.abc import Mapping

import streamlit as st

from labbook.app import session, track_fields, track_shown
from labbook.app.track_reduced import Dropped, Reduced, accepted, of_kept
from labbook.book.attaching import conditions
from labbook.book.reduced_cells import DIGEST_SHOWN, REDUCIBLE, handy
from labbook.book.run_sheet import RunSheet, moment_in_words
from labbook.book.track_pages import TrackSheet, file_content
from labbook.registry.typed import Typed, printed

DROP = "Drop a track: CSV or Parquet with t or frame, x and y"
SYMBOLS = {"U": "U", "A_tip": "A_tip", "f": "f"}


# ---- the track that there is


def show(sheet: RunSheet, place: str) -> None:
    """The run's track: file, who and when, settings, figures, charts, the file as it was dropped."""
    track = sheet.track
    if track is None:
        return
    st.markdown("**Track**")
    when = f"{moment_in_words(track.at)} by {track.by}"
    session.note(f"{track.code} · {track.file} · SHA-256 {track.digest[:DIGEST_SHOWN]} · {when} · {settings_in_words(track)}")
    session.warn([f"{sentence[:1].upper()}{sentence[1:]}." for sentence in track.stale])
    left, right = st.columns([38, 62], gap="medium")
    with left:
        track_shown.told(track.result)
        st.download_button(
            f"The file as it was dropped ({_size(track.size)})",
            lambda: session.book().ask(file_content, track.digest), track.file, "application/octet-stream",
            on_click="ignore", key=f"{place}:track-file", icon=":material/download:",
        )  # fmt: skip
    with right:
        drawn = of_kept(track)
        if drawn.refused:
            session.say_refused(f"No charts: {drawn.refused[1]}")
        else:
            track_shown.charts(drawn.charts, f"{place}:kept")
            track_shown.explained(track.result)


def settings_in_words(track: TrackSheet) -> str:
    """'scale 21.4(1) um/px of the rig, f 0.56 Hz of the run, axis auto, trim auto' and the like."""
    told, taken = track.settings, track.settings.get("taken", {})
    said = []
    for key, name in (("scale", "scale"), ("fps", "frame rate"), ("f", "f")):
        if told.get(key):
            said.append(f"{name} {told[key]}" + (f" of the {taken[key]}" if key in taken else ""))
    said += [f"{key} {told.get(key) or 'auto'}" for key in ("axis", "trim")]
    if told.get("drift"):
        said.append(f"drift {_drift(told['drift'])}" + (f" from {told['drift_from']}" if told.get("drift_from") else ""))
    if told.get("still"):
        said.append(f"drift from the still stretch {_stretch(told['still'])}")
    return ", ".join(said)


def _drift(told) -> str:
    if isinstance(told, str):
        return told
    return track_shown.velocity(told)


def _stretch(told) -> str:
    return told if isinstance(told, str) else "{:g} to {:g} s".format(*told)


def _size(size: int) -> str:
    return f"{size / 2**20:.1f} MB" if size >= 2**20 else f"{max(size / 1024, 0.1):.1f} kB"


def replaced(sheet: RunSheet, key: str) -> str | None:
    """What was typed where the track's value stands now; '' where nothing was; None where it is typed."""
    if sheet.track is None or key not in sheet.track.accepted:
        return None
    entry = sheet.track.replaced.get(key)
    return printed(key, Typed(*entry)) if entry else ""


# ---- a new one


def drop(sheet: RunSheet, place: str) -> str | None:
    """The drop zone, the settings, what they give, and accepting it; returns what to say once it is done."""
    dropped = track_fields.file_dropped(place, DROP)
    if dropped is None:
        session.note("Nothing enters the run before you accept it.")
        return None
    given = _given(session.state_of_book(), sheet.texts["code"])
    found = track_fields.adjusted(place, dropped, given, across=6)
    if found is None:
        return None
    dropped, reduced = found
    left, right = st.columns([38, 62], gap="medium")
    with left:
        track_shown.told(reduced.result)
        done = _accept(sheet, place, dropped, reduced)
    with right:
        track_shown.charts(reduced.charts, track_fields.version(place))
        track_shown.explained(reduced.result)
    return done


@st.cache_data(max_entries=32, show_spinner=False)
def _given(state: str, code: str) -> dict[str, str]:
    return conditions(session.book().engine, code)


def _accept(sheet: RunSheet, place: str, dropped: Dropped, reduced: Reduced) -> str | None:
    """Which of U, A_tip and f enter the run, and the touch that does it: two where something is far off."""
    at, code, result = track_fields.version(place), sheet.texts["code"], reduced.result
    chosen = []
    for key, names in REDUCIBLE.items():
        there = all(result[name] for name in names) if key != "U" else bool(result["u_U"])
        if st.checkbox(_offer(sheet, key, result, there), there, key=f"{at}:take:{key}:{there}", disabled=not there) and there:
            chosen.append(key)
    why = ""
    if sheet.track is not None:
        why = st.text_input("Why, for the ledger", key=f"{at}:why", placeholder=f"takes the place of {sheet.track.file}")
    act, of = f"{place}:attach", (dropped.digest, str(dropped.settings), chosen)
    if st.session_state.get(f"{act}:of") != of:  # what was said of another track or choice
        session.forget(act)
    waiting = session.warned(act)
    session.warn(waiting)
    if st.button("It is right, accept" if waiting else "Accept", type="primary", key=f"{at}:accept"):
        st.session_state[f"{act}:of"] = of
        if not session.attempt(
            lambda: session.book().attach_track(
                code, dropped.content, dropped.name, dropped.settings, chosen, by=session.handle(), why=why or None,
                confirm=bool(waiting), made=reduced.made,
            ), act,
        ):  # fmt: skip
            st.rerun()
        accepted(dropped, reduced)
        return f"{code}: {', '.join(chosen)} now {'come' if len(chosen) > 1 else 'comes'} from {dropped.name}; " \
               "what was typed is kept beside."  # fmt: skip
    for sentence in session.refused(act).values():
        session.say_refused(sentence)
    return None


def _offer(sheet: RunSheet, key: str, result: Mapping, there: bool) -> str:
    """'U 0.0512(4) mm/s (typed 0.051(3) mm/s)'."""
    value, u = (result[name] for name in REDUCIBLE[key])
    if not there:
        why = "as given, not from the track" if key == "f" and value is not None else "not in this track"
        return f"{SYMBOLS[key]}: {why}"
    text, typed = handy(key, value, u), typed_text(sheet, key)
    return f"{SYMBOLS[key]} {text}" + (f" (typed {typed})" if typed else " (nothing was typed)")


def typed_text(sheet: RunSheet, key: str) -> str:
    """What was typed for a key, behind a track too; empty where nothing was."""
    before = replaced(sheet, key)
    if before is not None:
        return before
    return printed(key, Typed(*sheet.typed[key])) if key in sheet.typed else ""
