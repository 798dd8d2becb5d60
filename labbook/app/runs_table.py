"""The table of runs: as typed on the left, numbers on the right, sorted by value however it is written."""

from functools import partial

import pandas as pd
import streamlit as st
from pandas.io.formats.style import Styler

from labbook.app import dialect_choices, session
from labbook.app.column_width import wide_enough
from labbook.app.runs_cells import numeric, reduced_runs
from labbook.book import queries
from labbook.book.asking import Question
from labbook.book.reduced_cells import REDUCIBLE
from labbook.book.track_pages import units_before
from labbook.charts.dialect_axis import HOUSE_ONLY, dialect_label
from labbook.charts.palette import paper
from labbook.registry.dialects import CHOICES
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES, RUN_KEYS
from labbook.registry.regimes import regimes_of

TEXTS = ("at", "by", "swimmer", "fluid", "material", "rig", "drive", "series", "video", "note")
USUAL = ("at", "by", "swimmer", "fluid", "f", "theta0", "T", "U", "Sp", "Re_omega", "U_scaled", "St",
         "regime", "note")  # fmt: skip
ROW = 40
TALL, FOLDED = 11, 4  # rows in sight: alone, and above an open sheet
REST_OF_SCREEN = "flex: none !important; height: max(483px, calc(100vh - 310px));"


def offered(registry: Registry) -> tuple[str, ...]:
    """The columns one may choose, in the table's order."""
    return (*TEXTS, *dict.fromkeys((*RUN_KEYS, *registry.keys)), "regime")


def chosen(registry: Registry) -> tuple[str, ...]:
    """The columns in the page's address, in the table's order, the usual ones where it names none.

    What it names and the table has not is said where this is asked.
    """
    named, known = [c for c in session.address("columns").split(",") if c], offered(registry)
    if unknown := [c for c in dict.fromkeys(named) if c not in known]:
        word = "columns" if len(unknown) > 1 else "column"
        rest = "the others" if set(named) & set(known) else "the usual ones"
        session.say_refused(f"In the address, {word} {', '.join(map(repr, unknown))}: "
                            f"the table has no such {word}; {rest} are shown.")  # fmt: skip
    return tuple(c for c in known if c in named) or USUAL


def keys_of(columns: tuple[str, ...], registry: Registry) -> tuple[str, ...]:
    """The quantities and numbers among some columns."""
    known = set(registry.keys)
    return tuple(c for c in columns if c in known)


def choose(have: tuple[str, ...], registry: Registry) -> None:
    """The popover that chooses columns and keeps them in the address."""
    with st.popover("Columns", icon=":material/view_column:"):
        named = partial(_label, registry=registry)
        picked = st.multiselect("Columns", offered(registry), have, format_func=named, key="runs:columns",
                                width=640, on_change=_keep)  # fmt: skip
        if tuple(picked) and set(picked) != set(USUAL):
            st.button("The usual ones", key="runs:usual", on_click=_usual)


def choose_dialects(columns: tuple[str, ...], dialects: dict, registry: Registry) -> None:
    """The popover that chooses a dialect for each number shown that has any."""
    numbers = [c for c in dict.fromkeys((*columns, *dialects)) if c in CHOICES]
    away = f" ({len(dialects)})" if dialects else ""
    with st.popover(f"Dialects{away}", icon=":material/translate:"), st.container(width=420):
        for number in numbers:
            dialect_choices.choose("runs", number, registry, dialects, _label(number, registry))
        if numbers:
            session.note(f"Values, uncertainties and downloads follow; {HOUSE_ONLY}.")
        else:
            session.note("No number shown has dialects: choose other columns.")


def _keep() -> None:
    picked = st.session_state["runs:columns"]
    session.set_address(columns=",".join(picked) if picked and set(picked) != set(USUAL) else None)


def _usual() -> None:
    st.session_state["runs:columns"] = list(USUAL)
    session.set_address(columns=None)


def _label(column: str, registry: Registry) -> str:
    row = registry.numbers.get(column) or QUANTITIES.get(column)
    return column if row is None else f"{row.symbol}  {row.name}"


def show(
    state: str, asked: Question, told: str, columns: tuple[str, ...], dialects: dict, newest: int,
    folded: bool, registry: Registry,
) -> None:  # fmt: skip
    """The newest runs of a question; a line touched opens its run through the address."""
    frame, written_cells, void, config = _cells(state, told, columns, dialects, newest, asked, registry)
    codes = frame["code"].tolist()
    key = f"runs:table:{hash((told, columns, newest, str(dialects)))}"
    st.session_state["runs:key"], st.session_state["runs:codes"] = key, codes
    rows = min(len(codes), FOLDED if folded else TALL)
    tall = len(codes) > TALL and not folded
    # a rule and not a second container: a table that moves to another one forgets how it was sorted
    st.html(f"<style>.st-key-lb-runs-table {{ {REST_OF_SCREEN if tall else ''} }}</style>")
    with st.container(key="lb-runs-table"):
        st.dataframe(
            _style(frame, written_cells, void, session.address("run")),
            hide_index=True,
            column_config=config,
            row_height=ROW,
            height="stretch" if tall else ROW * (rows + 1) + 3,
            key=key,
            placeholder="",
            on_select=_open,
            selection_mode="single-row",  # a touch on a heading, which sorts, would count as a cell
        )


def _open() -> None:
    selected = st.session_state[st.session_state["runs:key"]]["selection"]["rows"]
    codes = st.session_state["runs:codes"]
    session.set_address(run=codes[selected[0]] if selected and selected[0] < len(codes) else None)


def forget_selection() -> None:
    """No line is marked any more."""
    st.session_state.pop(st.session_state.get("runs:key", ""), None)


@st.cache_data(max_entries=24, show_spinner="Reading the runs")
def _cells(
    state: str, told: str, columns: tuple[str, ...], dialects: dict, newest: int, _asked: Question,
    _registry: Registry,
):  # fmt: skip
    """(frame, column -> {value: text}, which are void, column settings) of the newest runs."""
    book, texts = session.book(), (*queries.RUN_TEXTS, "typed")
    keys = keys_of(columns, _registry)
    spoken = {n: c for n, c in dialects.items() if n in columns}
    found = book.frame(_asked, keys=keys, texts=texts, newest=newest, dialects=spoken)
    before = book.ask(units_before, reduced_runs(found)) if set(columns) & set(REDUCIBLE) else {}
    frame = pd.DataFrame({"code": found["code"]})
    config: dict = {"code": st.column_config.TextColumn("run", pinned=True)}
    written_cells: dict[str, dict] = {}
    for column in columns:
        if column in keys:
            label = _heading(column, spoken, _registry)
            label, frame[column], written_cells[column] = numeric(found, column, label, before)
            width = wide_enough(label, written_cells[column].values())
            help_ = _label(column, _registry)
            if column in spoken:
                help_ += f", dialect {found.attrs['dialects'][column]}"
            config[column] = st.column_config.NumberColumn(label, help=help_, width=width)
        elif column == "regime":
            frame[column] = _regimes(_asked, newest, _registry)
            config[column] = st.column_config.TextColumn(column)
        else:
            frame[column] = _text(found, column)
            config[column] = st.column_config.TextColumn(column)
    void = (found["state"] == "void").to_numpy()
    if void.any():
        frame.insert(
            1,
            "state",
            ["void: " + (why or "") if v else "" for v, why in zip(void, found["why"], strict=True)],
        )
        config["state"] = st.column_config.TextColumn("void")
    return frame, written_cells, void, config


def _heading(key: str, spoken: dict, registry: Registry) -> str:
    """A column's symbol, with the dialect where it is not the house's."""
    if key in registry.numbers:
        return dialect_label(key, spoken.get(key, {}), registry.choices(key) or None, registry.numbers)
    return {"T_end": "T at the end"}.get(key) or QUANTITIES[key].symbol


def _regimes(asked: Question, newest: int, registry: Registry) -> list[str]:
    """The regimes of the newest runs, which are always read in the house dialect."""
    banded = list(dict.fromkeys(b.number for r in registry.regimes.values() for b in r.bands))
    found = session.book().frame(asked, keys=banded, texts=("code",), spread=False, newest=newest)
    return [
        ", ".join(regimes_of(dict(zip(banded, row, strict=True)), registry.regimes))
        for row in found[banded].itertuples(index=False, name=None)
    ]


def _style(frame: pd.DataFrame, written_cells: dict[str, dict], void, opened: str) -> Styler:
    """The frame with its cells as written, void runs grey, the open one in rust; the SI value sorts."""
    styler = frame.style.format({c: texts.get for c, texts in written_cells.items()}, na_rep="")
    looks = ["color: #8B9195; font-style: italic" if v else "" for v in void]
    if opened in frame["code"].values:
        looks[frame["code"].tolist().index(opened)] = (
            f"color: {paper(session.is_dark()).rust}; font-weight: bold"
        )
    return styler.apply(lambda column: looks) if any(looks) else styler


def _text(found: pd.DataFrame, column: str) -> list[str]:
    if column == "at":
        return [t.strftime("%Y-%m-%d %H:%M") for t in found["at"]]
    return ["" if pd.isna(v) else str(v) for v in found[column]]
