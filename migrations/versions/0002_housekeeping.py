"""Housekeeping: roll-ups by hour, health, conditions, jobs; what live listening knows of a span

Revision: 0002, after 0001
"""

import sqlalchemy as sa
from alembic import op

revision = "0002"
down_revision = "0001"
branch_labels = None
depends_on = None

HOUR_US = 3_600_000_000


def upgrade() -> None:
    op.add_column("span", sa.Column("drift_ppm", sa.Double(), nullable=True))
    op.add_column("span", sa.Column("dropped_samples", sa.BigInteger(), server_default="0", nullable=False))
    op.add_column("span", sa.Column("redated_by_us", sa.BigInteger(), nullable=True))
    op.create_table(
        "hour_listened",
        sa.Column("sensor_id", sa.Integer(), nullable=False),
        sa.Column("hour", sa.Integer(), nullable=False),
        sa.Column("listened_us", sa.BigInteger(), nullable=False),
        sa.Column("is_final", sa.Boolean(), nullable=False),
        sa.CheckConstraint("listened_us BETWEEN 0 AND 3600000000", name=op.f("ck_hour_listened_listened_us")),
        sa.ForeignKeyConstraint(["sensor_id"], ["sensor.id"], name=op.f("fk_hour_listened_sensor_id_sensor")),
        sa.PrimaryKeyConstraint("sensor_id", "hour", name=op.f("pk_hour_listened")),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "hour_passages",
        sa.Column("sensor_id", sa.Integer(), nullable=False),
        sa.Column("hour", sa.Integer(), nullable=False),
        sa.Column("story", sa.SmallInteger(), nullable=False),
        sa.Column("direction", sa.SmallInteger(), nullable=False),
        sa.Column("count", sa.Integer(), nullable=False),
        sa.Column("measured", sa.Integer(), nullable=False),
        sa.Column("speed_sum_mmps", sa.BigInteger(), nullable=False),
        sa.Column("speed_square_sum_mm2ps2", sa.BigInteger(), nullable=False),
        sa.Column("slowness_sum_uspm", sa.BigInteger(), nullable=False),
        sa.Column("histogram", sa.LargeBinary(), nullable=False),
        sa.CheckConstraint("direction IN (0, 1, 2)", name=op.f("ck_hour_passages_direction")),
        sa.CheckConstraint("measured BETWEEN 0 AND count", name=op.f("ck_hour_passages_measured")),
        sa.CheckConstraint("story IN (0, 1, 2)", name=op.f("ck_hour_passages_story")),
        sa.ForeignKeyConstraint(["sensor_id"], ["sensor.id"], name=op.f("fk_hour_passages_sensor_id_sensor")),
        sa.PrimaryKeyConstraint("sensor_id", "hour", "story", "direction", name=op.f("pk_hour_passages")),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "hour_stale",
        sa.Column("sensor_id", sa.Integer(), nullable=False),
        sa.Column("hour", sa.Integer(), nullable=False),
        sa.ForeignKeyConstraint(["sensor_id"], ["sensor.id"], name=op.f("fk_hour_stale_sensor_id_sensor")),
        sa.PrimaryKeyConstraint("sensor_id", "hour", name=op.f("pk_hour_stale")),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "health",
        sa.Column("sensor_id", sa.Integer(), nullable=False),
        sa.Column("at_us", sa.BigInteger(), nullable=False),
        sa.Column("listened_ms", sa.Integer(), nullable=False),
        sa.Column("level_mdb", sa.Integer(), nullable=True),
        sa.Column("noise_mdb", sa.Integer(), nullable=True),
        sa.Column("hum_mdb", sa.Integer(), nullable=True),
        sa.Column("lamp_mdb", sa.Integer(), nullable=True),
        sa.Column("lamp_mmps", sa.Integer(), nullable=True),
        sa.Column("clipped_ppm", sa.Integer(), nullable=True),
        sa.Column("dropped_samples", sa.BigInteger(), nullable=False),
        sa.Column("lag_ms", sa.Integer(), nullable=True),
        sa.Column("disk_free_mb", sa.Integer(), nullable=True),
        sa.Column("disk_size_mb", sa.Integer(), nullable=True),
        sa.Column("resident_mb", sa.Integer(), nullable=True),
        sa.Column("temperature_mdegc", sa.Integer(), nullable=True),
        sa.ForeignKeyConstraint(["sensor_id"], ["sensor.id"], name=op.f("fk_health_sensor_id_sensor")),
        sa.PrimaryKeyConstraint("sensor_id", "at_us", name=op.f("pk_health")),
        sqlite_with_rowid=False,
    )
    op.create_table(
        "condition",
        sa.Column("id", sa.Integer(), nullable=False),
        sa.Column("sensor_id", sa.Integer(), nullable=True),
        sa.Column("kind", sa.String(length=32), nullable=False),
        sa.Column("severity", sa.String(length=8), nullable=False),
        sa.Column("raised_us", sa.BigInteger(), nullable=False),
        sa.Column("cleared_us", sa.BigInteger(), nullable=True),
        sa.Column("sentence", sa.String(), nullable=False),
        sa.Column("advice", sa.String(), nullable=False),
        sa.CheckConstraint("cleared_us >= raised_us", name=op.f("ck_condition_order")),
        sa.CheckConstraint("severity IN ('warning', 'failure')", name=op.f("ck_condition_severity")),
        sa.ForeignKeyConstraint(["sensor_id"], ["sensor.id"], name=op.f("fk_condition_sensor_id_sensor")),
        sa.PrimaryKeyConstraint("id", name=op.f("pk_condition")),
    )
    op.create_table(
        "job",
        sa.Column("name", sa.String(length=32), nullable=False),
        sa.Column("done_until_us", sa.BigInteger(), nullable=True),
        sa.Column("ran_us", sa.BigInteger(), nullable=False),
        sa.Column("outcome", sa.String(), nullable=False),
        sa.Column("failed", sa.Boolean(), nullable=False),
        sa.PrimaryKeyConstraint("name", name=op.f("pk_job")),
    )
    _mark_all_hours_stale(op.get_bind())


def _mark_all_hours_stale(connection: sa.Connection) -> None:
    """What is logged already has no roll-ups yet."""
    connection.execute(
        sa.text(
            f"INSERT INTO hour_stale (sensor_id, hour) "  # noqa: S608 (a constant)
            f"SELECT DISTINCT sensor_id, crossed_us / {HOUR_US} FROM passage"
        )
    )
    mark = sa.text("INSERT INTO hour_stale (sensor_id, hour) VALUES (:sensor, :hour) ON CONFLICT DO NOTHING")
    spans = connection.execute(sa.text("SELECT sensor_id, started_us, ended_us FROM span")).all()
    for sensor_id, started_us, ended_us in spans:
        hours = range(started_us // HOUR_US, max(-(-ended_us // HOUR_US), started_us // HOUR_US + 1))
        connection.execute(mark, [{"sensor": sensor_id, "hour": hour} for hour in hours])


def downgrade() -> None:
    for table in ("job", "condition", "health", "hour_stale", "hour_passages", "hour_listened"):
        op.drop_table(table)
    with op.batch_alter_table("span") as batch:
        batch.drop_column("redated_by_us")
        batch.drop_column("dropped_samples")
        batch.drop_column("drift_ppm")
