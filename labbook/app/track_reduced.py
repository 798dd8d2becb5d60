"""A track reduced for a page: figures and charts, kept by the file's digest and the settings, refusals with them."""

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass, field, replace

import streamlit as st

from labbook.app import session
from labbook.book.attaching import result_of
from labbook.book.track_pages import TrackSheet, file_content
from labbook.book.track_settings import SETTINGS
from labbook.charts.track_along import along_chart, residual_chart
from labbook.charts.track_chart import path_chart, steps_chart
from labbook.errors import Refusal
from labbook.exchange.track_header import header_of
from labbook.exchange.track_reducing import Made, drift_of_track, reduce_track

ACCEPTED = "track:accepted"


@dataclass(frozen=True)
class Reduced:
    """What a page shows of a reduction: result by the names of a Reduction, finished chart specifications by name.

    charts: path, along, residual and, with a beat, steps; made: for attaching, without its frames; refused: (field,
    sentence) where nothing could be reduced.
    """

    result: dict = field(default_factory=dict)
    charts: dict[str, dict] = field(default_factory=dict)
    made: Made | None = None
    refused: tuple[str, str] | None = None


@dataclass(frozen=True)
class Dropped:
    """A file on the page and how it is to be reduced: settings as track_reducing.reduce_track takes them."""

    name: str
    content: bytes
    digest: str
    settings: dict


def digest_of(content: bytes) -> str:
    """The digest that the book will keep the file under."""
    return hashlib.sha256(content).hexdigest()


def of_dropped(dropped: Dropped, given: Mapping[str, str]) -> Reduced:
    """A dropped file reduced; given: what run and rig say of f, scale and fps."""
    asked = (json.dumps(one, sort_keys=True) for one in (dropped.settings, dict(given)))
    return _dropped(dropped.digest, dropped.name, *asked, session.is_dark(), dropped.content)


def accepted(dropped: Dropped, reduced: Reduced) -> None:
    """The book has this reduction now: its charts are not made once more for the run's record."""
    place = (dropped.digest, _complete(reduced.made.settings), session.is_dark())
    st.session_state[ACCEPTED] = (place, reduced)


def of_kept(track: TrackSheet) -> Reduced:
    """The track of a run, reduced again from its kept file as it was: for its charts."""
    settings = _complete(track.settings)
    place, reduced = st.session_state.get(ACCEPTED, (None, None))
    if place == (track.digest, settings, session.is_dark()):
        return reduced
    return _kept(track.digest, track.file, settings, session.is_dark())


def _complete(settings: Mapping) -> str:
    """What a track was reduced with, as one text."""
    return json.dumps({k: settings[k] for k in SETTINGS if k in settings}, sort_keys=True)


def drift_of_dropped(dropped: Dropped, settings: Mapping, given: Mapping[str, str]) -> tuple | str:
    """((vx, vy), (ux, uy)) in m/s of a drift track that was dropped; a sentence where it has none."""
    asked = (json.dumps(one, sort_keys=True) for one in (settings, dict(given)))
    return _drift(dropped.digest, dropped.name, *asked, dropped.content)


@st.cache_data(max_entries=24, show_spinner="Reading the drift's track …")
def _drift(digest: str, name: str, settings: str, given: str, _content: bytes) -> tuple | str:
    try:
        return drift_of_track(_content, name, json.loads(settings), json.loads(given))
    except Refusal as refusal:
        return str(refusal)


@st.cache_data(max_entries=24, show_spinner="Reducing the track …")
def _dropped(digest: str, name: str, settings: str, given: str, dark: bool, _content: bytes) -> Reduced:
    return _reduced(_content, name, json.loads(settings), json.loads(given), dark)


@st.cache_data(max_entries=24, show_spinner="Reading the track that is kept and drawing it …")
def _kept(digest: str, name: str, settings: str, dark: bool) -> Reduced:
    content = session.book().ask(file_content, digest)
    return _reduced(content, name, json.loads(settings), {}, dark)


def _reduced(content: bytes, name: str, settings: dict, given: dict, dark: bool) -> Reduced:
    try:
        made = reduce_track(content, name, settings, given)
    except Refusal as refusal:
        return Reduced(refused=(refusal.field, str(refusal)))
    found = made.reduction
    charts = {
        "path": path_chart(found, dark), "along": along_chart(found, dark), "residual": residual_chart(found, dark),
        "steps": steps_chart(found, dark),
    }  # fmt: skip
    specs = {k: chart.to_dict() for k, chart in charts.items() if chart is not None}
    return Reduced(result_of(found), specs, replace(made, reduction=replace(found, trace=None)))


@st.cache_data(max_entries=24, show_spinner="Reading the track's header …")
def header(digest: str, name: str, _content: bytes) -> tuple[list[str], str | None]:
    """(columns of the file, sentence that refuses it or None)."""
    try:
        return header_of(_content, name), None
    except Refusal as refusal:
        return [], str(refusal)
