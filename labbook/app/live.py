"""Bench's right side: strips and the trend so far, live as each field is left."""

from collections.abc import Mapping

import numpy as np
import pandas as pd
import streamlit as st

from labbook.app import session
from labbook.book.asking import Question
from labbook.book.bench_queries import siblings
from labbook.book.preview import Preview
from labbook.charts.strips import strips
from labbook.charts.trend import trend
from labbook.registry.catalogue import Number
from labbook.registry.quantities import RUN_KEYS
from labbook.registry.written import written

STRIPS = ("Sp", "Re_omega", "St", "Re")
PLOTS = {"U_scaled": "speed scaled by ω L θ₀²", "stride": "stride length"}


@st.cache_data(show_spinner=False, max_entries=200)
def _preview(state: str, cells: tuple[tuple[str, str], ...]) -> Preview:
    return session.book().preview(**dict(cells))


def preview(cells: dict[str, str]) -> Preview:
    """The numbers of what is typed so far; asked once for the same cells and book."""
    given = tuple(sorted((k, v) for k, v in cells.items() if v))
    return _preview(session.state_of_book(), given)


def refused_in(key: str, cells: dict[str, str]) -> str | None:
    """The sentence that refuses what stands in a field, None where it stands."""
    if not cells.get(key):
        return None
    some = {k: v for k, v in cells.items() if k in ("swimmer", "fluid", "rig", key)}
    return preview(some).refused.get(key)


def warnings(cells: dict[str, str], waiting: list[str]) -> None:
    """What logging would warn about, or did and waits for a touch, each once; and what is marked."""
    seen = preview(cells)
    said = list(dict.fromkeys(waiting or (sentence for _, sentence in seen.warned)))
    if "extrapolated" in seen.marks.get("mu", []):
        source = seen.sentences.get("mu_from", "viscosity")
        said.append(f"{source}: this temperature lies outside, the viscosity is extrapolated.")
    session.warn(said)
    if "mu" in seen.why_absent and cells.get("T") and not cells.get("f"):
        session.note(f"no mu: {seen.why_absent['mu']}")


@st.cache_data(show_spinner=False, max_entries=50)
def _earlier(state: str, swimmer: str) -> tuple[pd.DataFrame, list[str]]:
    book = session.book()
    family = book.ask(siblings, swimmer)
    keys = (*STRIPS, *PLOTS)
    return book.frame(Question(swimmers=family), keys=keys, texts=("code", "swimmer")), family


def panel(cells: dict[str, str]) -> None:
    """Strips of the numbers, then this swimmer's and its siblings' runs with the new point."""
    if not cells.get("swimmer"):
        return
    seen = preview(cells)
    earlier, family = _earlier(session.state_of_book(), cells["swimmer"])
    own = earlier[earlier["swimmer"] == cells["swimmer"]]
    rows = [
        {
            "key": key, "earlier": own[key].to_numpy(), "value": seen.values.get(key), "u": seen.u.get(key),
            "written": written(seen.values.get(key), seen.u.get(key)) or "–",
        }
        for key in STRIPS
    ]  # fmt: skip
    dark, registry = session.is_dark(), session.registry()
    st.altair_chart(strips(rows, dark, numbers=registry.numbers, regimes=registry.regimes.values()), theme=None, key="bench:strips")
    for line in lacking(cells, seen, registry.numbers):
        session.note(line)
    if seen.regimes:
        session.tags(seen.regimes)
    _trend(cells, seen, earlier, dark)


def lacking(cells: dict[str, str], seen: Preview, numbers: Mapping[str, Number]) -> list[str]:
    """'Sp, Re_ω: needs rho: …' for the strips that stay empty although all that they take from the form is typed."""
    if not (cells.get("f") and cells.get("T")):
        return []
    found: dict[str, list[str]] = {}
    for key in STRIPS:
        typed = all(cells.get(k) for k in numbers[key].inputs if k in RUN_KEYS and k != "B")
        if seen.values.get(key) is None and key in seen.why_absent and typed:
            found.setdefault(seen.why_absent[key], []).append(numbers[key].symbol)
    return [f"{', '.join(symbols)}: {why}" for why, symbols in found.items()]


def _trend(cells, seen: Preview, earlier: pd.DataFrame, dark: bool) -> None:
    up = "U_scaled" if earlier["U_scaled"].notna().any() or seen.values.get("U_scaled") else "stride"
    new = {k: seen.values.get(k) for k in ("Sp", up)}
    in_hand = None
    if all(v is not None and np.isfinite(v) for v in new.values()):
        in_hand = {"x": new["Sp"], "y": new[up], "u_x": seen.u["Sp"], "u_y": seen.u[up]}
    if earlier["Sp"].notna().any() or in_hand:
        drawn = trend(earlier, x="Sp", y=up, group="swimmer", in_hand=in_hand, dark=dark, height=300)
        st.altair_chart(drawn.chart, theme=None, key="bench:trend")
        st.caption(drawn.caption)
    else:
        missing = seen.why_absent.get("Sp")
        session.note(f"Sp of this swimmer cannot be placed yet: {missing}" if missing else
                     "no earlier run of this swimmer or its siblings")
