"""Where a group has kept runs on a plane of two keys, and where those lie that are proposed."""

from collections.abc import Mapping
from functools import lru_cache

import altair as alt
import numpy as np
import pandas as pd

from labbook.charts import axes
from labbook.charts.palette import SMALL_SIZE, paper
from labbook.charts.plan_marks import joined, thinned
from labbook.charts.plan_plane import across, layer_of, spanned, template, up
from labbook.charts.trend_layers import short
from labbook.registry.catalogue import NUMBERS, Number

HEIGHT = 270
LETTERS = (38, 24)  # in a line of the titles of x and y, which must not outgrow a small chart


def coverage(
    *,
    kept: pd.DataFrame,
    proposed: pd.DataFrame,
    x: str,
    y: str,
    swimmer: str,
    done: tuple[str, ...] = (),
    numbers: Mapping[str, Number] = NUMBERS,
    proposed_y: str = "",
    dark: bool = False,
) -> tuple[dict, int]:
    """(specification, kept runs that have a place on it): a dot for each place, rings for what is proposed.

    kept: code, swimmer, x, y in SI; proposed: x and `proposed_y` (y where left out) and `place`, their number
    in the list; swimmer: whose dots are dark; done: codes of runs that were proposed and are logged.
    """
    with np.errstate(all="ignore"):
        there = kept[np.isfinite(np.log(kept[x].astype(float))) & np.isfinite(np.log(kept[y].astype(float)))]
        rings = proposed.rename(columns={proposed_y or y: y}) if proposed_y not in ("", y) else proposed
        rings = rings[
            np.isfinite(np.log(rings[x].astype(float))) & np.isfinite(np.log(rings[y].astype(float)))
        ]
    spans = [axes.log_domain([*there[k].astype(float), *rings[k].astype(float)]) for k in (x, y)]
    titles = [
        axes.title_lines(axes.title(k, numbers=numbers), n) for k, n in zip((x, y), LETTERS, strict=True)
    ]
    drawn = thinned(there, *spans, keys=(x, y))
    logged = there[there["code"].isin(done)]
    rows = {
        "kept": _rows(drawn[drawn["swimmer"] != swimmer], x, y),
        "own": _rows(drawn[drawn["swimmer"] == swimmer], x, y),
        "done": _rows(logged, x, y),
        "proposed": [
            {"x": row[x], "y": row[y], "place": row["place"], "fluid": row["fluid"]}
            for row in joined(rings, (x, y))
        ],
    }
    spec = spanned(_layers_of(dark), *zip(spans, titles, strict=True), rows)
    return spec, len(there)


def _rows(frame: pd.DataFrame, x: str, y: str) -> list[dict]:
    columns = ["code", "swimmer", x, y]
    return [
        {"code": code, "swimmer": swimmer, "x": short(a), "y": short(b)}
        for code, swimmer, a, b in frame[columns].astype({x: float, y: float}).itertuples(index=False)
    ]


@lru_cache(maxsize=2)
def _layers_of(dark: bool) -> str:
    ink = paper(dark)
    where = dict(x=across("x"), y=up("y"))
    tips = [alt.Tooltip("code:N", title="run"), alt.Tooltip("swimmer:N")]
    ring = dict(shape="circle", strokeWidth=2.2, opacity=1, clip=True)

    def dots(name, colour, opacity):
        mark = layer_of(name).mark_point(
            shape="circle", size=26, filled=True, color=colour, opacity=opacity, clip=True
        )
        return mark.encode(**where, tooltip=tips)

    layers = [
        dots("kept", ink.grey, 0.55),
        dots("own", ink.ink, 0.9),
        layer_of("done")
        .mark_point(**ring, size=150, fill=ink.accent, stroke=ink.ground)
        .encode(**where, tooltip=tips),
        layer_of("proposed")
        .mark_point(**ring, size=280, fill=ink.ground, fillOpacity=0.85, stroke=ink.accent)
        .encode(**where, tooltip=[alt.Tooltip("place:N", title="proposed"), alt.Tooltip("fluid:N")]),
        layer_of("proposed", "places")
        .mark_text(color=ink.ink, fontSize=SMALL_SIZE, fontWeight="bold", clip=True, tooltip=None)
        .encode(**where, text="place:N"),
    ]
    return template(layers, HEIGHT, dark)
