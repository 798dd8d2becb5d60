"""A safe copy of a book while others write to it."""

import os
import sqlite3
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
    source = sqlite3.connect(engine.url.database)
    try:
        with sqlite3.connect(part) as destination:
            source.backup(destination, pages=4096)
            destination.execute("PRAGMA journal_mode=WAL")
        destination.close()
        os.replace(part, path)
    except (sqlite3.Error, OSError) as error:
        part.unlink(missing_ok=True)
        raise BookProblem(f"{path} could not be written: {error}.") from error
    finally:
        source.close()
