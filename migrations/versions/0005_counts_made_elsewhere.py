"""Counts made elsewhere, kept beside the log to compare it with

Revision: 0005, after 0003
"""

import sqlalchemy as sa
from alembic import op

revision = "0005"
down_revision = "0003"
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "series",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("name", sa.String(length=64), nullable=False),
        sa.Column("source", sa.String(), nullable=False),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_series")),
        sa.UniqueConstraint("name", name=op.f("uq_series_name")),
    )
    op.create_table(
        "series_count",
        sa.Column("series_id", sa.Integer(), nullable=False),
        sa.Column("started_us", sa.BigInteger(), nullable=False),
        sa.Column("direction", sa.SmallInteger(), nullable=False),
        sa.Column("ended_us", sa.BigInteger(), nullable=False),
        sa.Column("count", sa.Integer(), nullable=False),
        sa.CheckConstraint("direction IN (0, 1, 2)", name=op.f("ck_series_count_direction")),
        sa.CheckConstraint("ended_us > started_us", name=op.f("ck_series_count_order")),
        sa.CheckConstraint("count >= 0", name=op.f("ck_series_count_count")),
        sa.ForeignKeyConstraint(["series_id"], ["series.id"], name=op.f("fk_series_count_series_id_series")),
        sa.PrimaryKeyConstraint("series_id", "started_us", "direction", name=op.f("pk_series_count")),
        sqlite_with_rowid=False,
    )


def downgrade() -> None:
    for table in ("series_count", "series"):
        op.drop_table(table)
