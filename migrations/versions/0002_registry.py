"""The group's own registry, every version kept, and published points beside the runs.

revision: 0002, after 0001
"""

import sqlalchemy as sa
from alembic import op

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "registry_row",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("kind", sa.String(16), nullable=False),
        sa.Column("key", sa.String(64), nullable=False),
        sa.Column("version", sa.Integer(), nullable=False),
        sa.Column("content", sa.JSON(none_as_null=True)),
        sa.Column("at", sa.String(20), nullable=False),
        sa.Column("by", sa.String(64), nullable=False),
        sa.Column("why", sa.Text()),
        sa.PrimaryKeyConstraint("id", name="pk_registry_row"),
        sa.UniqueConstraint("kind", "key", "version", name="uq_registry_row_kind_key_version"),
    )
    op.create_table(
        "published",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("series", sa.String(64), nullable=False),
        sa.Column("citation", sa.Text(), nullable=False),
        sa.Column("x", sa.String(24), nullable=False),
        sa.Column("x_dialect", sa.Text()),
        sa.Column("y", sa.String(24), nullable=False),
        sa.Column("y_dialect", sa.Text()),
        sa.Column("typed", sa.JSON(), nullable=False),
        sa.Column("note", sa.Text()),
        sa.Column("state", sa.String(8), nullable=False),
        sa.Column("why", sa.Text()),
        sa.Column("sheet_row", sa.String(80)),
        sa.PrimaryKeyConstraint("id", name="pk_published"),
        sa.UniqueConstraint("sheet_row", name="uq_published_sheet_row"),
    )
    op.create_index("ix_published_series", "published", ["series"])


def downgrade() -> None:
    op.drop_table("published")
    op.drop_table("registry_row")
