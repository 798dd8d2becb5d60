"""Statistics of a trend as a text that can stand in a paper: data, numbers with intervals, exclusions."""

import re
from collections.abc import Mapping
from dataclasses import replace
from datetime import date

import numpy as np

from labbook.book.trend_group import NO_FAMILY
from labbook.book.trend_statistics import BELOW, BEYOND, Slope, Statistics, Top
from labbook.physics.trend_text import rounded, told
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES

NAMED = 8  # families that show no maximum, by name
SCATTERED = 0.2  # of y at equal x: house rule, beyond it a change in time may be one in anything
SIDES = {BELOW: "Below the maximum", BEYOND: "Beyond the maximum"}


def axis_name(key: str, registry: Registry) -> str:
    """How a text calls a number or quantity: its symbol."""
    return registry.numbers[key].symbol if key in registry.numbers else QUANTITIES[key].symbol


def paragraphs(s: Statistics, question: str, registry: Registry, defined: str = "") -> list[str]:
    """The text, a paragraph each; question: in words; defined: the axes' numbers, with dialect."""
    x, y = (axis_name(key, registry) for key in (s.group.runs.x_key, s.group.runs.y_key))
    known = s.group.points.left_out  # told once, at the end
    said = [f"{_data(s, question)} {_axes(s, registry, defined)}".strip(), _top(s.top, x, y, known)]
    if s.family != NO_FAMILY:
        said.append(_families(s, x, y))
    said += [_slope(slope, x, y, known) for slope in s.slopes]
    said.append(_changes(s, x, y))
    said.append(s.repeats.in_words())
    if s.outlying.found is None:
        said.append(f"Outliers: {s.outlying.why}.")
    else:
        kept = " They are listed, not left out." if s.outlying.found.rows else ""
        said.append(told(outliers=s.outlying.found) + kept)
    if s.group.excluded:
        said.append(told(excluded=s.group.excluded))
    return [part for part in said if part]


def verdict(text: str, x: str, y: str) -> str:
    """A reason of the statistics with the axes' names in place of x and y."""
    names = {"x": x, "y": y}
    return re.sub(r"(?<![\w/^.])([xy])(?![\w/^.(])", lambda found: names[found[1]], text)


def _data(s: Statistics, question: str) -> str:
    runs, used = s.group.runs, s.group.points.index
    days = [date.fromordinal(int(d)).isoformat() for d in (runs.day[used].min(), runs.day[used].max())]
    kind = f" of form {s.group.form}" if s.group.form else " of all forms"
    who = [_counted(runs.swimmer[used], "swimmer"), _counted(runs.material[used], "material batch"),
           _counted(runs.fluid[used], "fluid")]  # fmt: skip
    return (
        f"Data: {len(used)} of the {s.group.found} runs found ({question}), those{kind} with both values: "
        f"{', '.join(w for w in who if w)}, {days[0]} to {days[1]}."
    )


def _axes(s: Statistics, registry: Registry, defined: str) -> str:
    """What the axes are: the numbers as the caller has them, the unit of a quantity."""
    keys = dict.fromkeys((s.group.runs.x_key, s.group.runs.y_key))
    quantities = [QUANTITIES[k] for k in keys if k not in registry.numbers]
    units = [f"{row.symbol} in {row.unit}" for row in quantities if row.unit not in ("", "1")]
    words = " ".join(part for part in (defined, f"{', '.join(units)}." if units else "") if part)
    return f"Axes: {words}" if words else ""


def _counted(names: np.ndarray, noun: str) -> str:
    n = len(set(names) - {""})
    return _number(n, noun) if n else ""


def _number(n: int, noun: str) -> str:
    many = f"{noun}es" if noun.endswith("ch") else f"{noun}s"
    return f"{n} {noun if n == 1 else many}"


def _top(top: Top, x: str, y: str, known: Mapping) -> str:
    m = top.maximum
    if m is None:
        return f"No maximum of {y} over {x} can be told: {verdict(top.why, x, y)}."
    m = replace(_without(m, known) if m.found else replace(m, left_out={}), verdict=verdict(m.verdict, x, y))
    return told(x=x, y=y, maximum=m)


def _without(result, known: Mapping):
    """A result that tells only what it left out itself."""
    return replace(result, left_out={why: n for why, n in result.left_out.items() if why not in known})


def _families(s: Statistics, x: str, y: str) -> str:
    """Each family's maximum in a clause, then those that show none."""
    found = [t for t in s.tops if t.maximum is not None and t.maximum.found]
    none = [t.name for t in s.tops if t not in found]
    clauses = []
    for t in found:
        of = f"{t.maximum.n} runs of {_number(t.maximum.swimmers, 'swimmer')}"
        clauses.append(f"{t.name} {place(t)} ({of})" if not t.maximum.verdict else
                       f"{t.name} near {t.maximum.x:.3g} ({of}: no interval)")  # fmt: skip
    text = f"Maximum by {s.family}, {x} with its 95 % interval: {'; '.join(clauses)}." if clauses else ""
    if none:
        many = f"{len(none)} others" if clauses else f"any of {len(none)}"
        who = ", ".join(none) if len(none) <= NAMED else many
        start = " No maximum is shown by" if clauses else f"By {s.family}, no maximum is shown by"
        text += f"{start} {who}: runs on one side of it, or too few."
    if s.more_families:
        text += f" {s.more_families} smaller ones were not looked at."
    return text


def place(top: Top) -> str:
    """'2.125 (2.042 to 2.176)'; without the bracket where there is no interval, '' where no maximum."""
    m = top.maximum
    return "" if m is None else interval(m.x, m.x_low, m.x_high)


def interval(value: float, low: float, high: float) -> str:
    """A value with its interval in brackets, '' where it is not known."""
    if not np.isfinite(value):
        return ""
    if not np.isfinite(low + high):
        return f"{value:.3g}"
    half = 0.5 * (high - low)
    value, low, high = (v.removeprefix("-") if float(v) == 0.0 else v
                        for v in (rounded(v, half) for v in (value, low, high)))  # fmt: skip
    return f"{value} ({low} to {high})"


def _slope(slope: Slope, x: str, y: str, known: Mapping) -> str:
    lead = f"{SIDES[slope.where]}: " if slope.where in SIDES else ""
    if slope.law is None:
        return f"{lead or 'Slope: '}no power law, {verdict(slope.why, x, y)}."
    law = _without(slope.law, {**known, "outside the range": 0})
    return lead + told(x=x, y=y, power_law=law)


def _changes(s: Statistics, x: str, y: str) -> str:
    if not s.changed.rows:
        return f"Change over time: {verdict(s.changed.why, x, y)}."
    text = told(x=x, y=y, changes=s.changed.rows)
    far = s.outlying.found.far if s.outlying.found else None
    if far is not None and far.scatter > SCATTERED:
        text += (
            f" With {100 * far.scatter:.2g} % of scatter at equal {x}, {y} is no function of {x} alone: "
            "time may stand for another fluid, amplitude or size."
        )
    return text
