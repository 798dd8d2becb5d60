"""A safe copy of a book while others write to it."""

import os
import sqlite3
from contextlib import closing
from pathlib import Path

from sqlalchemy import Engine

from labbook.errors import BookProblem


def copy(engine: Engine, target: str | Path) -> None:
    """Write a consistent copy of a SQLite book to a new file; nothing is left behind where that fails."""
    if engine.dialect.name != "sqlite":
        raise BookProblem("this book lives in a database server: copy it with the server's own dump.")
    path = Path(target)
    if path.exists():
        raise BookProblem(f"{path} exists already: choose another name.")
    if not path.absolute().parent.is_dir():
        raise BookProblem(f"{path.absolute().parent} is no folder: make it first.")
    part = path.with_name(path.name + ".part")
    try:
        with closing(sqlite3.connect(engine.url.database)) as source, closing(sqlite3.connect(part)) as destination:
            source.backup(destination)  # in one step: between steps a writer would make it begin again
            destination.execute("PRAGMA journal_mode=WAL")
        os.replace(part, path)
    except (sqlite3.Error, OSError) as error:
        for name in (part, Path(f"{part}-wal"), Path(f"{part}-shm")):
            name.unlink(missing_ok=True)
        raise BookProblem(f"{path} could not be written: {error}.") from error
