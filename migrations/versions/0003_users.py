"""Users of the dashboard, their tokens, and the key that signs sessions

Revision: 0003, after 0002
"""

import sqlalchemy as sa
from alembic import op

revision = "0003"
down_revision = "0002"
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "user_account",
        sa.Column("name", sa.String(length=64), nullable=False),
        sa.Column("role", sa.String(length=8), nullable=False),
        sa.Column("password_hash", sa.String(), nullable=False),
        sa.CheckConstraint("role IN ('look', 'edit')", name=op.f("ck_user_account_role")),
        sa.PrimaryKeyConstraint("name", name=op.f("pk_user_account")),
    )
    op.create_table(
        "user_token",
        sa.Column("user_name", sa.String(length=64), nullable=False),
        sa.Column("label", sa.String(length=64), nullable=False),
        sa.Column("digest", sa.String(length=64), nullable=False),
        sa.Column("made_us", sa.BigInteger(), nullable=False),
        sa.ForeignKeyConstraint(
            ["user_name"], ["user_account.name"], name=op.f("fk_user_token_user_name_user_account")
        ),
        sa.PrimaryKeyConstraint("user_name", "label", name=op.f("pk_user_token")),
        sa.UniqueConstraint("digest", name=op.f("uq_user_token_digest")),
    )
    op.create_table(
        "web_key",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("secret", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint("id = 1", name=op.f("ck_web_key_one_row")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_web_key")),
    )


def downgrade() -> None:
    for table in ("web_key", "user_token", "user_account"):
        op.drop_table(table)
