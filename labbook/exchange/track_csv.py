"""A track as delimited text: its separator, its header, and columns of numbers as pandas reads them."""

import csv
import io
import itertools
import re
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd

from labbook.errors import Refusal

LOOKED_AT = 1 << 20  # bytes in which control characters are looked for
LONGEST_HEADER = 1 << 16
PART = 1 << 18  # bytes that stay in the cache
_CONTROL = re.compile(rb"[\x01-\x08\x0e-\x1f]")
FIRST_ROWS = 200  # always looked at for cells beyond the header: a decimal comma among commas makes such


@dataclass(frozen=True, eq=False)
class Text:
    """A file of delimited text: header cells, start of its rows (byte and line), separator, decimal sign."""

    content: bytes
    header: list[str]
    start: int
    line: int
    separator: str
    decimal: str


def opened(content: bytes, name: str) -> Text:
    """The text with its header found: the first line that is not empty and no # comment.

    A header behind a # is taken where numbers follow it. Semicolon, tab or comma separate; with semicolons a
    comma is decimal. Errors: Refusal for what is not text, an empty file, and one whose first line holds
    numbers.
    """
    if b"\0" in content or _CONTROL.search(content, 0, LOOKED_AT):
        raise Refusal("track", name, "is neither text nor Parquet", "export it as CSV, UTF-8")
    if b"\n" not in content[:LONGEST_HEADER]:
        content = content.replace(b"\r", b"\n")
    start = 3 if content.startswith(b"\xef\xbb\xbf") else 0
    comment, number = "", 0
    while True:
        end = content.find(b"\n", start)
        line = _decoded(content[start : end if end >= 0 else len(content)]).strip("\r\n ")
        number += 1
        if line.strip() and not line.startswith("#"):
            break
        comment = line.lstrip("# \t") or comment
        if end < 0:
            raise Refusal("track", name, "is empty")
        start = end + 1
    separator = _separator(line)
    header = _cells(line, separator)
    if all(map(_is_number, header)):
        separator, rows = _separator(comment), header
        header = _cells(comment, separator)
        if len(header) != len(rows):
            raise Refusal(
                "track",
                name,
                "starts with numbers",
                "name the columns in the first line, e.g. t [s],x [px],y [px]",
            )
        number -= 1
    else:
        start = end + 1 if end >= 0 else len(content)
    comma = separator == ";" and content.find(b",", start) >= 0
    return Text(content, header, start, number, separator, "," if comma else ".")


def numbers(text: Text, places: Mapping[str, int], name: str) -> dict[str, np.ndarray]:
    """{role: floats} of the columns at these places; a cell that is no finite number is NaN.

    Errors: Refusal for a row with more cells than the header, and for no rows.
    """
    options = {
        "sep": text.separator, "decimal": text.decimal, "header": None, "names": range(len(text.header)),
        "usecols": sorted(set(places.values())), "index_col": False, "skipinitialspace": True,
        "encoding_errors": "replace",
    }  # fmt: skip
    try:
        try:
            table = pd.read_csv(_behind(text), dtype=float, **options)
        except ValueError:  # a cell that is no number, or no table: as text, which takes twice as long
            table = pd.read_csv(_behind(text), low_memory=False, **options)
    except pd.errors.EmptyDataError:
        table = pd.DataFrame()
    except (pd.errors.ParserError, ValueError):
        raise Refusal("track", name, "cannot be read as a table", "export it as CSV, UTF-8") from None
    if not len(table):
        raise Refusal("track", name, "has a header and no rows")
    _refuse_long_rows(text, name, len(table))
    return {role: as_floats(table[place], text.decimal) for role, place in places.items()}


def as_floats(column: pd.Series, decimal: str = ".") -> np.ndarray:
    """A column as floats, NaN where a cell is no finite number."""
    if column.dtype.kind in "biuf":
        values = column.to_numpy(float)
    else:
        cells = column.astype(str).str.strip()
        if decimal == ",":
            cells = cells.str.replace(",", ".")
        values = pd.to_numeric(cells, errors="coerce").to_numpy(float)
    return values if np.isfinite(values).all() else np.where(np.isfinite(values), values, np.nan)


def _refuse_long_rows(text, name, rows):
    """Refuse a row with cells beyond the header: pandas drops them, and those before have moved too."""
    width = len(text.header)
    separators = _count(text.content, text.separator, text.start)
    looked_at = None if separators > rows * (width - 1) else FIRST_ROWS
    lines = io.TextIOWrapper(_behind(text), encoding="utf-8", errors="replace", newline="")
    reader = csv.reader(lines, delimiter=text.separator, skipinitialspace=True)
    try:
        for cells in itertools.islice(reader, looked_at):
            if any(cell.strip() for cell in cells[width:]):
                said = f"line {text.line + reader.line_num} has {len(cells)} cells for {width} columns"
                raise Refusal("track", name, said, "where commas are decimal, separate by semicolons")
    except csv.Error:
        raise Refusal(
            "track", name, f"line {text.line + reader.line_num} cannot be read", "export it as CSV, UTF-8"
        ) from None


def _count(content, sign, start):
    """How often a sign stands in the content; faster than bytes.count for one in every line."""
    all_, sign = np.frombuffer(content, np.uint8), ord(sign)
    return sum(np.count_nonzero(all_[at : at + PART] == sign) for at in range(start, len(all_), PART))


def _behind(text):
    buffer = io.BytesIO(text.content)
    buffer.seek(text.start)
    return buffer


def _decoded(line: bytes) -> str:
    try:
        return line[:LONGEST_HEADER].decode("utf-8")
    except UnicodeDecodeError:
        return line[:LONGEST_HEADER].decode("latin-1")  # what Windows writes for µ and °


def _separator(line: str) -> str:
    if line.count(";") > line.count(","):
        return ";"
    return "\t" if "\t" in line and "," not in line else ","


def _cells(line: str, separator: str) -> list[str]:
    try:
        return next(csv.reader([line], delimiter=separator, skipinitialspace=True), [])
    except csv.Error:
        return line.split(separator)


def _is_number(cell: str) -> bool:
    try:
        float(cell.replace(",", ".") or "nan")
    except ValueError:
        return False
    return True
