"""Pictures of what was measured on the shelf: viscosity against temperature, modulus against date."""

import json
from collections.abc import Mapping

import altair as alt
import numpy as np
import pandas as pd

from labbook.charts import axes
from labbook.charts.files import footer
from labbook.charts.palette import MOST_SERIES, other_series, paper, series, theme
from labbook.charts.trend_layers import HUE, NARROWEST, inline, short
from labbook.charts.trend_marks import legend_columns
from labbook.errors import Refusal
from labbook.registry.written import written

ZERO_CELSIUS = 273.15
UNDATED = "undated"
MOST_CURVE_POINTS = 120


def viscosity_chart(
    readings: pd.DataFrame,
    curves: pd.DataFrame,
    run: Mapping[str, float] | None = None,
    dark: bool = False,
    *,
    width: int | str = "container",
    height: int = 300,
) -> alt.LayerChart:
    """Viscosity (mPa s, log axis) against temperature (degC): readings, curves with their bands, the run's T.

    readings: T [K], value, u (SI, standard), on (the set's label), key ('mu' or 'nu'); a nu reading needs a
    column rho [kg/m3] to have a place, otherwise it is counted below the chart.
    curves: T [K], mu, low, high [Pa s], set (the same labels). run: T [K] and, where known, mu and u_mu.
    Errors: Refusal for a missing column.
    """
    _require(readings, ("T", "value", "u", "on", "key"), "readings")
    _require(curves, ("T", "mu", "low", "high", "set"), "curves")
    points, lost = _viscosity_points(readings)
    lines = _viscosity_curves(curves)
    names = sorted({p["set"] for p in points} | {c["set"] for c in lines})
    temperatures = [p["T"] for p in points] + [c["T"] for c in lines]
    values = [v for p in points for v in (p["low"], p["mu"], p["high"])]
    values += [v for c in lines for v in (c["low"], c["mu"], c["high"])]
    at_run = None
    if run is not None and run.get("T") is not None and np.isfinite(run["T"]):
        at_run = {"T": run["T"] - ZERO_CELSIUS}
        temperatures.append(at_run["T"])
        mu, u = run.get("mu"), run.get("u_mu") or 0.0
        if mu is not None and mu > 0:
            at_run |= {"mu": 1e3 * mu, "low": 1e3 * max(mu - u, mu / 10), "high": 1e3 * (mu + u)}
            values.append(at_run["mu"])
    span_x, span_y = axes.linear_domain(temperatures), axes.log_domain(values)
    x = _channel(alt.X, span_x, False, "T fluid temperature (°C)")
    y = _channel(alt.Y, span_y, True, "μ dynamic viscosity (mPa s)")
    fill, shape, hue = _looks(names, "set", dark)
    layers = []
    if lines:
        layers += [
            alt.Chart(inline(lines), name="bands").transform_calculate(hue=hue)
            .mark_area(fill=HUE, opacity=0.18, clip=True, tooltip=None)
            .encode(x=x("T"), y=y("low"), y2="high", detail="set:N"),
            alt.Chart(inline(lines), name="curves").transform_calculate(hue=hue)
            .mark_line(stroke=HUE, strokeWidth=1.8, clip=True, tooltip=None)
            .encode(x=x("T"), y=y("mu"), detail="set:N"),
        ]
    layers += _measured(points, x, y, "mu", (fill, shape, hue), dark,
                        [alt.Tooltip("set:N", title="set"), alt.Tooltip("text:N", title="reading")])
    if at_run is not None:
        layers += _at_run(at_run, x, y, paper(dark).rust)
    chart = alt.layer(*layers).properties(width=width, height=height).configure(**theme(dark))
    if lost:
        note = f"{lost} reading{'s' if lost > 1 else ''} of ν not drawn: no density"
        chart = chart.properties(title=footer([note], dark))
    return chart


def modulus_chart(
    readings: pd.DataFrame, dark: bool = False, *, width: int | str = "container", height: int = 260
) -> alt.LayerChart:
    """Young's modulus against the date of its reading, with bars of one standard uncertainty.

    readings: value, u [Pa], on (date, empty where undated) and, where known, how (the method).
    Undated readings are counted below the chart. Errors: Refusal for a missing column.
    """
    _require(readings, ("value", "u", "on"), "readings")
    dates = pd.to_datetime(readings["on"], errors="coerce", utc=True)
    known = readings[dates.notna() & np.isfinite(readings["value"].astype(float))]
    largest = float(known["value"].abs().max()) if len(known) else 1e6
    factor, unit = next((f, n) for f, n in ((1e9, "GPa"), (1e6, "MPa"), (1e3, "kPa"), (1.0, "Pa"))
                        if largest >= 0.1 * f or f == 1.0)
    how = known["how"].fillna("").astype(str) if "how" in known.columns else pd.Series("", index=known.index)
    points = [
        {"on": date.isoformat(), "E": short(value / factor), "set": method or "not said",
         "low": short((value - u) / factor), "high": short((value + u) / factor),
         "text": f"{written(value / factor, u / factor)} {unit}"}
        for date, value, method, u in zip(dates[known.index], known["value"].astype(float), how,
                                          known["u"].astype(float).fillna(0.0), strict=True)
    ]
    return _modulus_layers(points, int(dates.isna().sum()), unit, dark, width, height)


def _modulus_layers(points, undated, unit, dark, width, height) -> alt.LayerChart:
    values = [p[k] for p in points for k in ("low", "high")]
    y = _channel(alt.Y, axes.linear_domain(values), False, f"E Young's modulus ({unit})")

    times = pd.to_datetime([p["on"] for p in points], utc=True)
    span = times.max() - times.min() if points else pd.Timedelta(0)
    margin = max(span * 0.06, pd.Timedelta(days=3))
    ends = [(times.min() - margin).isoformat(), (times.max() + margin).isoformat()] if points else []

    def x(field):
        domain = [alt.expr(f"toDate({end!r})") for end in ends] or alt.Undefined
        days = "%d %b %Y" if span < pd.Timedelta(days=120) else "%b %Y"
        return alt.X(f"{field}:T", scale=alt.Scale(domain=domain, nice=False),
                     axis=alt.Axis(title="date of the reading", tickCount=6, format=days, labelOverlap=True))

    names = sorted({p["set"] for p in points})
    fill, shape, hue = _looks(names if names != ["not said"] else [], "method", dark)
    tips = [alt.Tooltip("on:T", title="on"), alt.Tooltip("text:N", title="E"),
            alt.Tooltip("set:N", title="method")]
    layers = _measured(points, x, y, "E", (fill, shape, hue), dark, tips, place="on")
    chart = alt.layer(*layers).properties(width=width, height=height).configure(**theme(dark))
    if undated:
        note = f"{undated} reading{'s' if undated > 1 else ''} without a date not drawn"
        chart = chart.properties(title=footer([note], dark))
    return chart


def _require(frame: pd.DataFrame, columns, what: str) -> None:
    missing = [c for c in columns if c not in frame.columns]
    if missing:
        raise Refusal(what, None, f"the frame lacks {', '.join(missing)}")


def _viscosity_points(readings: pd.DataFrame) -> tuple[list[dict], int]:
    points, lost = [], 0
    for row in readings.to_dict("records"):
        factor = 1e3
        if row["key"] == "nu":
            rho = row.get("rho")
            if rho is None or not np.isfinite(rho):
                lost += 1
                continue
            factor *= rho
        elif row["key"] != "mu":
            continue
        mu, u = row["value"] * factor, row["u"] * factor if np.isfinite(row["u"] or np.nan) else 0.0
        # a bar that reaches zero has no end on a log axis: a tenth of the value lies below any frame of ours
        points.append({"T": short(row["T"] - ZERO_CELSIUS), "mu": short(mu), "set": _set_name(row["on"]),
                       "low": short(max(mu - u, mu / 10)), "high": short(mu + u),
                       "text": f"{written(mu, u)} mPa s at {row['T'] - ZERO_CELSIUS:.1f} °C"})
    return points, lost


def _viscosity_curves(curves: pd.DataFrame) -> list[dict]:
    rows = []
    for label, part in curves.groupby(curves["set"].map(_set_name), sort=True):
        part = part.sort_values("T").iloc[:: max(1, -(-len(part) // MOST_CURVE_POINTS))]
        for T, mu, low, high in part[["T", "mu", "low", "high"]].itertuples(index=False):
            if np.isfinite(mu) and mu > 0:
                low = low if np.isfinite(low) and low > 0 else mu
                high = high if np.isfinite(high) else mu
                rows.append({"T": short(T - ZERO_CELSIUS), "mu": short(1e3 * mu), "low": short(1e3 * low),
                             "high": short(1e3 * high), "set": label})
    return rows


def _set_name(value) -> str:
    return UNDATED if pd.isna(value) or str(value).strip() == "" else str(value)


def _channel(kind, span, log, title):
    """A function that puts a field on one shared axis."""
    def channel(field):
        return kind(f"{field}:Q", scale=axes.scale(*span, log), axis=axes.axis(*span, log, title=title))
    return channel


def _looks(names: list[str], title: str, dark: bool):
    """Fill, shape (one legend) and a Vega expression for a row's colour; an eighth set looks 'other'."""
    looks = [*series(dark)[: len(names)]]
    looks += [other_series(dark)] * (len(names) - MOST_SERIES)
    if not names:
        plain = series(dark)[0]
        return alt.value(plain.colour), alt.value(plain.shape), json.dumps(plain.colour)
    legend = alt.Legend(columns=legend_columns(names, NARROWEST), symbolStrokeWidth=0.5)

    def channel(kind, values):
        return kind("set:N", title=title, legend=legend, scale=alt.Scale(domain=names, range=values))

    colours = [s.colour for s in looks]
    hues = json.dumps(dict(zip(names, colours, strict=True)))
    return channel(alt.Fill, colours), channel(alt.Shape, [s.shape for s in looks]), f"({hues})[datum.set]"


def _measured(points, x, y, field, looks, dark, tips, place="T") -> list[alt.Chart]:
    """Readings as marks over their bars."""
    fill, shape, hue = looks
    data = inline(points)
    return [
        alt.Chart(data, name="reading_bars").transform_calculate(hue=hue)
        .mark_rule(stroke=HUE, strokeWidth=1.4, clip=True, tooltip=None)
        .encode(x=x(place), y=y("low"), y2="high"),
        alt.Chart(data, name="readings")
        .mark_point(size=80, opacity=1, stroke=paper(dark).ink, strokeWidth=0.5, clip=True)
        .encode(x=x(place), y=y(field), fill=fill, shape=shape, tooltip=tips),
    ]


def _at_run(at_run: dict, x, y, rust: str) -> list[alt.Chart]:
    data = inline([at_run])
    layers = [alt.Chart(data, name="run_T").mark_rule(color=rust, strokeWidth=1.6, strokeDash=[5, 3],
                                                       clip=True, tooltip=None).encode(x=x("T"))]
    if "mu" in at_run:
        layers += [
            alt.Chart(data, name="run_bar").mark_rule(color=rust, strokeWidth=2.2, clip=True, tooltip=None)
            .encode(x=x("T"), y=y("low"), y2="high"),
            alt.Chart(data, name="run_mu")
            .mark_point(shape="circle", fill=rust, stroke=rust, size=110, opacity=1, clip=True, tooltip=None)
            .encode(x=x("T"), y=y("mu")),
        ]
    return layers
