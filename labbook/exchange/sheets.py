"""Sheets in: a shelf folder, a workbook or one CSV file read into drafts, with every bad cell's place."""

import csv
import io
import re
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from datetime import date, datetime, time
from operator import itemgetter
from pathlib import Path
from zipfile import BadZipFile

import openpyxl
from openpyxl.utils.exceptions import InvalidFileException

from labbook.book.arrivals import placed
from labbook.book.drafts import DraftReader
from labbook.book.loading import SheetRow
from labbook.book.records import KINDS, LOADING_ORDER, SHEETS, kind
from labbook.errors import Refusal
from labbook.exchange.collector import paused_collector

LARGEST_FILE = 512 * 1024 * 1024
AT_A_TIME = 1_000  # rows between two words about the progress
_HEADER = re.compile(r"\s*([A-Za-z_]\w*)\s*(?:\[([^\]]*)\]|\(([^)]*)\))?\s*")


@dataclass(frozen=True)
class Table:
    """One sheet as text: its kind, its name for messages, header cells, and (line number, cells) rows."""

    kind: str
    name: str
    header: list[str]
    rows: list[tuple[int, list[str]]]
    decimal_comma: bool = False


@paused_collector()
def read_tables(path: str | Path) -> list[Table]:
    """The sheets of a folder, a workbook or one CSV file, in the order in which they must be loaded."""
    path = Path(path)
    if path.is_dir():
        files = {
            p.stem.lower(): p
            for p in sorted(path.iterdir())
            if p.suffix.lower() == ".csv" and p.stem.lower() in SHEETS
        }
        if not files:
            raise Refusal("sheet", path.name, "this folder holds no sheet", f"name them {', '.join(SHEETS)}.csv")
        tables = [_read_csv(p, SHEETS[stem]) for stem, p in files.items()]
    elif not path.exists():
        raise Refusal("sheet", str(path), "there is no such file or folder")
    elif path.suffix.lower() in (".xlsx", ".xlsm"):
        tables = _read_workbook(path)
    else:
        tables = [_read_csv(path, None)]
    return sorted(tables, key=lambda t: LOADING_ORDER.index(t.kind))


def _read_csv(path: Path, kind_name: str | None) -> Table:
    if path.stat().st_size > LARGEST_FILE:
        raise Refusal("sheet", path.name, "is larger than 512 MB", "split it")
    try:
        text = path.read_bytes().decode("utf-8-sig")
    except UnicodeDecodeError:
        raise Refusal("sheet", path.name, "is not UTF-8 text", "save it as CSV UTF-8") from None
    return table_from_text(text, path.name, kind_name)


@paused_collector()
def table_from_text(text: str, name: str, kind_name: str | None = None) -> Table:
    """A sheet from CSV text; its kind follows from the file name or from the columns where none is given."""
    if "\0" in text:
        raise Refusal("sheet", name, "is not a text file", "save it as CSV UTF-8")
    first = text.lstrip("\r\n").split("\n", 1)[0]
    semicolon = first.count(";") > first.count(",")
    delimiter = ";" if semicolon else "\t" if "\t" in first and "," not in first else ","
    reader = csv.reader(io.StringIO(text), delimiter=delimiter)
    try:
        lines = [(reader.line_num, cells) for cells in reader if any(map(str.strip, cells))]
    except csv.Error as error:
        raise Refusal("sheet", name, f"cannot be read as CSV ({error})") from None
    if not lines:
        raise Refusal("sheet", name, "is empty")
    header = lines[0][1]
    return Table(kind_name or _kind_of(name, header), name, header, lines[1:], semicolon)


def _kind_of(name: str, header: list[str]) -> str:
    stem = Path(name).stem.lower()
    if stem in SHEETS:
        return SHEETS[stem]
    columns = {m[1] for cell in header if (m := _HEADER.fullmatch(cell))}
    fits = [k.name for k in KINDS.values() if set(k.required) <= columns and columns <= set(k.columns)]
    if len(fits) == 1:
        return fits[0]
    if {"swimmer", "fluid"} <= columns:
        return "run"
    raise Refusal("sheet", name, "does not tell what it holds", f"name it {', '.join(SHEETS)}.csv")


def _read_workbook(path: Path) -> list[Table]:
    try:
        book = openpyxl.load_workbook(path, read_only=True, data_only=True)
        tables = [table for sheet in book.worksheets for table in _workbook_table(path.name, sheet)]
    # BadZipFile has no base of its own, and XML faults are SyntaxErrors
    except (InvalidFileException, BadZipFile, KeyError, ValueError, OSError, EOFError, SyntaxError) as error:
        raise Refusal("sheet", path.name, f"is not a workbook that can be read ({error})") from None
    book.close()
    if not tables:
        raise Refusal("sheet", path.name, "holds no sheet of a known name", f"name them {', '.join(SHEETS)}")
    return tables


def _workbook_table(name: str, sheet) -> Iterator[Table]:
    kind_name = SHEETS.get(sheet.title.strip().lower())
    if kind_name is None:
        return
    lines = [(n, [_cell(c) for c in row]) for n, row in enumerate(sheet.iter_rows(values_only=True), start=1)]
    lines = [(n, cells) for n, cells in lines if any(cells)]
    if lines:
        yield Table(kind_name, f"{name} {sheet.title}", lines[0][1], lines[1:])


def _cell(value) -> str:
    if value is None:
        return ""
    if isinstance(value, datetime):
        return value.date().isoformat() if value.time() == time() else value.isoformat()
    if isinstance(value, date):
        return value.isoformat()
    if isinstance(value, float) and value.is_integer() and abs(value) < 1e15:
        return str(int(value))
    return str(value).strip()


def read_rows(
    tables: list[Table], progress: Callable[[str, int], None] = lambda what, n: None
) -> tuple[list[SheetRow], list[Refusal]]:
    """Drafts of every row, and everything refused, each with sheet, line and column."""
    rows: list[SheetRow] = []
    refused: list[Refusal] = []
    for table in tables:
        try:
            columns, units = _columns(table)
        except Refusal as refusal:
            refused.append(placed(table.name, refusal))
            continue
        reader = DraftReader(table.kind, columns, units, table.decimal_comma)
        for start in range(0, len(table.rows), AT_A_TIME):
            part = table.rows[start : start + AT_A_TIME]
            fresh, found = _read_some(reader, table.name, part)
            rows += fresh
            refused += found
            progress(f"reading {table.name}", len(part))
    return rows, refused


def _read_some(reader: DraftReader, name: str, lines) -> tuple[list[SheetRow], list[Refusal]]:
    """Drafts of some (line number, cells) of a sheet, and what is refused, in the order of the lines."""
    drafts, found = reader.read([cells for _, cells in lines])
    where, width = [f"{name} line {n}" for n, _ in lines], reader.width
    too_long = {i for i, (_, cells) in enumerate(lines) if any(map(str.strip, cells[width:]))}
    refused = [(i, placed(where[i], refusal)) for i, refusal in found if i not in too_long]
    for i in too_long:
        said = f"has {len(lines[i][1])} cells for {width} columns"
        refused.append((i, Refusal(where[i], None, said)))
    rows = [row for i, row in enumerate(map(SheetRow, drafts, where)) if i not in too_long]
    return rows, [refusal for _, refusal in sorted(refused, key=itemgetter(0))]


def _columns(table: Table) -> tuple[list[str], dict[str, str]]:
    """Column keys and the header's units."""
    columns, units = [], {}
    spec = kind(table.kind)
    for cell in table.header:
        if not cell.strip():
            columns.append("")
            continue
        match = _HEADER.fullmatch(cell)
        if match is None:
            raise Refusal("header", cell, "cannot be read", "write key [unit], e.g. U [mm/s]")
        key, unit = match[1], (match[2] or match[3] or "").strip()
        if key not in spec.columns:
            raise Refusal("header", cell, f"{spec.sheet} has no such column", f"it has {', '.join(spec.columns)}")
        if key in columns:
            raise Refusal("header", cell, "stands twice")
        if unit and key in spec.texts:
            raise Refusal("header", cell, "a text column has no unit")
        columns.append(key)
        if unit:
            units[key] = unit
    missing = [c for c in spec.required if c not in columns]
    if missing:
        raise Refusal("header", None, f"lacks {', '.join(missing)}", f"every {spec.name} needs them")
    return columns, units


def counted(tables: list[Table]) -> Iterator[tuple[str, int]]:
    """(sheet, number of rows) for each table."""
    return ((t.name, len(t.rows)) for t in tables)
