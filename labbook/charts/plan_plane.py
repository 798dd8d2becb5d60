"""A log-log plane whose layers stay as they are while spans and rows change."""

import json

import altair as alt

from labbook.charts import axes
from labbook.charts.palette import theme

Span = tuple[float, float]
ROWS = "rows"  # the one data set: its rows say in `kind` which layers draw them


def across(field: str) -> alt.X:
    """A field along x; `spanned` puts in span and axis."""
    return alt.X(f"{field}:Q", scale=axes.scale(1.0, 10.0, True))


def up(field: str) -> alt.Y:
    """A field along y; `spanned` puts in span and axis."""
    return alt.Y(f"{field}:Q", scale=axes.scale(1.0, 10.0, True))


def layer_of(kind: str, name: str = "") -> alt.Chart:
    """A layer that draws the rows of a kind."""
    return alt.Chart(name=name or kind).transform_filter(f"datum.kind === '{kind}'")


def template(layers: list[alt.Chart], height: int | str, dark: bool) -> str:
    """Layers as JSON, checked by altair: that takes a hundred times as long as reading them again."""
    chart = alt.layer(*layers, data=alt.NamedData(name=ROWS)).properties(width="container", height=height)
    return json.dumps(chart.configure(**theme(dark)).to_dict())


def spanned(made: str, x: tuple[Span, object], y: tuple[Span, object], rows: dict[str, list[dict]]) -> dict:
    """A template with (span, title) on each axis, and the rows of each kind.

    All that moves is in one data set, so that a page draws what changed and builds nothing anew.
    """
    spec = json.loads(made)
    for channel, (span, title) in (("x", x), ("y", y)):
        axis = axes.axis(*span, True, title=title).to_dict(validate=False)
        for layer in spec["layer"]:
            found = layer["encoding"].get(channel, {})
            if "scale" in found:
                found["scale"]["domain"] = list(span)
                found["axis"] = axis
    spec["datasets"] = {ROWS: [{"kind": kind} | row for kind, some in rows.items() for row in some]}
    return spec
