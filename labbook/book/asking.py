"""A question to the book: which runs, said in SQL, in words, and as options of the command line."""

import shlex
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

from sqlalchemy import ColumnElement, and_, or_, select

from labbook.book.clock import local, read_moment
from labbook.book.records import STATES
from labbook.book.stored_view import resolved, view_column
from labbook.book.tables import fluid, material, run, swimmer
from labbook.errors import Refusal
from labbook.registry.group import Registry
from labbook.registry.quantities import QUANTITIES
from labbook.registry.regimes import Band, Regime


@dataclass(frozen=True)
class Question:
    """Which runs: regimes all hold; within fluids, swimmers, materials, people and series any one holds.

    ranges: key -> (low, high) in SI, inclusive, inf allowed, numbers in the house dialect; since, until:
    ISO dates or moments, both inclusive; text: a word found in code, note, series or video;
    state: 'kept', 'void' or 'all'.
    """

    regimes: Sequence[str] = ()
    ranges: Mapping[str, tuple[float, float]] = field(default_factory=dict)
    fluids: Sequence[str] = ()
    swimmers: Sequence[str] = ()
    materials: Sequence[str] = ()
    people: Sequence[str] = ()
    series: Sequence[str] = ()
    since: str | None = None
    until: str | None = None
    text: str | None = None
    state: str = "kept"

    def conditions(self, registry: Registry, *, regimes: bool = True) -> list[ColumnElement]:
        """SQL conditions over the stored view (joined with `run` where needs_run() says so)."""
        found = []
        if self.state not in (*STATES, "all"):
            raise Refusal("state", self.state, "is no state of a run", "kept, void or all")
        if self.state != "all":
            found.append(resolved.c.state == self.state)
        for key, (low, high) in self.ranges.items():
            found.append(_between(check_key(key, registry), low, high))
        for column, table, codes in (
            (resolved.c.fluid_id, fluid, self.fluids),
            (resolved.c.swimmer_id, swimmer, self.swimmers),
            (resolved.c.material_id, material, self.materials),
        ):
            if codes:
                found.append(column.in_(select(table.c.id).where(table.c.code.in_(codes))))
        if self.since:
            found.append(resolved.c.at >= _moment("since", self.since, "T00:00:00"))
        if self.until:
            found.append(resolved.c.at <= _moment("until", self.until, "T23:59:59"))
        if self.people:
            found.append(run.c.by.in_(self.people))
        if self.series:
            found.append(run.c.series.in_(self.series))
        if self.text:
            like = f"%{_escaped(self.text)}%"
            columns = (run.c.code, run.c.note, run.c.series, run.c.video)
            found.append(or_(*(c.ilike(like, escape="\\") for c in columns)))
        if regimes:
            found += [holds(registry.regime(name)) for name in self.regimes]
        return found

    def needs_run(self) -> bool:
        """Whether a condition looks at the run itself, and not only at the stored view."""
        return bool(self.people or self.series or self.text)

    def in_words(self) -> str:
        """The question as one reads it: 'creeping and working tail, 1 <= Sp <= 3, kept, since 2026-03-01'."""
        parts = [" and ".join(self.regimes)] if self.regimes else []
        parts += [_range_in_words(key, *span) for key, span in self.ranges.items()]
        for lead, chosen in (("in", self.fluids), ("with", self.swimmers), ("made of", self.materials),
                             ("by", self.people), ("series", self.series)):  # fmt: skip
            if chosen:
                parts.append(f"{lead} {' or '.join(chosen)}")
        if self.text:
            parts.append(f"mentioning {self.text!r}")
        parts.append({"kept": "kept", "void": "void", "all": "kept or void"}[self.state])
        if self.since:
            parts.append(f"since {self.since}")
        if self.until:
            parts.append(f"until {self.until}")
        return ", ".join(parts)

    def as_options(self) -> str:
        """The options of `labbook runs` that ask the same."""
        words = [f"--regime {_quoted(name)}" for name in self.regimes]
        words += [f"--range {k} {low:.12g} {high:.12g}" for k, (low, high) in self.ranges.items()]
        for option, chosen in (("fluid", self.fluids), ("swimmer", self.swimmers), ("material", self.materials),
                               ("person", self.people), ("series", self.series)):  # fmt: skip
            words += [f"--{option} {_quoted(code)}" for code in chosen]
        for option, value in (("since", self.since), ("until", self.until), ("text", self.text)):
            if value:
                words.append(f"--{option} {_quoted(value)}")
        if self.state != "kept":
            words.append(f"--state {self.state}")
        return " ".join(words)


def holds(regime: Regime) -> ColumnElement:
    """The SQL condition that a run lies in a regime: in every band of it."""
    return and_(*(limit for band in regime.bands for limit in _limits(band)))


def _limits(band: Band) -> list[ColumnElement]:
    column = view_column(band.number)
    limits = []
    if band.low != float("-inf"):
        limits.append(column >= band.low if band.low_closed else column > band.low)
    if band.high != float("inf"):
        limits.append(column <= band.high if band.high_closed else column < band.high)
    return limits


def check_key(key: str, registry: Registry) -> str:
    """The key if the stored view holds it; Refusal otherwise."""
    if key not in registry.keys:
        raise Refusal("key", key, "is no quantity or number of a run", f"one of {', '.join(registry.keys)}")
    return key


def _between(key: str, low: float, high: float) -> ColumnElement:
    column = view_column(key)
    if low != low or high != high or low > high:
        raise Refusal("range", f"{key} {low:g} {high:g}", "is empty", "give the lower limit first")
    limits = [column.is_not(None)]
    if low != float("-inf"):
        limits.append(column >= low)
    if high != float("inf"):
        limits.append(column <= high)
    return and_(*limits)


def _moment(field_name: str, text: str, hour: str) -> str:
    return read_moment(field_name, text + hour if len(text.strip()) == 10 else text)


def _escaped(text: str) -> str:
    return text.replace("\\", "\\\\").replace("%", "\\%").replace("_", "\\_")


def _quoted(text: str) -> str:
    return shlex.quote(text)



def _range_in_words(key: str, low: float, high: float) -> str:
    unit = QUANTITIES[key].unit if key in QUANTITIES else ""
    tail = f" {unit}" if unit and unit != "1" else ""
    if (low, high) == (float("-inf"), float("inf")):
        return f"any {key}"
    if high == float("inf"):
        return f"{key} >= {low:g}{tail}"
    if low == float("-inf"):
        return f"{key} <= {high:g}{tail}"
    return f"{low:g} <= {key} <= {high:g}{tail}"


def day_in_words(moment: str) -> str:
    """A stored time as '1 March 2026'."""
    here = local(moment)
    return f"{here.day} {here.strftime('%B %Y')}"
