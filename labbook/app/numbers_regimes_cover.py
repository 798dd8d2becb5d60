"""Numbers, regimes over one axis: the strip with bands and runs, in words what is covered twice or not."""

from collections.abc import Iterable, Mapping
from dataclasses import replace

import numpy as np
import streamlit as st

from labbook.app import session
from labbook.app.numbers_strip import coverage_html
from labbook.book.asking import Question
from labbook.book.queries import frame
from labbook.registry.catalogue import Number
from labbook.registry.regime_coverage import Stretch, covered, gaps, overlaps
from labbook.registry.regime_text import pretty
from labbook.registry.regimes import Regime

MOST_TICKED = 5_000  # runs whose values stand as ticks: along a strip more fall together anyway


@st.cache_data(max_entries=8, show_spinner="Placing the book's runs")
def values_of(state: str, keys: tuple[str, ...]) -> dict[str, np.ndarray]:
    """The values of some numbers among the newest kept runs."""
    table = session.book().ask(frame, Question(), keys=keys, texts=(), spread=False, newest=MOST_TICKED)
    return {key: table[key].to_numpy() for key in keys}


def show(key: str, regimes: Iterable[Regime], numbers: Mapping[str, Number], chosen: str = "") -> None:
    """The strip of a number under some regimes, and sentences on their coverage; `chosen` is outlined."""
    regimes = list(regimes)
    values = values_of(session.state_of_book(), tuple(numbers))[key]
    st.html(coverage_html(key, values, session.is_dark(), regimes, chosen))
    for line in coverage_lines(key, regimes, numbers):
        session.note(line)


def show_both(regime: Regime, numbers: Mapping[str, Number]) -> None:
    """A regime on two numbers: the band of each on a strip of its own, under the number's symbol."""
    values = values_of(session.state_of_book(), tuple(numbers))
    for band in regime.bands:
        alone = replace(regime, bands=(band,))
        session.note(f"{numbers[band.number].symbol}:")
        st.html(coverage_html(band.number, values[band.number], session.is_dark(), [alone], regime.name))


def coverage_lines(key: str, regimes: Iterable[Regime], numbers: Mapping[str, Number]) -> list[str]:
    """What the regimes on a number alone cover twice, what not at all; else how far they reach."""
    mine = [r for r in regimes if r.numbers == (key,)]
    reach = covered(mine, key)
    if not reach:
        return []
    found = [_said(s, numbers) for s in (*overlaps(mine, key), *gaps(mine, key))]
    together = "{} alone is covered." if len(mine) == 1 else "Together they cover {}, without overlap or gap."
    found = found or [together.format(pretty(reach, numbers))]
    if any(r.bands[0].high <= 0 for r in mine):
        found.append("A band at or below zero has no place on the log axis; its runs count all the same.")
    return found


def _said(stretch: Stretch, numbers: Mapping[str, Number]) -> str:
    sentence = stretch.sentence.replace(stretch.words, pretty(stretch.words, numbers))
    return f"{sentence[0].upper()}{sentence[1:]}."
