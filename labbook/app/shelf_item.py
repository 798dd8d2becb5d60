"""One record of the shelf, opened: picture, everything as typed, readings, ledger lines, the acts on it."""

import streamlit as st

from labbook.app import cautions, ledger_rows, session, shelf_fields, shelf_forms, shelf_stiffness
from labbook.book.bench_queries import age
from labbook.book.cautions import of_record
from labbook.book.curves import viscosity_frames
from labbook.book.records import KINDS
from labbook.book.shelf_pages import OnShelf, item_lines, modulus_frame, of_material
from labbook.charts.drawings import swimmer_drawing
from labbook.charts.fluid_chart import modulus_chart, viscosity_chart
from labbook.errors import Refusal
from labbook.registry.quantities import QUANTITIES

PLURAL = {"fluid": "runs in it", "material": "runs with it", "swimmer": "runs with it", "rig": "runs on it"}
HEADING = '<h3 style="margin:0.6rem 0 0.3rem 0">{}</h3>'
FULL = 300  # pixels: the picture of an opened record; a card's is lower
STATED = ("u_f", "u_theta0", "u_B", "u_T")


@st.cache_data(max_entries=400, show_spinner="Drawing the shelf")
def _spec(
    told: str, kind: str, code: str, dark: bool, height: int, width: int, _item: OnShelf
) -> dict | None:
    """The picture of a record as Vega-Lite, None where there is nothing to draw yet.

    told: the record in words, so that a picture lasts until its own record changes.
    """
    if kind == "fluid":
        readings, curves = session.book().ask(viscosity_frames, code)
        if readings.empty and curves.empty:
            return None
        if height < FULL:
            # a card is small, and each point costs time on its way into the chart; ends are kept
            curves = curves[curves.groupby("set", dropna=False).cumcount() % 5 == 0]
        return viscosity_chart(readings, curves, dark=dark, height=height).to_dict(validate=False)
    if kind == "material":
        frame = modulus_frame(_item)
        return None if frame.empty else modulus_chart(frame, dark=dark, height=height).to_dict(validate=False)
    shape = {**_item.sizes, "form": _item.cells.get("form"), "section": _item.cells.get("section")}
    spec = swimmer_drawing(shape, dark=dark, width=width).to_dict(validate=False)
    # Streamlit would fit the drawing into its frame, and a round section would not stay round
    return spec | {"autosize": {"type": "none"}, "padding": 0}


def picture(item: OnShelf, height: int, width: int) -> None:
    """The record's picture: curve over temperature, readings over time, swimmer to scale, a rig's table."""
    if item.kind == "rig":
        rig_table(item)
        return
    dark = session.is_dark()
    told = f"{session.book().target}{sorted(item.cells.items())}{item.readings}"
    spec = _spec(told, item.kind, item.code, dark, height, width, item)
    if spec is None:
        session.note("Nothing to draw yet: add a reading.")
        return
    fits = "content" if item.kind == "swimmer" else "stretch"
    st.vega_lite_chart(
        spec=spec, theme=None, width=fits, key=f"shelf:picture:{item.kind}:{item.code}:{height}"
    )


def rig_table(item: OnShelf) -> None:
    """What a rig's runs take from it: field per current, camera, stated uncertainties."""
    cells = item.cells
    rows = [
        (QUANTITIES[k].name, cells[k])
        for k in ("current_to_B", "turns", "radius", "scale", "fps")
        if k in cells
    ]
    stated = ", ".join(f"{QUANTITIES[u[2:]].symbol} {cells[u]}" for u in STATED if u in cells)
    rows.append(("stated uncertainties", stated or "none: taken from the digits typed"))
    session.table(("calibration", "as typed"), rows)


def runs_link(item: OnShelf) -> None:
    """How many runs use the record, as a link to them; rigs have no filter of their own."""
    words = f"{item.runs} run{'s' if item.runs != 1 else ''}"
    if item.kind == "rig" or not item.runs:
        session.note(words)
        return
    st.page_link(
        st.session_state["pages"]["runs"], label=words, query_params={item.kind: item.code, "state": "all"}
    )


def page(item: OnShelf) -> None:
    """The opened record."""
    with st.container(horizontal=True, vertical_alignment="center"):
        st.header(item.code, width="content")
        session.tags(
            [
                *(["retired"] if item.retired else []),
                item.cells.get("form") or item.cells.get("kind") or item.kind,
            ]
        )
        runs_link(item)
    left, right = st.columns([56, 44], gap="medium")
    with left:
        if item.kind != "rig":
            picture(item, height=FULL, width=540)
        if item.kind in ("fluid", "material"):
            _readings(item)
        else:
            _facts(item)
    with right:
        if item.kind in ("fluid", "material"):
            _facts(item)
        cautions.fold(of_record(item.kind, item.cells))
        _acts(item)
    lines = session.book().ask(item_lines, item.kind, item.code)
    st.html(HEADING.format("Ledger"))
    if lines:
        ledger_rows.show(lines, f"item:{item.code}")
    else:
        session.note(f"Nobody has changed {item.code} since it came with a loaded sheet.")


def _facts(item: OnShelf) -> None:
    rows = []
    for column in (*shelf_fields.CHOOSES.get(item.kind, ()), *shelf_fields.COLUMNS[item.kind]):
        if column not in item.cells or column == "code":
            continue
        text = item.cells[column]
        if column in ("made", "built", "calibrated"):
            text = f"{text}, {age(text)}"
        rows.append((_name(item.kind, column), text))
    session.table(("as typed", ""), rows)
    links = [("material", item.cells.get("material")), ("swimmer", item.cells.get("parent"))]
    if item.kind == "material":
        links = [("swimmer", code) for code in session.book().ask(of_material, item.code)[:12]]
    if any(code for _, code in links):
        with st.container(horizontal=True):
            for kind, code in links:
                if code:
                    st.page_link(st.session_state["pages"]["shelf"], label=code, icon=":material/link:",
                                 query_params={"kind": kind, "item": code})  # fmt: skip


def _name(kind: str, column: str) -> str:
    if column in KINDS[kind].spreads:
        return f"stated u({QUANTITIES[KINDS[kind].spreads[column]].symbol})"
    if column in QUANTITIES:
        return f"{QUANTITIES[column].symbol} {QUANTITIES[column].name.removesuffix(shelf_fields.AT_RUN)}"
    return column


def _readings(item: OnShelf) -> None:
    """Every reading as typed, void ones marked, and the way to void one."""
    st.html(HEADING.format("Readings"))
    if not item.readings:
        session.note(
            "None yet. A reading is one measured property with its date"
            + (" and temperature." if item.kind == "fluid" else "; tests of one day are averaged.")
        )
        return
    rows = [
        (r.on or "undated", QUANTITIES[r.key].symbol, r.value_text, r.T_text, r.how,
         f"void: {r.why}" if r.state == "void" else r.note, r.code)
        for r in item.readings
    ]  # fmt: skip
    with st.container(height=330 if len(rows) > 9 else "content", border=False):
        session.table(("on", "", "as typed", "T", "how", "note", "reading"), rows, numeric=(2, 3))
    kept = [r for r in item.readings if r.state == "kept"]
    if kept:
        with st.expander("Void a reading"):
            _void(item, kept)


def _void(item: OnShelf, kept) -> None:
    words = {
        r.code: f"{r.code}: {QUANTITIES[r.key].symbol} {r.value_text}, {r.on or 'undated'}" for r in kept
    }
    # none is chosen beforehand: the first of a list that has just changed is not the one that was meant
    code = st.selectbox("Reading", list(words), index=None, format_func=words.get, placeholder="choose one",
                        key=f"shelf:void:{item.kind}:{item.code}")  # fmt: skip

    def act(why):
        if code is None:
            raise Refusal("reading", None, "is not chosen yet")
        session.book().void(code, why=why, by=session.handle())
        return f"{code} is void; {shelf_forms.runs_again()}"

    shelf_forms.with_reason(f"void:{item.code}", "Void it", act)


def _acts(item: OnShelf) -> None:
    if item.kind in ("fluid", "material"):
        # a batch without readings shows the form, and it stays open while one reading after the other goes in
        unread = st.session_state.setdefault(f"shelf:unread:{item.kind}:{item.code}", not item.readings)
        with st.expander("Add a reading", icon=":material/add:", expanded=unread):
            if item.kind == "material":
                shelf_stiffness.calculator(
                    item, f"stiffness:{item.code}", lambda cells: shelf_forms.fill_reading(item, cells)
                )
            shelf_forms.add_reading(item)
    with st.expander("Amend", icon=":material/edit:"):
        session.note("The old values stay in the ledger, and every run that uses this is derived again.")
        shelf_forms.amend_record(item)
    word = "Take back into use" if item.retired else "Retire"
    with st.expander(word, icon=":material/inventory_2:"):
        session.note("Retired means kept, but no longer offered first. Its runs stay as they are.")

        def act(why):
            session.book().retire(item.kind, item.code, why=why, by=session.handle(), back=item.retired)
            return f"{item.code} is {'back in use' if item.retired else 'retired'}"

        shelf_forms.with_reason(f"retire:{item.kind}:{item.code}", word, act)
