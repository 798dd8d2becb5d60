"""Tracks in: a tracker's CSV or Parquet file becomes SI arrays, with a word on what could not be read."""

import io
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq

from labbook.errors import Refusal
from labbook.exchange import track_csv
from labbook.exchange.track_columns import LENGTHS, PAIRS, Column, found, named
from labbook.registry.typed import STATED, Typed, read

LARGEST_FILE = 256 * 1024 * 1024
MOST_ROWS = 20_000_000  # a small Parquet file may stand for any number of them
LONGEST_STEP = 300.0  # frames between two rows: more, and the times are no seconds
SCALED = "3.2(1) um/px"
NEEDED = ("t", "frame", "x", "y")


@dataclass(frozen=True, eq=False)
class TrackFile:
    """A track in SI, row by row as in the file; None for what it does not hold.

    name: for messages; t: s; x, y, head_x, head_y, tip_x, tip_y: m; heading: rad; NaN where a cell held no
    number. scale, fps: as typed, None where the file's own units served; scale_u, time_u: relative standard
    uncertainties of lengths and of times: that of the scale, and that of fps where one was stated. rows:
    frames read; columns: role -> header in the file; unreadable: role -> cells without a number, roles that
    have such.
    """

    name: str
    t: np.ndarray
    x: np.ndarray
    y: np.ndarray
    heading: np.ndarray | None
    head_x: np.ndarray | None
    head_y: np.ndarray | None
    tip_x: np.ndarray | None
    tip_y: np.ndarray | None
    scale: Typed | None
    fps: Typed | None
    scale_u: float
    time_u: float
    rows: int
    columns: dict[str, str]
    unreadable: dict[str, int]

    def keywords(self) -> dict:
        """What physics.tracks.reduce takes of the file, SI; a head point goes before a heading."""
        ahead = ("heading",) if self.head_x is None else ("head_x", "head_y")
        names = ("t", "x", "y", *ahead, "tip_x", "tip_y")
        known = {k: getattr(self, k) for k in names if getattr(self, k) is not None}
        return known | {"scale_u": self.scale_u, "time_u": self.time_u}

    def positions(self) -> dict[str, np.ndarray]:
        """t, x and y alone, as physics.track_drift.drift_of takes them."""
        return {"t": self.t, "x": self.x, "y": self.y}

    def report(self) -> list[str]:
        """What was read, one sentence each."""
        from_ = ", ".join(
            header if header == role else f"{role} from {header!r}" for role, header in self.columns.items()
        )
        said = [f"{self.rows} frames read: {from_}"]
        if self.scale is not None:
            said.append(
                f"scale {self.scale.text}" + ("" if self.scale.origin == STATED else ", u from its digits")
            )
        if self.fps is not None:
            said.append(f"{self.fps.value:g} frames a second")
        said += [f"{n} cells of {role} hold no number" for role, n in self.unreadable.items()]
        return said


def read_track(
    source: str | Path | bytes, *, name: str = "", columns: Mapping[str, str] | None = None,
    fps: str | float | Typed | None = None, scale: str | Typed | None = None,
    rig: Mapping[str, str | float | Typed | None] | None = None,
) -> TrackFile:  # fmt: skip
    """A track from a path or a file's bytes: CSV (comma, semicolon, tab) or Parquet, from any tracker.

    columns: role -> column of the file where its name is another, e.g. {"x": "X_pos", "t": "time [ms]"};
    roles are t (or time) or frame, x, y, heading, head_x, head_y, tip_x, tip_y, and headers may carry units.
    scale: '3.2(1) um/px', needed where x and y have no length unit and refused where they have one. fps: '30
    fps' or 30, needed for frames without times. rig: {"scale": ..., "fps": ...} that serve where the file
    needs them and none is given.

    Errors: Refusal for a file that is too large (looked at before it is read), not text or Parquet, empty,
    without the columns, with a column that holds no number, without scale or with two, without frame rate.
    """
    content, name = _content(source, name)
    if content[:4] == b"PAR1":
        table = _parquet(content, name)
        header = table.schema_arrow.names
        chosen = found(header, columns)
        values = _parquet_columns(table, chosen, name)
    else:
        text = track_csv.opened(content, name)
        chosen = found(text.header, columns)
        values = track_csv.numbers(text, {role: column.place for role, column in chosen.items()}, name)
        header = text.header
    counts = {role: int(np.count_nonzero(np.isnan(column))) for role, column in values.items()}
    rows = len(values["x"])
    for role in [role for role, count in counts.items() if count == rows]:
        if role in NEEDED or role in (columns or {}):
            said = f"the file has {named(header)}"
            raise Refusal(role, chosen[role].header, "no cell of this column holds a number", said)
        for one in next((pair for pair in PAIRS if role in pair), (role,)):
            values.pop(one, None)  # a tracker may have the column for all, and no tail in this film
            chosen.pop(one, None)
    rig = rig or {}
    scale = _scale(chosen, scale, rig.get("scale"))
    fps = _rate(fps if fps is not None else rig.get("fps"))
    for role, column in values.items():
        values[role] = _in_si(column, chosen[role], scale if role in LENGTHS else None)
    counted = "frame" in values
    if counted:
        values["t"] = _times(values.pop("frame"), fps)
    elif chosen["t"].unit == "s?" and fps is not None:
        _refuse_other_clock(values["t"], chosen["t"].header, fps)
    return TrackFile(
        name, **{k: values.get(k) for k in ("t", "heading", *LENGTHS)}, rows=rows,
        scale=scale, scale_u=scale.u / scale.value if scale else 0.0,
        fps=fps if counted else None, time_u=fps.u / fps.value if counted and fps.origin == STATED else 0.0,
        columns={role: column.header for role, column in chosen.items()},
        unreadable={role: n for role, n in counts.items() if n},
    )  # fmt: skip


def content_of(source: str | Path) -> bytes:
    """A track file's bytes, if it is a file of a size that tracks have."""
    path = Path(source)
    try:
        if not path.exists():
            raise Refusal("track", path.name, "there is no such file")
        if not path.is_file():
            raise Refusal("track", path.name, "is not a file")
        _refuse_large(path.stat().st_size, path.name)
        return path.read_bytes()
    except (OSError, ValueError) as error:
        if isinstance(error, Refusal):
            raise
        reason = getattr(error, "strerror", None) or "its name is no file's name"
        raise Refusal("track", path.name, f"cannot be read ({reason})") from None


def _content(source, name):
    if isinstance(source, (bytes, bytearray, memoryview)):
        content, name = bytes(source), name or "track"
        _refuse_large(len(content), name)
    else:
        content, name = content_of(source), name or Path(source).name
    if not content or content.isspace():
        raise Refusal("track", name, "is empty")
    return content, name


def _refuse_large(size, name):
    if size > LARGEST_FILE:
        raise Refusal("track", name, f"has {size / 2**20:.0f} MB, and at most {LARGEST_FILE >> 20} MB are read",
                      "export time and positions alone, or cut it")  # fmt: skip


def _parquet(content, name):
    try:
        table = pq.ParquetFile(io.BytesIO(content))
    except (pa.ArrowException, OSError, ValueError):
        raise Refusal("track", name, "is a damaged Parquet file", "export it again") from None
    if not 0 < table.metadata.num_rows <= MOST_ROWS:
        raise Refusal("track", name, f"has {table.metadata.num_rows} rows", f"1 to {MOST_ROWS} are read")
    return table


def _parquet_columns(table, chosen: Mapping[str, Column], name):
    names = table.schema_arrow.names
    try:
        read_in = table.read(
            columns=sorted({names[column.place] for column in chosen.values()}), use_threads=False
        )
        frame = read_in.to_pandas(ignore_metadata=True)
    except (pa.ArrowException, OSError, ValueError):
        raise Refusal("track", name, "is a damaged Parquet file", "export it again") from None
    values = {}
    for role, column in chosen.items():
        cells = frame[names[column.place]]
        if cells.dtype.kind in "mM":
            raise Refusal(
                role, column.header, "holds dates or durations, and numbers are needed", "export seconds"
            )
        values[role] = track_csv.as_floats(cells)
    return values


def _scale(chosen, scale, usual) -> Typed | None:
    """The scale that lengths in pixels need; None where the headers carry units."""
    if chosen["x"].unit != "px":
        if scale is not None:
            typed = scale.text if isinstance(scale, Typed) else scale
            raise Refusal("scale", typed, f"x is in {chosen['x'].unit} already", "leave the scale out")
        return None
    scale = scale if scale is not None else usual
    if scale is None:
        raise Refusal(
            "scale",
            None,
            "x and y carry no length unit",
            f"give a scale, e.g. {SCALED}, or head them x [um], y [um]",
        )
    return scale if isinstance(scale, Typed) else read("scale", str(scale))


def _rate(fps) -> Typed | None:
    return fps if fps is None or isinstance(fps, Typed) else read("fps", str(fps), "1/s")


def _times(frame, fps):
    if fps is None:
        raise Refusal(
            "fps", None, "the track counts frames and has no times", "give the frame rate, e.g. 30 fps"
        )
    return frame / fps.value


def _in_si(values, column, scale):
    slope = column.slope if scale is None else scale.value
    return values if slope == 1.0 else slope * values


def _refuse_other_clock(t, header, fps):
    """Refuse times that cannot be seconds: a clock of milliseconds without unit slows all 1000-fold."""
    steps = np.abs(np.diff(t))
    steps = steps[steps > 0.0]
    if len(steps) and float(np.median(steps)) * fps.value > LONGEST_STEP:
        said = f"a step of {np.median(steps):.4g} is too long for seconds at {fps.value:g} frames a second"
        raise Refusal("t", header, said, "say its unit, e.g. t [ms]")
