"""Migrations and opening: models equal migrations, a filled book survives a rebuild, and what is no book is refused."""

import os
import shutil
import sqlite3
import subprocess
import sys
from contextlib import closing
from pathlib import Path

import pytest
from alembic.autogenerate import compare_metadata
from alembic.runtime.migration import MigrationContext
from sqlalchemy import create_engine, event, inspect

from labbook import Book, BookProblem
from labbook.book import opening, stored_view
from labbook.book.tables import metadata

SOURCE = Path(opening.__file__).resolve().parents[2] / "migrations"

# a revision that rebuilds three tables that others refer to, as SQLite's batch mode does it
REBUILD = '''"""A later book."""
import sqlalchemy as sa
from alembic import op

revision = "9001"
down_revision = "0003"
branch_labels = None
depends_on = None


def upgrade():
    with op.batch_alter_table("run", recreate="always") as batch:
        batch.add_column(sa.Column("weather", sa.String(20)))
    with op.batch_alter_table("swimmer", recreate="always") as batch:
        batch.add_column(sa.Column("colour", sa.String(20)))
    with op.batch_alter_table("fluid", recreate="always") as batch:
        batch.alter_column("kind", type_=sa.String(80))


def downgrade():
    with op.batch_alter_table("run", recreate="always") as batch:
        batch.drop_column("weather")
    with op.batch_alter_table("swimmer", recreate="always") as batch:
        batch.drop_column("colour")
    with op.batch_alter_table("fluid", recreate="always") as batch:
        batch.alter_column("kind", type_=sa.String(64))
'''


@pytest.fixture
def later(tmp_path, monkeypatch):
    """A function that installs a newer labbook's migrations, with one revision more."""

    def install(text=REBUILD):
        folder = tmp_path / "migrations"
        shutil.copytree(SOURCE, folder, ignore=shutil.ignore_patterns("__pycache__"))
        (folder / "versions" / "9001_later.py").write_text(text, encoding="utf-8")
        monkeypatch.setattr(opening, "migrations_folder", lambda: folder)
        return folder

    return install


def facts_only(obj, name, type_, reflected, compare_to):
    table = name if type_ == "table" else getattr(getattr(obj, "table", None), "name", None)
    return table != stored_view.VIEW_NAME


def test_models_equal_migrations(empty):
    with empty.engine.connect() as connection:
        context = MigrationContext.configure(
            connection, opts={"compare_type": True, "include_object": facts_only, "render_as_batch": True}
        )
        assert compare_metadata(context, metadata) == []


def test_a_difference_between_models_and_migrations_would_show(empty, by_hand):
    empty.close()
    by_hand(empty, "ALTER TABLE run ADD COLUMN weather VARCHAR(20)")
    with empty.engine.connect() as connection:
        context = MigrationContext.configure(connection, opts={"include_object": facts_only})
        assert [change[0] for change in compare_metadata(context, metadata)] == ["remove_column"]


def test_autogenerate_leaves_the_stored_view_alone(empty):
    with empty.engine.connect() as connection:
        context = MigrationContext.configure(connection)
        changes = compare_metadata(context, metadata)
    assert changes, "without the filter Alembic would drop the view, so the filter is needed"
    text = (SOURCE / "env.py").read_text(encoding="utf-8")
    assert "include_object=facts_only" in text


def test_the_ledger_grows_only_in_a_migrated_book(empty):
    names = {
        t
        for (t,) in sqlite3.connect(empty.target).execute(
            "select name from sqlite_master where type='trigger'"
        )
    }
    assert names == {"ledger_no_update", "ledger_no_delete"}


def test_a_filled_book_survives_a_table_rebuild_up_and_down(filled, counts, later):
    before, runs = counts(filled), filled.runs(kept=False)
    filled.close()
    later()
    with Book.open(filled.target) as book:  # opening migrates
        assert counts(book) == before
        with book.engine.connect() as connection:
            assert "weather" in {c["name"] for c in inspect(connection).get_columns("run")}
            assert connection.exec_driver_sql("PRAGMA foreign_key_check").fetchall() == []
            assert connection.exec_driver_sql("PRAGMA foreign_keys").scalar() == 1
            # the children still refer to the table by its own name
            assert {k["referred_table"] for k in inspect(connection).get_foreign_keys("ledger_run")} == {
                "run",
                "ledger",
            }
        assert book.check() == []
        assert book.record(swimmer="reed-1", fluid="syrup", f="0.5 Hz", by="wren") == "R-0011"
        assert book.check() == []
        opening.upgrade_to(book.engine, "0003")
        with book.engine.connect() as connection:
            assert "weather" not in {c["name"] for c in inspect(connection).get_columns("run")}
        after = counts(book)
        assert {t: after[t] - before[t] for t in before} == {
            **dict.fromkeys(before, 0), "run": 1, "resolved": 1, "ledger": 1, "ledger_run": 1,
        }  # fmt: skip
        assert book.check() == []
        assert book.runs(kept=False)["Sp"].iloc[:10].tolist() == pytest.approx(
            runs["Sp"].tolist(), rel=0, abs=0, nan_ok=True
        )


def test_a_migration_that_would_orphan_rows_is_undone(filled, counts, later):
    before = counts(filled)
    filled.close()
    later(REBUILD.replace('    with op.batch_alter_table("run"', '    op.execute("DELETE FROM swimmer")\n'
                          '    with op.batch_alter_table("run"', 1))  # fmt: skip
    assert "nothing was changed" in refused(lambda: Book.open(filled.target))
    assert counts(filled) == before


def test_down_to_nothing_and_up_again(filled):
    opening.upgrade_to(filled.engine, "base")
    with filled.engine.connect() as connection:
        assert set(inspect(connection).get_table_names()) == {"alembic_version"}
        connection.rollback()
    opening.upgrade_to(filled.engine, "head")
    with filled.engine.connect() as connection:
        assert {"run", "ledger", "reading"} <= set(inspect(connection).get_table_names())


def refused(action) -> str:
    with pytest.raises(BookProblem) as found:
        action()
    said = str(found.value)
    assert said.endswith(".") and "\n" not in said and "Traceback" not in said
    return said


def test_a_newer_book_is_refused_and_left_alone(filled, by_hand):
    filled.close()
    by_hand(filled, "UPDATE alembic_version SET version_num='0417'")
    before = Path(filled.target).read_bytes()
    assert "newer labbook (revision 0417): update labbook" in refused(lambda: Book.open(filled.target))
    assert Path(filled.target).read_bytes() == before


@pytest.mark.parametrize(("content", "said"), [
    (b"date;speed\n1;2\n", "is not a book"),
    (b"", "is not a book"),
    (b"SQLite format 3\0" + b"\0" * 4, "is not a book"),
    (bytes(range(256)) * 20, "is not a book"),
])  # fmt: skip
def test_a_file_that_is_no_book_is_refused_and_left_alone(tmp_path, content, said):
    path = tmp_path / "notes.db"
    path.write_bytes(content)
    assert said in refused(lambda: Book.open(path))
    assert path.read_bytes() == content
    assert [p.name for p in tmp_path.iterdir()] == ["notes.db"]


def test_a_foreign_database_is_refused(tmp_path):
    with closing(sqlite3.connect(tmp_path / "music.db")) as raw:
        raw.execute("create table song (id integer)")
        raw.commit()
    assert "is a database, but not a book" in refused(lambda: Book.open(tmp_path / "music.db"))
    assert "exists already" in refused(lambda: Book.new(tmp_path / "music.db"))


def test_missing_files_and_folders(tmp_path, filled):
    assert "does not exist: make it with `labbook new" in refused(lambda: Book.open(tmp_path / "none.db"))
    assert "does not exist" in refused(lambda: Book.open(f"sqlite:///{tmp_path}/none.db"))
    assert not (tmp_path / "none.db").exists(), "asking for a book must not make a file"
    assert "is a folder, not a book" in refused(lambda: Book.open(tmp_path))
    assert "exists already" in refused(lambda: Book.new(tmp_path))
    assert "is no folder" in refused(lambda: Book.new(tmp_path / "nowhere" / "a.db"))
    assert "exists already" in refused(lambda: Book.new(filled.target))
    assert "cannot be opened" in refused(lambda: Book.open(tmp_path / ("x" * 300)))
    assert "cannot be opened" in refused(lambda: Book.open(Path(filled.target) / "inside.db"))


@pytest.mark.parametrize(
    "target", ["sqlite://", "sqlite:///:memory:", "http://127.0.0.1/book", "nonsense://"]
)
def test_urls_that_name_no_book(target):
    refused(lambda: Book.open(target))
    refused(lambda: Book.new(target))


@pytest.mark.parametrize("name", ["a?b.db", "100 %.db", "a#b.db", "Ünïcode ö.db"])
def test_odd_file_names_are_taken_as_they_are(tmp_path, name):
    with Book.new(tmp_path / name) as book:
        assert book.check() == []
    assert [p.name for p in tmp_path.iterdir()] == [name]


def test_a_damaged_book(filled):
    filled.close()
    data = bytearray(Path(filled.target).read_bytes())
    data[4096 * 3 : 4096 * 12] = os.urandom(4096 * 9)
    Path(filled.target).write_bytes(bytes(data))
    said = []
    try:
        with Book.open(filled.target) as book:
            said = book.check()
    except BookProblem as problem:
        said = [str(problem)]
    assert said and "\n" not in said[0]


def test_a_locked_book(filled, counts, monkeypatch):
    before = counts(filled)
    monkeypatch.setattr(opening, "BUSY_SECONDS", 0.3)
    filled.close()
    holder = subprocess.Popen(
        [sys.executable, "-c",
         "import sqlite3,sys; c=sqlite3.connect(sys.argv[1],isolation_level=None); c.execute('BEGIN IMMEDIATE');"
         "print('held',flush=True); sys.stdin.readline()", filled.target],
        stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True,
    )  # fmt: skip
    try:
        assert holder.stdout.readline().strip() == "held"
        with Book.open(filled.target) as book:
            assert len(book.runs()) == 9, "reading goes on while another writes"
            said = refused(lambda: book.record(swimmer="reed-1", fluid="syrup", f="1 Hz"))
        assert "locked by another program" in said and "nothing was changed" in said
    finally:
        holder.communicate("\n", timeout=20)
    assert counts(filled) == before
    with Book.open(filled.target) as book:
        assert book.check() == []


@pytest.mark.parametrize(("pragma", "said"), [
    ("query_only=ON", "may not be written to"), ("max_page_count=1", "the disk is full"),
])  # fmt: skip
def test_read_only_and_full(filled, counts, folder, pragma, said):
    """SQLite's own switches stand for a read-only file (tests may run as root) and for a full disk.

    max_page_count cannot be less than the book's present size: the book may not grow by one page.
    """
    before = counts(filled)

    @event.listens_for(filled.engine, "connect")
    def _limit(connection, _record):
        connection.execute(f"PRAGMA {pragma}")

    (folder / "runs.csv").write_text(
        "swimmer,fluid,at,f [Hz],note\n"
        + "".join(f"reed-1,syrup,2026-04-01T10:{i:02d},0.5,{'n' * 3000}\n" for i in range(60))
    )
    for act in (lambda: filled.load(folder / "runs.csv"),
                lambda: filled.record(swimmer="reed-1", fluid="syrup", f="1 Hz", note="n" * 4000)):  # fmt: skip
        message = refused(act)
        assert said in message and "nothing was changed" in message
        if "full" in said:
            break  # one run may still find room on a page that is there
    assert counts(filled) == before
    assert filled.check() == []


def test_a_disk_that_fills_while_a_book_is_made_leaves_no_file(tmp_path, monkeypatch):
    make = create_engine

    def small(*arguments, **options):
        engine = make(*arguments, **options)

        @event.listens_for(engine, "connect")
        def _limit(connection, _record):
            connection.execute("PRAGMA max_page_count=4")

        return engine

    monkeypatch.setattr(opening, "create_engine", small)
    assert "the disk is full" in refused(lambda: Book.new(tmp_path / "a.db"))
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("kind", ["nfs4", "cifs", "fuse.sshfs"])
def test_a_network_disk_is_refused(tmp_path, monkeypatch, kind):
    mounts = f"disk / ext4 rw 0 0\nserver:/share {tmp_path} {kind} rw 0 0\n"
    real = Path.read_text
    monkeypatch.setattr(
        Path,
        "read_text",
        lambda self, *a, **k: mounts if str(self) == "/proc/mounts" else real(self, *a, **k),
    )
    said = refused(lambda: Book.new(tmp_path / "a.db"))
    assert f"network disk ({kind})" in said and "PostgreSQL" in said
    assert list(tmp_path.iterdir()) == []


def test_another_registry_rebuilds_the_stored_view_on_opening(filled, by_hand, counts):
    runs = filled.runs(kept=False)
    filled.close()
    by_hand(filled, "UPDATE book SET registry='of an older labbook'")
    by_hand(filled, "ALTER TABLE resolved DROP COLUMN zeta_ratio")
    with Book.open(filled.target) as book:
        again = book.runs(kept=False)
        assert again["zeta_ratio"].tolist() == pytest.approx(
            runs["zeta_ratio"].tolist(), rel=1e-12, nan_ok=True
        )
        assert book.check() == []
        with closing(sqlite3.connect(book.target)) as raw:
            line = raw.execute("select act, by, why from ledger order by id desc limit 1").fetchone()
        assert line == ("rebuild", "labbook", "the registry has changed")
    with Book.open(filled.target) as book:
        assert counts(book)["ledger"] == 2, "opening again rebuilds nothing"
