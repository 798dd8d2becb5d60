"""How a trend is drawn: axes, dialects, colour, bars, switches, kept in the address, set beside the chart."""

from dataclasses import dataclass, field

import streamlit as st

from labbook.app import dialect_choices, session
from labbook.charts import theory_axes
from labbook.charts.trend_shared import SHARED
from labbook.registry.dialects import CHOICES as DIALECT_CHOICES
from labbook.registry.group import Registry

SWITCH = ("on", "off")
FIRST = {"x": "Sp", "y": "U_scaled"}
# name in the address -> what it may be, the default first
CHOICES = {
    "colour": ("swimmer", "fluid", "material", "person", "series", "none"),
    "bars": ("own", "total", SHARED, "none"),
    "bands": SWITCH,
    "theory": SWITCH,
    "published": SWITCH,
    "logx": SWITCH,
    "logy": SWITCH,
}
BARS = ("own: the run's own part of its uncertainty; total: with the shared part; shared band: own bars, and "
        "how far each group may move together")  # fmt: skip


def allowed(name: str, registry: Registry) -> tuple[str, ...]:
    """What a choice may be, the default first: the axes are the book's own numbers and quantities."""
    if name not in FIRST:
        return CHOICES[name]
    return tuple(dict.fromkeys((FIRST[name], *registry.numbers, *registry.keys)))


@dataclass(frozen=True)
class Choices:
    """What is drawn and how; colour: what groups the marks, if anything.

    dialects: every choice of the numbers on the axes that are not in the house dialect.
    """

    x: str
    y: str
    colour: str | None
    bars: str
    bands: bool
    theory: bool
    published: bool
    log_x: bool
    log_y: bool
    dialects: dict[str, dict[str, object]] = field(default_factory=dict)

    @property
    def group(self) -> str | None:
        """The book's column behind the colour."""
        return "by" if self.colour == "person" else self.colour

    @property
    def keys(self) -> tuple[str, ...]:
        return tuple(dict.fromkeys((self.x, self.y)))

    def why_no_curve(self, registry: Registry) -> str:
        """Why theory draws nothing on these axes; '' where it does."""
        return theory_axes.why_none(self.x, self.y, registry.coefficient, self.spoken(registry))

    def spoken(self, registry: Registry) -> dict[str, dict[str, object]]:
        """The dialect of each axis that has any, every choice named."""
        keys = [k for k in self.keys if k in DIALECT_CHOICES]
        return {k: self.dialects.get(k) or registry.choices(k) for k in keys}


def chosen(registry: Registry) -> tuple[Choices, list[str]]:
    """The choices in the address, and a sentence for each that was not understood (its default is taken)."""
    values, said = {}, []
    for name in (*FIRST, *CHOICES):
        options = allowed(name, registry)
        text = session.address(name, options[0])
        if text not in options:
            said.append(f"In the address, {name} cannot be {text!r}; {options[0]} is shown.")
            text = options[0]
        values[name] = text
    dialects, wrong = dialect_choices.in_address(registry)
    x, y = values["x"], values["y"]
    dialects = {k: dialects[k] for k in dict.fromkeys((x, y)) if k in dialects}
    choices = Choices(
        x, y, None if values["colour"] == "none" else values["colour"], values["bars"],
        bands=values["bands"] == "on", theory=values["theory"] == "on",
        published=values["published"] == "on", log_x=values["logx"] == "on", log_y=values["logy"] == "on",
        dialects=dialects,
    )  # fmt: skip
    return choices, [*said, *wrong]


def controls(choices: Choices, registry: Registry, *, others: bool) -> None:
    """The controls beside the chart; each writes itself into the address.

    others: whether the book has published points for these axes.
    """
    for axis, label, key in (("x", "across", choices.x), ("y", "up", choices.y)):
        _pick(label, axis, key, registry)
        if key in DIALECT_CHOICES and (axis == "x" or key != choices.x):
            dialect_choices.choose("trends", key, registry, choices.dialects, f"dialect of {key}",
                                   folded=True)  # fmt: skip
    _pick("colour and mark", "colour", choices.colour or "none", registry)
    _pick("bars", "bars", choices.bars, registry, help=BARS)
    _switch("bands", "bands", choices.bands)
    if not choices.why_no_curve(registry):
        _switch("theory", "theory", choices.theory)
    if others:
        _switch("published", "published", choices.published)
    _switch("log across", "logx", choices.log_x)
    _switch("log up", "logy", choices.log_y)


def _key(name: str) -> str:
    return f"trends:{name}"


def _pick(label: str, name: str, value: str, registry: Registry, **options) -> None:
    st.session_state[_key(name)] = value
    offered = allowed(name, registry)
    # the bare key: the chart's title has its name, and a longer label would be cut on a small screen
    st.selectbox(label, offered, key=_key(name), on_change=_write, args=(name, offered[0]), **options)


def _switch(label: str, name: str, value: bool) -> None:
    st.session_state[_key(name)] = value
    st.toggle(label, key=_key(name), on_change=_write, args=(name, "on"))


def _write(name: str, default: str) -> None:
    value = st.session_state[_key(name)]
    text = {True: "on", False: "off"}.get(value, value)
    session.set_address(**{name: text if text != default else None})
