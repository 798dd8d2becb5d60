"""Kept files and the tracks that runs were reduced from.

revision: 0003, after 0002
"""

from math import hypot

import sqlalchemy as sa
from alembic import op

revision = "0003"
down_revision = "0002"
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "kept_file",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("digest", sa.String(64), nullable=False),
        sa.Column("name", sa.String(255), nullable=False),
        sa.Column("size", sa.Integer(), nullable=False),
        sa.Column("content", sa.LargeBinary(), nullable=False),
        sa.PrimaryKeyConstraint("id", name="pk_kept_file"),
        sa.UniqueConstraint("digest", name="uq_kept_file_digest"),
    )
    op.create_table(
        "track",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("code", sa.String(64), nullable=False),
        sa.Column("run_id", sa.Integer(), nullable=False),
        sa.Column("file_id", sa.Integer(), nullable=False),
        sa.Column("settings", sa.JSON(), nullable=False),
        sa.Column("result", sa.JSON(), nullable=False),
        sa.Column("replaced", sa.JSON(), nullable=False),
        sa.Column("at", sa.String(20), nullable=False),
        sa.Column("by", sa.String(64), nullable=False),
        sa.Column("state", sa.String(8), nullable=False),
        sa.Column("why", sa.Text()),
        sa.CheckConstraint("state IN ('in use', 'replaced')", name="ck_track_state"),
        sa.ForeignKeyConstraint(["run_id"], ["run.id"], name="fk_track_run_id"),
        sa.ForeignKeyConstraint(["file_id"], ["kept_file.id"], name="fk_track_file_id"),
        sa.PrimaryKeyConstraint("id", name="pk_track"),
        sa.UniqueConstraint("code", name="uq_track_code"),
    )
    op.create_index("ix_track_run_id", "track", ["run_id"])
    op.create_index("ix_track_file_id", "track", ["file_id"])
    _derive_again()  # marks of an old calibration are new


def downgrade() -> None:
    _as_if_typed(op.get_bind())
    op.drop_table("track")
    op.drop_table("kept_file")
    _derive_again()


def _derive_again() -> None:
    """Opening the book derives its runs again, since no registry has this fingerprint."""
    op.execute("UPDATE book SET registry = 'before or after 0003'")


def _as_if_typed(connection) -> None:
    """What tracks brought stays as stated values; an older labbook knows no camera scale, so u holds its part too."""
    run = sa.table("run", sa.column("id", sa.Integer), sa.column("typed", sa.JSON))
    track = sa.table("track", sa.column("run_id", sa.Integer))
    query = sa.select(run.c.id, run.c.typed).where(run.c.id.in_(sa.select(track.c.run_id)))
    for run_id, typed in connection.execute(query).all():
        scale = typed.pop("scale", None)
        for key, (text, unit, value, u, origin) in typed.items():
            if origin != "reduced":
                continue
            if scale is not None and key in ("U", "A_tip"):
                u = hypot(u, value * scale[3] / scale[2])
                text = f"{value!r} +- {u!r} {unit}"
            typed[key] = [text, unit, value, u, "stated"]
        connection.execute(sa.update(run).where(run.c.id == run_id).values(typed=typed))
