"""Numbers, the editor of regimes: fields, what a band would do as its field is left, saving, withdrawing."""

from collections.abc import Mapping
from dataclasses import replace

import streamlit as st

from labbook.app import session
from labbook.app.numbers_regimes_cover import show, show_both
from labbook.book.asking import Question
from labbook.book.clock import local
from labbook.book.ledger import reason
from labbook.book.queries import count
from labbook.book.registry_effects import count_in
from labbook.charts.palette import REGIME_HUES
from labbook.errors import Refusal, Refusals
from labbook.registry.group import Registry
from labbook.registry.regime_text import FIELDS, band_words, pretty, read_regime, tried_regime
from labbook.registry.regimes import COLOURS, REGIMES, Regime, from_content

NEW, ANY = "", ""
LABELS = {"name": "Name", "band": "Band", "second": "Second band, on another number (if any)",
          "source": "Source of the limits", "why": "Why"}  # fmt: skip
EXAMPLES = {"name": "soft tail", "band": "4 < Sp <= 10", "second": "Re_omega < 0.1",
            "source": "a paper, or: common practice, no source", "why": "kept in the ledger"}  # fmt: skip
# each colour's hue beside its name, all in reach without scrolling sideways
SWATCHES = "<style>" + "".join((
    '[class*="st-key-regimes-colour"] [role="radiogroup"] { flex-wrap: wrap; mask-image: none; }',
    '[class*="st-key-regimes-colour"] button { border-radius: 0.4rem; }',
    *(f'[class*="st-key-regimes-colour"] button:nth-of-type({i}) '
      f"{{ box-shadow: inset 0.9rem 0 0 0 {REGIME_HUES[name]}; padding-left: 1.4rem; }}"
      for i, name in enumerate(COLOURS, start=2)),
)) + "</style>"  # fmt: skip


def choose(name: str) -> None:
    """Put a regime into the editor, by its address; for callbacks."""
    session.set_address(edit=name or None)


def editor(registry: Registry, held: Mapping[str, int], told: Mapping[str, list[dict]]) -> None:
    """The editor of one regime, or of a new one; held: kept runs in each, told: stored versions of each."""
    name = _chosen(registry)
    version = st.session_state.get("regimes:version", 0)
    place = f"regimes:{version}:{name}"
    _fill(place, registry.regimes.get(name))
    wanted = [f for f in FIELDS if f != "name" or name == NEW]
    cells = _cells(place, name)
    said = _said(place, cells, registry, name)
    for field in wanted:
        _field(field, place)
        if field in said:
            session.say_refused(said[field])
    st.text_input(LABELS["why"], key=f"{place}:why", placeholder=EXAMPLES["why"])
    for field in ("why", *(f for f in said if f not in (*wanted, "why"))):
        if field in said:
            session.say_refused(said[field])
    with st.container(horizontal=True):
        st.button("Change the regime" if name else "Add the regime", type="primary", key=f"{place}:save",
                  on_click=_save, args=(place, name))  # fmt: skip
        if name:
            st.button("Withdraw it", key=f"{place}:withdraw", on_click=_withdraw, args=(place, name))
    _preview(cells, registry, held, name)
    if name:
        _versions(name, told.get(name, []), registry)


def _chosen(registry: Registry) -> str:
    """The regime in the address, and the box that chooses it."""
    name = session.address("edit", NEW)
    if name and name not in registry.regimes:
        session.say_refused(f"regime {name!r}: the registry has no such regime; a new one is shown.")
        name = NEW
    st.session_state["regimes:chosen"] = name
    st.selectbox("Regime", [NEW, *registry.regimes], key="regimes:chosen",
                 format_func=lambda n: n or "a new one",
                 on_change=lambda: choose(st.session_state["regimes:chosen"]))  # fmt: skip
    return name


def _fill(place: str, regime: Regime | None) -> None:
    """What stands in the fields before anything is typed."""
    start = dict.fromkeys((*FIELDS, "why"), "")
    if regime is not None:
        bands = [b.words for b in regime.bands]
        start |= {"band": bands[0], "second": bands[1] if len(bands) > 1 else "", "source": regime.source,
                  "colour": regime.colour}  # fmt: skip
    for field, text in start.items():
        st.session_state.setdefault(_key(place, field), text)


def _key(place: str, field: str) -> str:
    # a colour's key is a class on the page too, by which its swatches are found
    return f"regimes-colour:{place}" if field == "colour" else f"{place}:{field}"


def _cells(place: str, name: str) -> dict[str, str]:
    found = {f: str(st.session_state.get(_key(place, f)) or "").strip() for f in (*FIELDS, "why")}
    return found | ({"name": name} if name else {})


def _said(place: str, cells: dict[str, str], registry: Registry, name: str) -> dict[str, str]:
    """Field -> refusal: of the last attempt while its cells stand, and of what is typed but unreadable."""
    said = dict(session.refused(place)) if st.session_state.get(f"{place}:asked") == cells else {}
    for finding in _findings(cells, registry, name):
        if cells.get(finding.field):
            said[finding.field] = str(finding)
    return said


def _findings(cells: dict[str, str], registry: Registry, name: str) -> list[Refusal]:
    try:
        _read(cells, registry, name)
    except Refusals as several:
        return several.findings
    except Refusal as refusal:
        return [refusal]
    return []


def _read(cells: dict[str, str], registry: Registry, name: str) -> Regime:
    return read_regime({f: cells[f] for f in FIELDS}, registry.numbers, () if name else registry.regimes)


def _field(field: str, place: str) -> None:
    if field == "colour":
        st.html(SWATCHES)
        st.pills("Colour of the band", [ANY, *COLOURS], key=_key(place, field),
                 format_func=lambda c: c or "automatic")  # fmt: skip
        return
    st.text_input(LABELS[field], key=_key(place, field), placeholder=EXAMPLES[field])


def _save(place: str, name: str) -> None:
    cells, registry = _cells(place, name), session.registry()

    def act():
        found = _findings(cells, registry, name)
        try:
            reason(cells["why"])
        except Refusal as refusal:
            found.append(refusal)
        if found:
            raise Refusals(found)
        regime = _read(cells, registry, name)
        before, now = session.book().set_regime(regime, why=cells["why"], by=session.handle())
        words = pretty(regime.words, registry.numbers)
        session.keep_message(f"{regime.name} is {words}: {_runs(before)} before, {now} now")
        choose(regime.name)

    _attempt(act, place, cells)


def _withdraw(place: str, name: str) -> None:
    cells = _cells(place, name)
    held = session.book().ask(count, Question(regimes=(name,)))

    def act():
        session.book().withdraw("regime", name, why=cells["why"], by=session.handle())
        session.keep_message(f"{name} is withdrawn: {_runs(held)} lay in it; its versions stay in the book")
        choose(NEW)

    _attempt(act, place, cells)


def _attempt(act, place: str, cells: dict[str, str]) -> None:
    """One attempt; done, the next filling of the fields starts afresh and a second touch finds nothing."""
    if place.split(":")[1] != str(st.session_state.get("regimes:version", 0)):
        return
    if session.attempt(act, place):
        st.session_state["regimes:version"] = st.session_state.get("regimes:version", 0) + 1
    st.session_state[f"{place}:asked"] = cells


def _runs(n: int) -> str:
    return f"{n} kept run{'s' if n != 1 else ''}"


@st.cache_data(max_entries=64, show_spinner="Counting the runs in the band")
def _counted(state: str, content: dict) -> tuple[int, int]:
    """Kept runs that lie in a regime of this content, and kept runs in all."""
    book = session.book()
    return book.ask(count_in, from_content(content)), book.ask(count, Question())


def _preview(cells: dict[str, str], registry: Registry, held: Mapping[str, int], name: str) -> None:
    """What the bands read as, how many runs they would hold, and what they do beside the others."""
    tried = tried_regime(cells, registry.numbers)
    if tried is None:
        session.note("With a band, its runs and its place among the others show here.")
        return
    session.note("Reads: " + ", and ".join(band_words(b, registry.numbers) for b in tried.bands) + ".")
    then, total = _counted(session.state_of_book(), tried.content())
    now = f"; {held.get(name, 0)} lie in {name} as it stands" if name else ""
    session.note(f"{then} of {total} kept runs would lie in it{now}.")
    others = {n: r for n, r in registry.regimes.items() if n != name}
    if tried.name in others:  # refused at its field; beside its namesake it would be mistaken for it
        tried = replace(tried, name="this regime")
    if len(tried.bands) == 1:
        show(tried.bands[0].number, [*others.values(), tried], registry.numbers, tried.name)
        return
    show_both(tried, registry.numbers)
    session.note("A regime on two numbers is meant to lie across the others: overlap and gap leave it out.")


def _versions(name: str, stored: list[dict], registry: Registry) -> None:
    """Every version of a regime, newest first."""
    rows = [
        (
            str(v["version"]),
            f"{v['by']}, {local(v['at']):%Y-%m-%d}",
            _bands(v["content"], registry),
            v["why"] or "",
        )
        for v in stored
    ]
    if name in REGIMES:
        rows.append(("1", "with labbook", pretty(REGIMES[name].words, registry.numbers), ""))
    session.table(("version", "who, when", "bands", "why"), rows)


def _bands(content: dict | None, registry: Registry) -> str:
    return pretty(from_content(content).words, registry.numbers) if content else "withdrawn"
