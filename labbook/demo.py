"""The demo book: the invented group of seeds_demo, loaded as a group would load and amend it."""

import csv
from pathlib import Path

from labbook.api import Book
from labbook.book.loading import Progress
from labbook.errors import LabbookError


def demo_folder() -> Path:
    """The shelf folder of the demo: inside an installed package, or beside it in a checkout."""
    package = Path(__file__).resolve().parent
    installed = package / "_data" / "seeds_demo"
    return installed if installed.is_dir() else package.parent / "seeds_demo"


def make_demo(target: Path, progress: Progress = lambda what, n: None) -> Book:
    """Make the demo book: the shelf folder loaded, tracks attached, some entries amended as a group would."""
    target.parent.mkdir(parents=True, exist_ok=True)
    part = target.with_name(target.name + ".part")
    for name in (part, Path(f"{part}-wal"), Path(f"{part}-shm")):
        name.unlink(missing_ok=True)
    book = Book.new(part)
    try:
        book.load(demo_folder(), by="sable", progress=progress)
        _attach_tracks(book, progress)
        _amend_demo(book)
    except LabbookError:
        book.close()
        raise
    book.copy(target)
    book.close()
    for name in (part, Path(f"{part}-wal"), Path(f"{part}-shm")):
        name.unlink(missing_ok=True)
    return Book.open(target)


def _attach_tracks(book: Book, progress: Progress) -> None:
    """Each file of tracks/ to the run it is named after, by the person who logged that run."""
    folder = demo_folder() / "tracks"
    runs = book.runs(columns=("f",))
    people = dict(zip(runs["code"], runs["by"], strict=True))
    with open(folder / "settings.csv", encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    for row in rows:
        code = Path(row["file"]).stem
        settings = {"axis": row["axis [deg]"], "drift": row["drift"], "columns": _columns(row["columns"])}
        content = (folder / row["file"]).read_bytes()
        book.attach_track(code, content, row["file"], settings, by=people[code])
        progress("reducing tracks", 1)


def _columns(text: str) -> dict[str, str]:
    """{role: header} from 'x=X_head,y=Y_head'."""
    return dict(one.split("=", 1) for one in text.split(",") if one)


def _amend_demo(book: Book) -> None:
    runs = book.runs(columns=("f", "T"))
    slow = runs[runs["T"].notna()].iloc[[40, 210, 480]]
    reasons = (
        ("note", "camera focus checked afterwards", "note was forgotten"),
        ("series", "recounted", "belongs to the recount"),
        ("T", "21.9 degC", "thermometer read again from the photograph"),
    )
    for code, by, (column, value, why) in zip(slow["code"], slow["by"], reasons, strict=True):
        book.amend(code, by=by, why=why, confirm=True, **{column: value})
