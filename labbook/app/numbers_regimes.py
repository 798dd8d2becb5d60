"""Numbers, regimes: the bands by number, each with colour, source, version and runs, and their coverage."""

import html
from collections.abc import Iterable, Mapping

import streamlit as st

from labbook.app import numbers_regimes_editor, session
from labbook.app.numbers_regimes_cover import MOST_TICKED, show, show_both
from labbook.app.numbers_strip import hues, swatch_html
from labbook.book.clock import local
from labbook.book.registry_effects import history
from labbook.registry.group import Registry
from labbook.registry.regime_text import pretty
from labbook.registry.regimes import REGIMES, Regime

RULE = '<hr style="margin:0.4rem 0;border:none;border-top:1px solid rgba(128,128,128,0.25)">'


@st.cache_data(max_entries=8, show_spinner=False)
def _history(state: str) -> dict[str, list[dict]]:
    return session.book().ask(history, "regime")


def part(held: Mapping[str, int]) -> None:
    """The regimes and their editor; held: kept runs in each regime."""
    registry, told = session.registry(), _history(session.state_of_book())
    session.note(
        "Ranges and regimes are always read in the group's house dialect, on the signed value. Counts are "
        "kept runs. On the strips hatched ground is covered twice, dashed ground between two bands by "
        f"none; ticks are up to {MOST_TICKED} of the newest kept runs."
    )
    left, right = st.columns([57, 43], gap="medium")
    with right:
        numbers_regimes_editor.editor(registry, held, told)
    with left:
        _groups(registry, held, told)
        _withdrawn(registry, told)


def _groups(registry: Registry, held, told) -> None:
    regimes = registry.regimes.values()
    for key, number in registry.numbers.items():
        mine = [r for r in regimes if r.numbers == (key,)]
        if mine:
            symbol = "" if "/" in number.symbol else f" {number.symbol}"
            _head(f"{number.name}{symbol}", key)
            show(key, mine, registry.numbers)
            _rows(mine, hues(mine), registry, held, told)
    both = [r for r in regimes if len(r.bands) == 2]
    if both:
        _head("on two numbers, where both bands must hold", "")
    for regime in both:
        show_both(regime, registry.numbers)
        _rows([regime], hues([regime]), registry, held, told)
    if not registry.regimes:
        session.note("No regime stands in this registry: add one beside.")


def _head(text: str, key: str) -> None:
    code = f" <code>{html.escape(key)}</code>" if key else ""
    st.html(f"{RULE}<b>{html.escape(text)}</b>{code}")


def _rows(regimes: Iterable[Regime], colours: Mapping[str, str], registry: Registry, held, told) -> None:
    for regime in sorted(regimes, key=lambda r: (r.bands[0].low, r.bands[0].high)):
        words, acts = st.columns([66, 34], vertical_alignment="center")
        words.html(_told(regime, colours[regime.name], registry, told.get(regime.name, [])))
        with acts, st.container(horizontal=True, gap="small", vertical_alignment="center"):
            n = held.get(regime.name, 0)
            st.page_link(
                st.session_state["pages"]["runs"], label=f"{n} run{'s' if n != 1 else ''}", disabled=not n,
                query_params={"regime": regime.name},
            )  # fmt: skip
            st.button("Change", key=f"regimes:change:{regime.name}", type="tertiary",
                      on_click=numbers_regimes_editor.choose, args=(regime.name,))  # fmt: skip


def _told(regime: Regime, hue: str, registry: Registry, versions: list[dict]) -> str:
    """A regime as HTML: swatch, name and band, then colour, version and source."""
    version = versions[0]["version"] if versions else 1
    since = (
        f", {versions[0]['by']}, {local(versions[0]['at']):%Y-%m-%d}" if versions else ", came with labbook"
    )
    colour = f"{regime.colour}; " if regime.colour else ""
    return (
        f"<div>{swatch_html(hue)}<b>{html.escape(regime.name)}</b>&ensp;"
        f"{html.escape(pretty(regime.words, registry.numbers))}</div>"
        f'<div class="lb-note">{html.escape(colour)}version {version}{html.escape(since)}; '
        f"{html.escape(regime.source)}</div>"
    )


def _withdrawn(registry: Registry, told: Mapping[str, list[dict]]) -> None:
    gone = [name for name in {**REGIMES, **told} if name not in registry.regimes and name in told]
    for name in gone:
        last = told[name][0]
        session.note(
            f"Withdrawn: {name}, by {last['by']} on {local(last['at']):%Y-%m-%d}, because: {last['why']}. "
            "A new regime of this name brings it back."
        )
