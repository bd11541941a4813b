"""The tables of the log.

A *reading* is one way of reading a sensor's samples: the chain's version, the mounting and the
settings that were in force. Spans and passages name their reading, so each passage tells which
mounting and which version found it, at the price of one small integer.

Which span a passage belongs to is not stored: spans of one sensor never overlap, and a passage
lies in the span in which it began to be heard. This leaves the largest table with one index, its
key, and no other. Measures are whole numbers in small units (see ``codes.py``), which makes rows
small and equal on every database. The speed band is not stored either: it follows from the speed
and the sensor's present bands.

Roll-ups (``hour_...``) say again what spans and passages say, by UTC hour. Whatever changes spans or
passages marks the hours that it touches as stale in the same transaction, so a roll-up that is not
marked is right.
"""

from __future__ import annotations

from typing import Any, ClassVar

from sqlalchemy import (
    BigInteger,
    CheckConstraint,
    Double,
    ForeignKey,
    Integer,
    LargeBinary,
    MetaData,
    SmallInteger,
    String,
    UniqueConstraint,
)
from sqlalchemy.orm import DeclarativeBase, Mapped, mapped_column


class Base(DeclarativeBase):
    """Names every constraint by rule, so that a migration can find it on any database."""

    type_annotation_map: ClassVar[dict[Any, Any]] = {float: Double()}
    metadata = MetaData(
        naming_convention={
            "ix": "ix_%(table_name)s_%(column_0_N_name)s",
            "uq": "uq_%(table_name)s_%(column_0_N_name)s",
            "ck": "ck_%(table_name)s_%(constraint_name)s",
            "fk": "fk_%(table_name)s_%(column_0_N_name)s_%(referred_table_name)s",
            "pk": "pk_%(table_name)s",
        }
    )


class SiteRow(Base):
    """The site: one row, since one store is one site's log."""

    __tablename__ = "site"
    __table_args__ = (CheckConstraint("id = 1", name="one_row"),)

    id: Mapped[int] = mapped_column(Integer, primary_key=True, autoincrement=False)
    name: Mapped[str] = mapped_column(String)
    timezone: Mapped[str] = mapped_column(String)


class SensorRow(Base):
    """A sensor with its settings as last seen."""

    __tablename__ = "sensor"
    __table_args__ = (CheckConstraint("channels IN ('mono', 'iq')", name="channels"),)

    id: Mapped[int] = mapped_column(Integer, primary_key=True)
    name: Mapped[str] = mapped_column(String, unique=True)
    carrier_hz: Mapped[float]
    channels: Mapped[str] = mapped_column(String(8))
    swap_iq: Mapped[bool]
    mains_hz: Mapped[float]
    speed_bands_mps: Mapped[str] = mapped_column(String)  # JSON list of ascending edges
    min_speed_mps: Mapped[float]
    max_speed_mps: Mapped[float]
    highpass_hz: Mapped[float | None]
    approaching_name: Mapped[str] = mapped_column(String)
    receding_name: Mapped[str] = mapped_column(String)


class MountingRow(Base):
    """How a sensor looked at the path, from a date on."""

    __tablename__ = "mounting"
    __table_args__ = (CheckConstraint("aspect IN ('axial', 'oblique')", name="aspect"),)

    id: Mapped[int] = mapped_column(Integer, primary_key=True)
    sensor_id: Mapped[int] = mapped_column(ForeignKey("sensor.id"))
    aspect: Mapped[str] = mapped_column(String(8))
    height_m: Mapped[float]
    offset_m: Mapped[float]
    beam_angle_deg: Mapped[float]
    tilt_deg: Mapped[float]
    beam_width_h_deg: Mapped[float | None]
    beam_width_v_deg: Mapped[float | None]
    since_us: Mapped[int | None] = mapped_column(BigInteger)  # NULL: since ever


class ReadingRow(Base):
    """One way of reading a sensor's samples."""

    __tablename__ = "reading"
    __table_args__ = (UniqueConstraint("sensor_id", "mounting_id", "chain_version", "settings"),)

    id: Mapped[int] = mapped_column(Integer, primary_key=True)
    sensor_id: Mapped[int] = mapped_column(ForeignKey("sensor.id"))
    mounting_id: Mapped[int] = mapped_column(ForeignKey("mounting.id"))
    chain_version: Mapped[str] = mapped_column(String)
    settings: Mapped[str] = mapped_column(String)  # JSON of what else bears on the result


class SpanRow(Base):
    """An unbroken stretch of listening, [started_us, ended_us). Spans of a sensor never overlap."""

    __tablename__ = "span"
    __table_args__ = (
        UniqueConstraint("sensor_id", "started_us"),
        CheckConstraint("ended_us >= started_us", name="order"),
    )

    id: Mapped[int] = mapped_column(Integer, primary_key=True)
    sensor_id: Mapped[int] = mapped_column(ForeignKey("sensor.id"))
    reading_id: Mapped[int] = mapped_column(ForeignKey("reading.id"))
    started_us: Mapped[int] = mapped_column(BigInteger)
    ended_us: Mapped[int] = mapped_column(BigInteger)
    sample_rate_hz: Mapped[float]
    clock_trusted: Mapped[bool]
    # of live listening; NULL, or 0, for recordings
    drift_ppm: Mapped[float | None]  # of the wall clock against the sample clock; positive: samples come slow
    dropped_samples: Mapped[int] = mapped_column(BigInteger, server_default="0")
    redated_by_us: Mapped[int | None] = mapped_column(BigInteger)  # moved so far once the clock was set


class PassageRow(Base):
    """What one mover did, keyed by its sensor and the time of its crossing."""

    __tablename__ = "passage"
    __table_args__ = (
        CheckConstraint("ended_us >= started_us", name="order"),
        CheckConstraint("story IN (0, 1, 2)", name="story"),
        CheckConstraint("direction IN (0, 1, 2)", name="direction"),
        CheckConstraint("mover IN (1, 2)", name="mover"),
        CheckConstraint("flags >= 0", name="flags"),
        # The key is the table: rows lie in the order in which they are read.
        {"sqlite_with_rowid": False},
    )

    sensor_id: Mapped[int] = mapped_column(ForeignKey("sensor.id"), primary_key=True)
    crossed_us: Mapped[int] = mapped_column(BigInteger, primary_key=True)
    started_us: Mapped[int] = mapped_column(BigInteger)
    ended_us: Mapped[int] = mapped_column(BigInteger)
    reading_id: Mapped[int] = mapped_column(ForeignKey("reading.id"))
    story: Mapped[int] = mapped_column(SmallInteger)
    direction: Mapped[int] = mapped_column(SmallInteger)
    mover: Mapped[int | None] = mapped_column(SmallInteger)
    flags: Mapped[int] = mapped_column(SmallInteger)
    direction_confidence_ppm: Mapped[int | None] = mapped_column(Integer)
    speed_umps: Mapped[int | None] = mapped_column(Integer)
    speed_se_umps: Mapped[int | None] = mapped_column(Integer)
    snr_mdb: Mapped[int | None] = mapped_column(Integer)


class HourRow(Base):
    """How much of a UTC hour a sensor listened to. No row: nothing."""

    __tablename__ = "hour_listened"
    __table_args__ = (
        CheckConstraint("listened_us BETWEEN 0 AND 3600000000", name="listened_us"),
        {"sqlite_with_rowid": False},
    )

    sensor_id: Mapped[int] = mapped_column(ForeignKey("sensor.id"), primary_key=True)
    hour: Mapped[int] = mapped_column(Integer, primary_key=True)  # whole hours since 1970 UTC
    listened_us: Mapped[int] = mapped_column(BigInteger)
    is_final: Mapped[bool]  # its passages are gone by retention: never rebuilt


class HourPassagesRow(Base):
    """Passages of a sensor, a UTC hour, a story and a direction. No row: none."""

    __tablename__ = "hour_passages"
    __table_args__ = (
        CheckConstraint("measured BETWEEN 0 AND count", name="measured"),
        CheckConstraint("story IN (0, 1, 2)", name="story"),
        CheckConstraint("direction IN (0, 1, 2)", name="direction"),
        {"sqlite_with_rowid": False},
    )

    sensor_id: Mapped[int] = mapped_column(ForeignKey("sensor.id"), primary_key=True)
    hour: Mapped[int] = mapped_column(Integer, primary_key=True)
    story: Mapped[int] = mapped_column(SmallInteger, primary_key=True)
    direction: Mapped[int] = mapped_column(SmallInteger, primary_key=True)
    count: Mapped[int] = mapped_column(Integer)
    measured: Mapped[int] = mapped_column(Integer)  # those with a speed; what follows is theirs
    speed_sum_mmps: Mapped[int] = mapped_column(BigInteger)
    speed_square_sum_mm2ps2: Mapped[int] = mapped_column(BigInteger)
    slowness_sum_uspm: Mapped[int] = mapped_column(BigInteger)  # microseconds per metre
    histogram: Mapped[bytes] = mapped_column(LargeBinary)  # see rollup.py


class StaleHourRow(Base):
    """An hour whose roll-up may not agree with spans and passages (any more)."""

    __tablename__ = "hour_stale"
    __table_args__ = ({"sqlite_with_rowid": False},)

    sensor_id: Mapped[int] = mapped_column(ForeignKey("sensor.id"), primary_key=True)
    hour: Mapped[int] = mapped_column(Integer, primary_key=True)


class HealthRow(Base):
    """How well a sensor heard in the minute before a moment, and how its computer did."""

    __tablename__ = "health"
    __table_args__ = ({"sqlite_with_rowid": False},)

    sensor_id: Mapped[int] = mapped_column(ForeignKey("sensor.id"), primary_key=True)
    at_us: Mapped[int] = mapped_column(BigInteger, primary_key=True)
    listened_ms: Mapped[int] = mapped_column(Integer)
    level_mdb: Mapped[int | None] = mapped_column(Integer)
    noise_mdb: Mapped[int | None] = mapped_column(Integer)
    hum_mdb: Mapped[int | None] = mapped_column(Integer)
    lamp_mdb: Mapped[int | None] = mapped_column(Integer)
    lamp_mmps: Mapped[int | None] = mapped_column(Integer)
    clipped_ppm: Mapped[int | None] = mapped_column(Integer)
    dropped_samples: Mapped[int] = mapped_column(BigInteger)
    lag_ms: Mapped[int | None] = mapped_column(Integer)
    disk_free_mb: Mapped[int | None] = mapped_column(Integer)
    disk_size_mb: Mapped[int | None] = mapped_column(Integer)
    resident_mb: Mapped[int | None] = mapped_column(Integer)
    temperature_mdegc: Mapped[int | None] = mapped_column(Integer)


class ConditionRow(Base):
    """Something that was wrong, from when to when, as it was told."""

    __tablename__ = "condition"
    __table_args__ = (
        CheckConstraint("severity IN ('warning', 'failure')", name="severity"),
        CheckConstraint("cleared_us >= raised_us", name="order"),
    )

    id: Mapped[int] = mapped_column(Integer, primary_key=True)
    sensor_id: Mapped[int | None] = mapped_column(ForeignKey("sensor.id"))  # NULL: all of them
    kind: Mapped[str] = mapped_column(String(32))
    severity: Mapped[str] = mapped_column(String(8))
    raised_us: Mapped[int] = mapped_column(BigInteger)
    cleared_us: Mapped[int | None] = mapped_column(BigInteger)  # NULL: it still is
    sentence: Mapped[str] = mapped_column(String)
    advice: Mapped[str] = mapped_column(String)


class JobRow(Base):
    """How far a job of housekeeping got."""

    __tablename__ = "job"

    name: Mapped[str] = mapped_column(String(32), primary_key=True)
    done_until_us: Mapped[int | None] = mapped_column(BigInteger)  # what is before this is done
    ran_us: Mapped[int] = mapped_column(BigInteger)  # last tried
    outcome: Mapped[str] = mapped_column(String)  # a line about the last try
    failed: Mapped[bool]


class UserRow(Base):
    """Somebody who may see the dashboard."""

    __tablename__ = "user_account"  # `user` is a word of SQL
    __table_args__ = (CheckConstraint("role IN ('look', 'edit')", name="role"),)

    name: Mapped[str] = mapped_column(String(64), primary_key=True)
    role: Mapped[str] = mapped_column(String(8))
    password_hash: Mapped[str] = mapped_column(String)


class TokenRow(Base):
    """What checks the token of a program."""

    __tablename__ = "user_token"

    user_name: Mapped[str] = mapped_column(String(64), ForeignKey("user_account.name"), primary_key=True)
    label: Mapped[str] = mapped_column(String(64), primary_key=True)
    digest: Mapped[str] = mapped_column(String(64), unique=True)
    made_us: Mapped[int] = mapped_column(BigInteger)


class WebKeyRow(Base):
    """The key that signs sessions: one row, made with the first user."""

    __tablename__ = "web_key"
    __table_args__ = (CheckConstraint("id = 1", name="one_row"),)

    id: Mapped[int] = mapped_column(Integer, primary_key=True, autoincrement=False)
    secret: Mapped[bytes] = mapped_column(LargeBinary)


class SeriesRow(Base):
    """Counts that others made, by the name that they were given here."""

    __tablename__ = "series"

    id: Mapped[int] = mapped_column(Integer, primary_key=True)
    name: Mapped[str] = mapped_column(String(64), unique=True)
    source: Mapped[str] = mapped_column(String)


class SeriesCountRow(Base):
    """One interval that others counted, [started_us, ended_us)."""

    __tablename__ = "series_count"
    __table_args__ = (
        CheckConstraint("direction IN (0, 1, 2)", name="direction"),
        CheckConstraint("ended_us > started_us", name="order"),
        CheckConstraint("count >= 0", name="count"),
        {"sqlite_with_rowid": False},
    )

    series_id: Mapped[int] = mapped_column(ForeignKey("series.id"), primary_key=True)
    started_us: Mapped[int] = mapped_column(BigInteger, primary_key=True)
    direction: Mapped[int] = mapped_column(SmallInteger, primary_key=True)
    ended_us: Mapped[int] = mapped_column(BigInteger)
    count: Mapped[int] = mapped_column(Integer)
