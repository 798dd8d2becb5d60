"""What a track file's header says before its rows are read: its columns, those known by name, what is still needed."""

import io
import re
from collections.abc import Mapping, Sequence
from typing import NamedTuple

import pyarrow as pa
import pyarrow.parquet as pq

from labbook.errors import Refusal
from labbook.exchange import track_csv
from labbook.exchange.track_columns import NAMES, found

_UNIT = re.compile(r"\s*[\[(].*", re.DOTALL)


class Needs(NamedTuple):
    """What the columns in use leave open: a scale for lengths in pixels, a frame rate for counted frames."""

    scale: bool
    fps: bool


def header_of(content: bytes, name: str) -> list[str]:
    """The columns of a CSV or Parquet file as it heads them; Refusal for what is neither."""
    if not content.strip():
        raise Refusal("track", name, "is empty")
    if content[:4] != b"PAR1":
        return [cell.strip() for cell in track_csv.opened(content, name).header]
    try:
        return list(pq.ParquetFile(io.BytesIO(content)).schema_arrow.names)
    except (pa.ArrowException, OSError, ValueError):
        raise Refusal("track", name, "is a damaged Parquet file", "export it again") from None


def known_by_name(header: Sequence[str]) -> dict[str, str]:
    """{role: column} of the columns that a reader would find without being told."""
    bare = {column: _UNIT.sub("", column).strip().lower() for column in header}
    return {role: column for role, names in NAMES.items() for column in header if bare[column] in names}


def needs(header: Sequence[str], asked: Mapping[str, str] | None = None) -> Needs:
    """What reading these columns will need; Refusal as track_columns.found."""
    columns = found(header, asked)
    return Needs(columns["x"].unit == "px", "frame" in columns)
