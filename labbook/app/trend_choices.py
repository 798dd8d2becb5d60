"""How a trend is drawn: axes, colour, bars and the rest, kept in the address, set beside the chart."""

from dataclasses import dataclass

import streamlit as st

from labbook.app import session
from labbook.book.stored_view import KEYS
from labbook.charts.dialect_axis import dialects
from labbook.registry.catalogue import NUMBERS

AXES = (*NUMBERS, *(k for k in KEYS if k not in NUMBERS))
SWITCH = ("on", "off")
# name in the address -> what it may be, the default first
CHOICES = {
    "x": ("Sp", *(k for k in AXES if k != "Sp")),
    "y": ("U_scaled", *(k for k in AXES if k != "U_scaled")),
    "dialect": tuple(dialects()),
    "colour": ("swimmer", "fluid", "material", "person", "series", "none"),
    "bars": ("own", "total", "none"),
    "bands": SWITCH,
    "theory": SWITCH,
    "logx": SWITCH,
    "logy": SWITCH,
}


@dataclass(frozen=True)
class Choices:
    """What is drawn and how; colour: what groups the marks, if anything; dialect: of the sperm number."""

    x: str
    y: str
    dialect: str
    colour: str | None
    bars: str
    bands: bool
    theory: bool
    log_x: bool
    log_y: bool

    @property
    def group(self) -> str | None:
        """The book's column behind the colour."""
        return "by" if self.colour == "person" else self.colour

    @property
    def keys(self) -> tuple[str, ...]:
        return tuple(dict.fromkeys((self.x, self.y)))

    @property
    def house(self) -> bool:
        """Whether every number on the axes is in the house dialect."""
        return self.dialect == "house" or "Sp" not in self.keys


def chosen() -> tuple[Choices, list[str]]:
    """The choices in the address, and a sentence for each that was not understood (its default is taken)."""
    values, said = {}, []
    for name, allowed in CHOICES.items():
        text = session.address(name, allowed[0])
        if text not in allowed:
            said.append(f"In the address, {name} cannot be {text!r}; {allowed[0]} is shown.")
            text = allowed[0]
        values[name] = text
    colour = None if values["colour"] == "none" else values["colour"]
    switched = {name: values[name] == "on" for name in ("bands", "theory")}
    choices = Choices(
        values["x"], values["y"], values["dialect"], colour, values["bars"], **switched,
        log_x=values["logx"] == "on", log_y=values["logy"] == "on",
    )  # fmt: skip
    return choices, said


def controls(binned: bool) -> None:
    """The controls beside the chart; each writes itself into the address.

    binned: the runs were counted on a grid, not read one by one.
    """
    only_house = "A grid of many runs is counted in the house dialect: narrow the filter first."
    _pick("across", "x")
    _pick("up", "y")
    if "Sp" in (_value("x"), _value("y")):
        _pick("Sp in dialect", "dialect", disabled=binned, help=only_house if binned else None)
    _pick("colour and mark", "colour")
    _pick("bars", "bars", help="own: the run's own part of its uncertainty; total: with the shared part")
    _switch("bands", "bands")
    if has_theory(_value("x"), _value("y")) and _value("dialect") == "house":
        _switch("theory", "theory")
    elif has_theory(_value("x"), _value("y")):
        session.note("No theory here: its curve is drawn in the house dialect only.")
    _switch("log across", "logx")
    _switch("log up", "logy")


def has_theory(x: str, y: str) -> bool:
    """Whether there is a curve for these axes."""
    return (x, y) == ("Sp", "U_scaled")


def _value(name: str) -> str:
    text = session.address(name, CHOICES[name][0])
    return text if text in CHOICES[name] else CHOICES[name][0]


def _key(name: str) -> str:
    return f"trends:{name}"


def _pick(label: str, name: str, **options) -> None:
    st.session_state[_key(name)] = _value(name)
    listed = AXES if name in ("x", "y") else CHOICES[name]
    # the bare key: the chart's title has its name, and a longer label would be cut on a small screen
    st.selectbox(label, listed, key=_key(name), on_change=_write, args=(name,), **options)


def _switch(label: str, name: str) -> None:
    st.session_state[_key(name)] = _value(name) == "on"
    st.toggle(label, key=_key(name), on_change=_write, args=(name,))


def _write(name: str) -> None:
    value = st.session_state[_key(name)]
    text = {True: "on", False: "off"}.get(value, value)
    session.set_address(**{name: text if text != CHOICES[name][0] else None})
