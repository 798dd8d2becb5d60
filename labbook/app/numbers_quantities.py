"""Numbers, quantities: the vocabulary as one table, with units, plausible ranges, and where each is from."""

import math

from labbook.app import session
from labbook.charts.axes import written_unit
from labbook.registry.quantities import QUANTITIES, Quantity, written_dimension
from labbook.registry.written import SHOWN, shown


def part() -> None:
    """Every quantity of the vocabulary."""
    session.note("One key from form to file, formula and axis. Outside the plausible range a value is warned "
                 "about, not refused.")  # fmt: skip
    rows = [
        (q.key, q.symbol, q.name, written_unit(q.unit) or "1", ", ".join(q.units), _plausible(q), _from(q))
        for q in QUANTITIES.values()
    ]
    session.table(("key", "symbol", "name", "SI", "accepted units", "plausible", "from"), rows)


def _plausible(row: Quantity) -> str:
    if not math.isfinite(row.low):
        return ""
    unit = SHOWN.get(row.key) or row.unit
    low, high = (shown(row.key, v, None, unit) for v in (row.low, row.high))
    return f"{low.removesuffix(' ' + unit)} to {high}"


def _from(row: Quantity) -> str:
    if row.of != "derived":
        return row.of
    return row.formula and f"= {row.formula}" or f"derived, {written_dimension(row.dimension)}"
