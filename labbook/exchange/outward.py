"""Tables out: CSV and JSON of runs, with units in the header and spreadsheet formulas made harmless."""

import csv
import io
import json
from collections.abc import Iterable

import pandas as pd

from labbook.book.run_sheet import RunSheet


def harmless(value):
    """A text cell that a spreadsheet will not take for a formula."""
    if isinstance(value, str) and value[:1] in ("=", "+", "-", "@", "\t", "\r"):
        return "'" + value
    return value


def frame_as_csv(table: pd.DataFrame, comment: str = "") -> str:
    """CSV of a frame in SI: `key [unit]` headers, full precision, empty for absent.

    A frame with numbers in other dialects than the house's has a column `dialect` that says so on every row.
    """
    units = table.attrs.get("units", {})
    spoken = "; ".join(f"{n}: {w}" for n, w in table.attrs.get("dialects", {}).items() if w != "house")
    if spoken:
        table = table.assign(dialect=spoken)
    out = io.StringIO()
    if comment:
        out.write("".join(f"# {line}\n" for line in comment.splitlines()))
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow([_header(c, units) for c in table.columns])
    for row in table.itertuples(index=False, name=None):
        writer.writerow([_cell(v) for v in row])
    return out.getvalue()


def _header(column: str, units: dict[str, str]) -> str:
    key = next((column.removeprefix(p) for p in ("u_own_", "u_shared_", "u_") if
                column.startswith(p) and column.removeprefix(p) in units), column)  # fmt: skip
    unit = units.get(key)
    return f"{column} [{unit}]" if unit and unit != "1" else column


def _cell(value):
    if value is None or value is pd.NaT or (isinstance(value, float) and value != value):
        return ""
    if isinstance(value, pd.Timestamp):
        return value.isoformat(timespec="seconds")
    if isinstance(value, float):
        return repr(float(value))
    return harmless(value)


def sheets_as_json(sheets: Iterable[RunSheet]) -> str:
    """A JSON list, one object a run, SI values, null where absent."""
    return json.dumps([s.row() for s in sheets], ensure_ascii=False, allow_nan=False, indent=1)
