"""Shelf: what we have, as four lists with pictures; one record opened; adding one, or a whole sheet."""

import html

import pandas as pd
import streamlit as st

from labbook.app import ledger_rows, session, shelf_forms, shelf_item, shelf_loading
from labbook.book.bench_queries import age
from labbook.book.shelf_pages import OnShelf, on_shelf

KINDS = {"fluid": "Fluids", "material": "Materials", "swimmer": "Swimmers", "rig": "Rigs"}
CARD = 476  # pixels: two stand side by side on a tablet, three on a desk
PAGE = 12
EMPTY = {
    "fluid": "No fluid yet. Add the batch you mix first, then its viscosity at two to six temperatures, "
             "each with its date: every run takes the reading nearest to its day.",
    "material": "No material yet. Add the batch you cast, then its modulus from a sag, ring-down or "
                "tensile test.",
    "swimmer": "No swimmer yet. Add one build: lengths, section, head, and the material batch it was cast "
               "from. A trimmed tail is a new swimmer that names its parent.",
    "rig": "No rig yet. Add the coil pair or motor with its calibration, camera scale and stated "
           "uncertainties: runs that type none take these.",
}  # fmt: skip


@st.cache_data(max_entries=16, show_spinner="Reading the shelf")
def records(state: str, kind: str) -> list[OnShelf]:
    """Every record of a kind, as long as the book stays as it is."""
    return session.book().ask(on_shelf, kind)


def page() -> None:
    """The page."""
    kind = session.address("kind", "fluid")
    if kind not in KINDS:
        session.say_refused(f"kind {kind!r}: not understood; the shelf has {', '.join(KINDS)}.")
        kind = "fluid"
    _bar(kind)
    if session.address("add") == "sheet":
        shelf_loading.page()
        return
    if session.address("add"):
        st.html(f'<h2 style="margin:0 0 0.4rem 0">A new {kind}</h2>')
        shelf_forms.add_record(kind)
        return
    items = records(session.state_of_book(), kind)
    code = session.address("item")
    found = next((i for i in items if i.code == code), None)
    if code and found is None:
        session.say_refused(f"item {code!r}: the book has no such {kind}.")
    if found is not None:
        shelf_item.page(found)
    elif items:
        _list(kind, items)
    else:
        _teach(kind)


def _bar(kind: str) -> None:
    """Which list, and the ways to fill it."""
    st.session_state["shelf:kind"] = kind

    def choose():
        session.set_address(kind=st.session_state["shelf:kind"] or kind, item=None, add=None, page=None)

    def add(what):
        session.forget(f"add:{what}")  # the form opens empty, and so without what it refused last time
        session.set_address(kind=kind, add=what, item=None)

    with st.container(horizontal=True, vertical_alignment="center"):
        st.segmented_control("List", list(KINDS), key="shelf:kind", format_func=KINDS.get, on_change=choose,
                             label_visibility="collapsed")  # fmt: skip
        if session.address("add") or session.address("item"):
            st.button(
                f"All {KINDS[kind].lower()}", key="shelf:all", icon=":material/arrow_back:", on_click=choose
            )
        if session.address("add") != kind:
            st.button(f"Add a {kind}", key="shelf:add", icon=":material/add:", on_click=add, args=(kind,))
        if session.address("add") != "sheet":
            st.button(
                "Load sheets", key="shelf:load", icon=":material/upload:", on_click=add, args=("sheet",)
            )


def _teach(kind: str) -> None:
    st.html(f'<h2 style="margin:0 0 0.4rem 0">The shelf holds no {kind} yet</h2>')
    st.write(EMPTY[kind])
    session.note("A whole shelf folder or workbook can be loaded at once with Load sheets; labbook demo "
                 "opens an invented group's year to look around in.")  # fmt: skip


def _list(kind: str, items: list[OnShelf]) -> None:
    pages = -(-len(items) // PAGE)
    here = min(max(_whole(session.address("page", "1")), 1), pages)
    with st.container(horizontal=True):
        for item in items[(here - 1) * PAGE : here * PAGE]:
            with st.container(width=CARD, border=True, key=f"shelf:card:{kind}:{item.code}"):
                _card(item)
    if pages > 1:
        _turn(here, pages, len(items))


def _whole(text: str) -> int:
    return int(text) if text.isdecimal() and len(text) < 7 else 1


def _turn(here: int, pages: int, total: int) -> None:
    def go(n):
        session.set_address(page=str(n))

    with st.container(horizontal=True, vertical_alignment="center"):
        st.button("Newer", key="shelf:newer", disabled=here == 1, on_click=go, args=(here - 1,))
        st.button("Older", key="shelf:older", disabled=here == pages, on_click=go, args=(here + 1,))
        session.note(f"{(here - 1) * PAGE + 1} to {min(here * PAGE, total)} of {total}")


def _card(item: OnShelf) -> None:
    with st.container(horizontal=True, vertical_alignment="center", horizontal_alignment="distribute"):
        st.page_link(st.session_state["pages"]["shelf"], label=f"**{ledger_rows.plain(item.code)}**",
                     query_params={"kind": item.kind, "item": item.code})  # fmt: skip
        shelf_item.runs_link(item)
    st.html(f'<div class="lb-note">{html.escape(" · ".join(_facts(item)))}</div>')
    shelf_item.picture(item, height=240, width=CARD - 36)
    if item.kind in ("fluid", "material"):
        session.note(_read(item))


def _facts(item: OnShelf) -> list[str]:
    cells = item.cells
    facts = ["retired"] if item.retired else []
    match item.kind:
        case "fluid":
            facts += [cells["kind"], *(cells[c] for c in ("glycerol", "grade") if c in cells)]
        case "material":
            facts += [
                cells.get("kind", ""),
                f"density {cells['rho_s']}" if "rho_s" in cells else "no density",
            ]
        case "swimmer":
            facts += [
                cells["form"],
                cells.get("material", "no material"),
                f"cut from {cells['parent']}" if "parent" in cells else "",
            ]
        case "rig":
            facts += [cells.get("kind", "")]
    dated = next((c for c in ("made", "built", "calibrated") if cells.get(c)), None)
    facts.append(f"{dated} {cells[dated]}, {age(cells[dated])}" if dated else "undated")
    return [f for f in facts if f]


def _read(item: OnShelf) -> str:
    keys = ("mu", "nu") if item.kind == "fluid" else ("E",)
    what = "viscosity" if item.kind == "fluid" else "modulus"
    n = len(item.kept(*keys))
    if not n:
        return f"no {what} reading yet"
    days = pd.unique(pd.Series([r.on or "undated" for r in item.kept(*keys)]))
    last = item.last(*keys)
    return f"{n} {what} reading{'s' if n != 1 else ''} on {len(days)} day{'s' if len(days) != 1 else ''}" + (
        f", the last {age(last)}" if last else ", undated"
    )
