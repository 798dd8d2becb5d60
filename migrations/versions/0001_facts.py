"""The first book: shelf, readings, runs, and a ledger that can only grow.

revision: 0001, after nothing
"""

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None


def _fk(column: str, target: str, table: str) -> sa.ForeignKeyConstraint:
    return sa.ForeignKeyConstraint([column], [f"{target}.id"], name=f"fk_{table}_{column}")


def _shelf_end(date: str):
    return (
        sa.Column("typed", sa.JSON(), nullable=False),
        sa.Column(date, sa.String(10)),
        sa.Column("note", sa.Text()),
        sa.Column("retired", sa.Boolean(), nullable=False),
    )


def _ids(table: str):
    return (
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("code", sa.String(64), nullable=False),
        sa.PrimaryKeyConstraint("id", name=f"pk_{table}"),
        sa.UniqueConstraint("code", name=f"uq_{table}_code"),
    )


def upgrade() -> None:
    op.create_table(
        "book",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("made", sa.String(32), nullable=False),
        sa.Column("registry", sa.String(64), nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_book"),
    )
    op.create_table("material", *_ids("material"), sa.Column("kind", sa.String(64)), *_shelf_end("made"))
    op.create_table(
        "fluid", *_ids("fluid"), sa.Column("kind", sa.String(64), nullable=False), *_shelf_end("made")
    )
    op.create_table(
        "swimmer",
        *_ids("swimmer"),
        sa.Column("form", sa.String(32), nullable=False),
        sa.Column("material_id", sa.Integer()),
        sa.Column("section", sa.String(8)),
        sa.Column("parent_id", sa.Integer()),
        *_shelf_end("built"),
        _fk("material_id", "material", "swimmer"),
        _fk("parent_id", "swimmer", "swimmer"),
    )
    op.create_table("rig", *_ids("rig"), sa.Column("kind", sa.String(64)), *_shelf_end("calibrated"))
    op.create_table(
        "reading",
        *_ids("reading"),
        sa.Column("fluid_id", sa.Integer()),
        sa.Column("material_id", sa.Integer()),
        sa.Column("key", sa.String(16), nullable=False),
        sa.Column("typed", sa.JSON(), nullable=False),
        sa.Column("on", sa.String(10)),
        sa.Column("how", sa.Text()),
        sa.Column("note", sa.Text()),
        sa.Column("state", sa.String(8), nullable=False),
        sa.Column("why", sa.Text()),
        sa.Column("sheet_row", sa.String(80)),
        sa.UniqueConstraint("sheet_row", name="uq_reading_sheet_row"),
        sa.CheckConstraint("(fluid_id IS NULL) <> (material_id IS NULL)", name="ck_reading_of_one"),
        _fk("fluid_id", "fluid", "reading"),
        _fk("material_id", "material", "reading"),
    )
    op.create_table(
        "run",
        *_ids("run"),
        sa.Column("serial", sa.Integer()),
        sa.Column("swimmer_id", sa.Integer(), nullable=False),
        sa.Column("fluid_id", sa.Integer(), nullable=False),
        sa.Column("rig_id", sa.Integer()),
        sa.Column("at", sa.String(20), nullable=False),
        sa.Column("by", sa.String(64), nullable=False),
        sa.Column("drive", sa.String(32), nullable=False),
        sa.Column("series", sa.String(128)),
        sa.Column("video", sa.Text()),
        sa.Column("note", sa.Text()),
        sa.Column("state", sa.String(8), nullable=False),
        sa.Column("why", sa.Text()),
        sa.Column("typed", sa.JSON(), nullable=False),
        sa.Column("confirmed", sa.Text()),
        sa.Column("logged", sa.String(20), nullable=False),
        sa.Column("token", sa.String(64)),
        sa.Column("sheet_row", sa.String(80)),
        sa.UniqueConstraint("token", name="uq_run_token"),
        sa.UniqueConstraint("sheet_row", name="uq_run_sheet_row"),
        sa.CheckConstraint("state IN ('kept', 'void')", name="ck_run_state"),
        _fk("swimmer_id", "swimmer", "run"),
        _fk("fluid_id", "fluid", "run"),
        _fk("rig_id", "rig", "run"),
    )
    op.create_table(
        "ledger",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("at", sa.String(20), nullable=False),
        sa.Column("by", sa.String(64), nullable=False),
        sa.Column("act", sa.String(16), nullable=False),
        sa.Column("kind", sa.String(16), nullable=False),
        sa.Column("subject", sa.String(128), nullable=False),
        sa.Column("before", sa.Text()),
        sa.Column("after", sa.Text()),
        sa.Column("why", sa.Text()),
        sa.Column("runs", sa.Text()),
        sa.Column("previous", sa.String(64), nullable=False),
        sa.Column("digest", sa.String(64), nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_ledger"),
    )
    op.create_table(
        "ledger_run",
        sa.Column("run_id", sa.Integer(), nullable=False),
        sa.Column("ledger_id", sa.Integer(), nullable=False),
        sa.PrimaryKeyConstraint("run_id", "ledger_id", name="pk_ledger_run"),
        _fk("run_id", "run", "ledger_run"),
        _fk("ledger_id", "ledger", "ledger_run"),
    )
    for table, columns in INDEXES.items():
        for column in columns:
            op.create_index(f"ix_{table}_{column}", table, [column])
    for statement in APPEND_ONLY[op.get_bind().dialect.name]:
        op.execute(statement)


def downgrade() -> None:
    # the stored view is no fact, but it refers to the runs
    op.execute("DROP TABLE IF EXISTS resolved")
    # SQLite and PostgreSQL drop a table's triggers with it
    for table in ("ledger_run", "ledger", "run", "reading", "rig", "swimmer", "fluid", "material", "book"):
        op.drop_table(table)
    if op.get_bind().dialect.name == "postgresql":
        op.execute("DROP FUNCTION ledger_grows_only()")


INDEXES = {
    "swimmer": ("material_id", "parent_id"),
    "reading": ("fluid_id", "material_id"),
    "run": ("serial", "swimmer_id", "fluid_id", "rig_id", "by", "series"),
    "ledger": ("by", "subject"),
}

APPEND_ONLY = {
    "sqlite": [
        f"CREATE TRIGGER ledger_no_{verb.lower()} BEFORE {verb} ON ledger "
        "BEGIN SELECT RAISE(ABORT, 'the ledger only grows'); END"
        for verb in ("UPDATE", "DELETE")
    ],
    "postgresql": [
        "CREATE FUNCTION ledger_grows_only() RETURNS trigger LANGUAGE plpgsql AS "
        "$$ BEGIN RAISE EXCEPTION 'the ledger only grows'; END $$",
        "CREATE TRIGGER ledger_grows_only BEFORE UPDATE OR DELETE ON ledger "
        "FOR EACH ROW EXECUTE FUNCTION ledger_grows_only()",
    ],
}
