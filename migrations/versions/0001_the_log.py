"""The log

Revision: 0001, the first
"""

import sqlalchemy as sa
from alembic import op

revision = "0001"
down_revision = None
branch_labels = None
depends_on = None


def upgrade() -> None:
    op.create_table(
        "sensor",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("name", sa.String(), nullable=False),
        sa.Column("carrier_hz", sa.Double(), nullable=False),
        sa.Column("channels", sa.String(length=8), nullable=False),
        sa.Column("swap_iq", sa.Boolean(), nullable=False),
        sa.Column("mains_hz", sa.Double(), nullable=False),
        sa.Column("speed_bands_mps", sa.String(), nullable=False),
        sa.Column("min_speed_mps", sa.Double(), nullable=False),
        sa.Column("max_speed_mps", sa.Double(), nullable=False),
        sa.Column("highpass_hz", sa.Double(), nullable=True),
        sa.Column("approaching_name", sa.String(), nullable=False),
        sa.Column("receding_name", sa.String(), nullable=False),
        sa.CheckConstraint("channels IN ('mono', 'iq')", name=op.f("ck_sensor_channels")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_sensor")),
        sa.UniqueConstraint("name", name=op.f("uq_sensor_name")),
    )
    op.create_table(
        "site",
        sa.Column("id", sa.Integer(), autoincrement=False, nullable=False),
        sa.Column("name", sa.String(), nullable=False),
        sa.Column("timezone", sa.String(), nullable=False),
        sa.CheckConstraint("id = 1", name=op.f("ck_site_one_row")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_site")),
    )
    op.create_table(
        "mounting",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("sensor_id", sa.Integer(), nullable=False),
        sa.Column("aspect", sa.String(length=8), nullable=False),
        sa.Column("height_m", sa.Double(), nullable=False),
        sa.Column("offset_m", sa.Double(), nullable=False),
        sa.Column("beam_angle_deg", sa.Double(), nullable=False),
        sa.Column("tilt_deg", sa.Double(), nullable=False),
        sa.Column("beam_width_h_deg", sa.Double(), nullable=True),
        sa.Column("beam_width_v_deg", sa.Double(), nullable=True),
        sa.Column("since_us", sa.BigInteger(), nullable=True),
        sa.CheckConstraint("aspect IN ('axial', 'oblique')", name=op.f("ck_mounting_aspect")),
        sa.ForeignKeyConstraint(["sensor_id"], ["sensor.id"], name=op.f("fk_mounting_sensor_id_sensor")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_mounting")),
    )
    op.create_table(
        "reading",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("sensor_id", sa.Integer(), nullable=False),
        sa.Column("mounting_id", sa.Integer(), nullable=False),
        sa.Column("chain_version", sa.String(), nullable=False),
        sa.Column("settings", sa.String(), nullable=False),
        sa.ForeignKeyConstraint(
            ["mounting_id"], ["mounting.id"], name=op.f("fk_reading_mounting_id_mounting")
        ),
        sa.ForeignKeyConstraint(["sensor_id"], ["sensor.id"], name=op.f("fk_reading_sensor_id_sensor")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_reading")),
        sa.UniqueConstraint(
            "sensor_id",
            "mounting_id",
            "chain_version",
            "settings",
            name=op.f("uq_reading_sensor_id_mounting_id_chain_version_settings"),
        ),
    )
    op.create_table(
        "passage",
        sa.Column("sensor_id", sa.Integer(), nullable=False),
        sa.Column("crossed_us", sa.BigInteger(), nullable=False),
        sa.Column("started_us", sa.BigInteger(), nullable=False),
        sa.Column("ended_us", sa.BigInteger(), nullable=False),
        sa.Column("reading_id", sa.Integer(), nullable=False),
        sa.Column("story", sa.SmallInteger(), nullable=False),
        sa.Column("direction", sa.SmallInteger(), nullable=False),
        sa.Column("mover", sa.SmallInteger(), nullable=True),
        sa.Column("flags", sa.SmallInteger(), nullable=False),
        sa.Column("direction_confidence_ppm", sa.Integer(), nullable=True),
        sa.Column("speed_umps", sa.Integer(), nullable=True),
        sa.Column("speed_se_umps", sa.Integer(), nullable=True),
        sa.Column("snr_mdb", sa.Integer(), nullable=True),
        sa.CheckConstraint("direction IN (0, 1, 2)", name=op.f("ck_passage_direction")),
        sa.CheckConstraint("ended_us >= started_us", name=op.f("ck_passage_order")),
        sa.CheckConstraint("flags >= 0", name=op.f("ck_passage_flags")),
        sa.CheckConstraint("mover IN (1, 2)", name=op.f("ck_passage_mover")),
        sa.CheckConstraint("story IN (0, 1, 2)", name=op.f("ck_passage_story")),
        sa.ForeignKeyConstraint(["reading_id"], ["reading.id"], name=op.f("fk_passage_reading_id_reading")),
        sa.ForeignKeyConstraint(["sensor_id"], ["sensor.id"], name=op.f("fk_passage_sensor_id_sensor")),
        sa.PrimaryKeyConstraint("sensor_id", "crossed_us", name=op.f("pk_passage")),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "span",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("sensor_id", sa.Integer(), nullable=False),
        sa.Column("reading_id", sa.Integer(), nullable=False),
        sa.Column("started_us", sa.BigInteger(), nullable=False),
        sa.Column("ended_us", sa.BigInteger(), nullable=False),
        sa.Column("sample_rate_hz", sa.Double(), nullable=False),
        sa.Column("clock_trusted", sa.Boolean(), nullable=False),
        sa.CheckConstraint("ended_us >= started_us", name=op.f("ck_span_order")),
        sa.ForeignKeyConstraint(["reading_id"], ["reading.id"], name=op.f("fk_span_reading_id_reading")),
        sa.ForeignKeyConstraint(["sensor_id"], ["sensor.id"], name=op.f("fk_span_sensor_id_sensor")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_span")),
        sa.UniqueConstraint("sensor_id", "started_us", name=op.f("uq_span_sensor_id_started_us")),
    )


def downgrade() -> None:
    op.drop_table("span")
    op.drop_table("passage")
    op.drop_table("reading")
    op.drop_table("mounting")
    op.drop_table("site")
    op.drop_table("sensor")
