"""Making, finding and opening a book: engines, migrations, and what cannot serve as a book."""

import os
import sqlite3
from contextlib import contextmanager
from pathlib import Path

from alembic import command
from alembic.config import Config
from alembic.runtime.migration import MigrationContext
from alembic.script import ScriptDirectory
from sqlalchemy import URL, Connection, Engine, create_engine, event, insert, inspect
from sqlalchemy.engine import make_url
from sqlalchemy.exc import ArgumentError, DatabaseError
from sqlalchemy.pool import NullPool

from labbook.book import stored_view
from labbook.book.clock import now
from labbook.book.tables import book
from labbook.errors import BookProblem
from labbook.registry.group import at_birth

BUSY_SECONDS = 30
CACHE_KIB = 64 * 1024
_NETWORK = {"nfs", "nfs4", "cifs", "smb3", "smbfs", "fuse.sshfs", "afs", "9p", "ceph", "glusterfs"}


def migrations_folder() -> Path:
    """Where the migrations lie: inside an installed package, or beside it in a checkout."""
    package = Path(__file__).resolve().parent.parent
    installed = package / "_data" / "migrations"
    return installed if installed.is_dir() else package.parent / "migrations"


def is_url(target: str) -> bool:
    return "://" in str(target)


def _config(connection: Connection | None = None) -> Config:
    config = Config()
    config.set_main_option("script_location", str(migrations_folder()))
    config.set_main_option("path_separator", "os")
    if connection is not None:
        config.attributes["connection"] = connection
    return config


def newest_revision() -> str:
    return ScriptDirectory.from_config(_config()).get_current_head()


def engine_for(target: str | Path) -> Engine:
    """An engine on a file path or database URL, with the settings that a shared book needs."""
    path = file_of(target)
    if path is None:
        return _server_engine(str(target))
    url = URL.create("sqlite", database=str(path.absolute()))
    _refuse_network_disk(path)
    engine = create_engine(url, poolclass=NullPool, connect_args={"timeout": BUSY_SECONDS})

    @event.listens_for(engine, "connect")
    def _settings(connection, _record):
        connection.isolation_level = None  # transactions are begun by _begin, not guessed by the driver
        cursor = connection.cursor()
        cursor.execute("PRAGMA foreign_keys=ON")
        cursor.execute("PRAGMA synchronous=FULL")  # what was acknowledged survives a power cut
        cursor.execute(f"PRAGMA cache_size=-{CACHE_KIB}")  # a bulk load spills its pages otherwise
        cursor.close()

    @event.listens_for(engine, "begin")
    def _begin(connection):
        writes = connection.get_execution_options().get("writes", False)
        connection.exec_driver_sql("BEGIN IMMEDIATE" if writes else "BEGIN")

    return engine


def _server_engine(text: str) -> Engine:
    try:
        return create_engine(make_url(text), pool_pre_ping=True)
    except ArgumentError:
        raise BookProblem(f"{text!r} is neither a file nor a database URL that labbook knows.") from None
    except ImportError as error:
        raise BookProblem(f"{text!r} needs the Python package {error.name}: install it.") from None


def file_of(target: str | Path) -> Path | None:
    """The file of a path or sqlite URL, None where the URL names a server."""
    text = str(target)
    if not is_url(text):
        return Path(text)
    if text.partition(":")[0].partition("+")[0] != "sqlite":
        return None
    database = make_url(text).database
    if not database or database == ":memory:":
        raise BookProblem(f"{text!r} names no file, and a book must last: give a path.")
    return Path(database)


def _refuse_network_disk(path: Path) -> None:
    mounts = Path("/proc/mounts")
    if not mounts.exists():
        return
    folder = os.path.realpath(path.parent)
    best, kind = "", ""
    for line in mounts.read_text().splitlines():
        point, filesystem = line.split()[1:3]
        inside = folder == point or folder.startswith(point.rstrip("/") + "/")
        if inside and len(point) > len(best):
            best, kind = point, filesystem
    if kind in _NETWORK:
        raise BookProblem(
            f"{path} lies on a network disk ({kind}), where a book would be damaged: "
            "keep it on a local disk, or use a PostgreSQL URL."
        )


@contextmanager
def reading(engine: Engine):
    """A connection that sees one consistent state and writes nothing."""
    with _said_plainly(engine), engine.connect() as connection, connection.begin():
        yield connection


@contextmanager
def writing(engine: Engine):
    """A connection in one write transaction: all of the block lands, or none of it."""
    with _said_plainly(engine), engine.connect() as connection:
        connection = connection.execution_options(writes=True)
        with connection.begin():
            yield connection


@contextmanager
def _said_plainly(engine: Engine):
    try:
        yield
    except (DatabaseError, sqlite3.DatabaseError) as error:
        problem = _problem(str(getattr(error, "orig", error)), engine.url.database)
        if problem is None:
            raise
        raise BookProblem(problem) from error


def _problem(text: str, name: str) -> str | None:
    said = {
        "locked": "is locked by another program for longer than "
        f"{BUSY_SECONDS} seconds: close what holds it and try again; nothing was changed.",
        "disk is full": "cannot grow, the disk is full: nothing was changed.",
        "readonly": "may not be written to: nothing was changed.",
        "read-only": "may not be written to: nothing was changed.",
        "not a database": "is not a book.",
        "malformed": "is damaged: restore a copy made with `labbook copy`.",
        "unable to open": "cannot be opened: look at the path and its permissions.",
        "disk I/O error": "cannot be read or written, the disk reports an error: nothing was changed.",
        "refused": "cannot be reached: is the database server running, and is the URL right?",
    }
    return next((f"{name} {tail}" for key, tail in said.items() if key in text), None)


def create(target: str | Path) -> Engine:
    """Make an empty book at a new file or in an empty database; BookProblem where something stands."""
    path = file_of(target)
    engine = engine_for(target)
    if path is not None:
        _claim(path)
    try:
        with _said_plainly(engine):
            if engine.dialect.name == "sqlite":
                with engine.connect() as connection:  # with 8 KiB a page holds three stored rows, not one
                    for pragma in ("page_size=8192", "journal_mode=WAL"):
                        connection.connection.driver_connection.execute(f"PRAGMA {pragma}")
            with engine.connect() as connection:
                if inspect(connection).get_table_names():
                    raise BookProblem(f"{engine.url.database} is not empty: open it, or choose another.")
                connection.rollback()
                command.upgrade(_config(connection.execution_options(writes=True)), "head")
            with writing(engine) as connection:
                stored_view.build(connection)
                connection.execute(insert(book).values(made=now(), registry=at_birth().fingerprint))
    except BaseException:
        engine.dispose()
        if path is not None:  # ours since _claim, and no book yet
            for name in (path, Path(f"{path}-wal"), Path(f"{path}-shm")):
                name.unlink(missing_ok=True)
        raise
    return engine


def _claim(path: Path) -> None:
    """Make the empty file, so that nobody else makes a book there; BookProblem where that cannot be."""
    try:
        path.open("xb").close()
    except FileExistsError:
        raise BookProblem(f"{path} exists already: open it, or choose another name.") from None
    except (FileNotFoundError, NotADirectoryError):
        raise BookProblem(f"{path.absolute().parent} is no folder: make it first.") from None
    except OSError as error:
        raise BookProblem(f"{path} cannot be made: {error.strerror}.") from None


def open_existing(target: str | Path) -> Engine:
    """Open a book, migrating an older one; BookProblem where it is missing, foreign or newer."""
    path = file_of(target)
    if path is not None:
        _look_at(path)
    engine = engine_for(target)
    try:
        with _said_plainly(engine), engine.connect() as connection:
            tables = set(inspect(connection).get_table_names())
            if not {"book", "ledger", "alembic_version"} <= tables:
                raise BookProblem(f"{engine.url.database} is a database, but not a book.")
            revision = MigrationContext.configure(connection).get_current_revision()
            connection.rollback()
            if revision != newest_revision():
                _migrate(connection.execution_options(writes=True), revision, engine.url.database)
    except BaseException:
        engine.dispose()
        raise
    return engine


def _look_at(path: Path) -> None:
    """BookProblem where a path holds no SQLite file."""
    try:
        with path.open("rb") as file:
            if file.read(16) != b"SQLite format 3\0":
                raise BookProblem(f"{path} is not a book.")
    except FileNotFoundError:
        raise BookProblem(f"{path} does not exist: make it with `labbook new {path}`.") from None
    except IsADirectoryError:
        raise BookProblem(f"{path} is a folder, not a book.") from None
    except OSError as error:
        raise BookProblem(f"{path} cannot be opened: {error.strerror}.") from None


def _migrate(connection: Connection, revision: str, name: str) -> None:
    known = {script.revision for script in ScriptDirectory.from_config(_config()).walk_revisions()}
    if revision not in known:
        raise BookProblem(f"{name} was written by a newer labbook (revision {revision}): update labbook.")
    command.upgrade(_config(connection), "head")


def upgrade_to(engine: Engine, revision: str) -> None:
    """Migrate to a revision, up or down (for tests and for going back to an older labbook)."""
    with engine.connect() as connection:
        head = newest_revision()
        (command.upgrade if revision in ("head", head) else command.downgrade)(
            _config(connection), revision
        )
