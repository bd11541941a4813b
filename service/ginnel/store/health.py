"""Health of sensors by the minute, and the conditions that followed from it."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from sqlalchemy import Connection, Row, bindparam, func, insert, select, update
from sqlalchemy.dialects import postgresql, sqlite

from ginnel.store.codes import scaled, unscaled
from ginnel.store.engine import Store
from ginnel.store.query import known_sensors
from ginnel.store.tables import ConditionRow, HealthRow, SensorRow
from ginnel.words import Condition, HealthSample, Severity

_MILLI, _MICRO, _MEGA = 1_000, 1_000_000, 1e-6
#: Field of `HealthSample`, column, and how many of the column's units make one.
_MEASURES = (
    ("listened_s", "listened_ms", _MILLI),
    ("level_dbfs", "level_mdb", _MILLI),
    ("noise_dbfs_hz", "noise_mdb", _MILLI),
    ("hum_db", "hum_mdb", _MILLI),
    ("lamp_db", "lamp_mdb", _MILLI),
    ("lamp_mps", "lamp_mmps", _MILLI),
    ("clipped_share", "clipped_ppm", _MICRO),
    ("lag_s", "lag_ms", _MILLI),
    ("disk_free_bytes", "disk_free_mb", _MEGA),
    ("disk_size_bytes", "disk_size_mb", _MEGA),
    ("resident_bytes", "resident_mb", _MEGA),
    ("temperature_c", "temperature_mdegc", _MILLI),
)
_WHOLE = ("disk_free_bytes", "disk_size_bytes", "resident_bytes")


@dataclass(frozen=True, slots=True, kw_only=True)
class LoggedHealth:
    """A sample with its sensor."""

    sensor: str
    sample: HealthSample


def put_health(store: Store, samples: Iterable[LoggedHealth]) -> None:
    """Store samples, all or none. One that is stored already stays; one of an unknown sensor is refused."""
    with store.writing() as connection:
        ids = {name: sensor_id for sensor_id, name in known_sensors(connection, None)}
        rows = []
        for one in samples:
            if one.sensor not in ids:
                known_sensors(connection, one.sensor)  # says which are known
            rows.append(
                {
                    "sensor_id": ids[one.sensor],
                    "at_us": one.sample.at_us,
                    "dropped_samples": one.sample.dropped_samples,
                    **{column: scaled(getattr(one.sample, name), per) for name, column, per in _MEASURES},
                }
            )
        if rows:
            dialect = sqlite if store.dialect == "sqlite" else postgresql
            connection.execute(dialect.insert(HealthRow).on_conflict_do_nothing(), rows)


def iter_health(
    store: Store, sensor: str, start_us: int | None = None, end_us: int | None = None
) -> Iterator[HealthSample]:
    """Samples of a sensor taken in [start_us, end_us), in order, in constant memory."""
    with store.reading() as connection:
        ((sensor_id, _),) = known_sensors(connection, sensor)
        query = select(*HealthRow.__table__.columns).where(HealthRow.sensor_id == sensor_id)
        if start_us is not None:
            query = query.where(HealthRow.at_us >= start_us)
        if end_us is not None:
            query = query.where(HealthRow.at_us < end_us)
        rows = connection.execution_options(yield_per=2000).execute(query.order_by(HealthRow.at_us))
        with rows:
            for row in rows:
                yield _sample(row)


def health_near(
    store: Store, sensor: str, moments_us: Sequence[int], within_us: int
) -> list[HealthSample | None]:
    """First sample of a sensor in [moment, moment + within) for each moment; None where there is none.

    Each is one step into the key, so that a year takes no longer than a day.
    """
    query = (
        select(*HealthRow.__table__.columns)
        .where(
            HealthRow.sensor_id == bindparam("sensor"),
            HealthRow.at_us >= bindparam("first"),
            HealthRow.at_us < bindparam("after"),
        )
        .order_by(HealthRow.at_us)
        .limit(1)
    )
    found = []
    with store.reading() as connection:
        ((sensor_id, _),) = known_sensors(connection, sensor)
        for moment_us in moments_us:
            asked = {"sensor": sensor_id, "first": moment_us, "after": moment_us + within_us}
            row = connection.execute(query, asked).one_or_none()
            found.append(None if row is None else _sample(row))
    return found


def latest_health(store: Store) -> list[LoggedHealth]:
    """Last sample of each sensor that has any, by name."""
    with store.reading() as connection:
        found = []
        for sensor_id, name in known_sensors(connection, None):
            last = (
                select(*HealthRow.__table__.columns)
                .where(HealthRow.sensor_id == sensor_id)
                .order_by(HealthRow.at_us.desc())
                .limit(1)
            )
            if (row := connection.execute(last).one_or_none()) is not None:
                found.append(LoggedHealth(sensor=name, sample=_sample(row)))
    return found


def put_conditions(store: Store, changes: Sequence[Condition]) -> None:
    """Store conditions that were raised or cleared, in order. Telling the same twice changes nothing."""
    with store.writing() as connection:
        ids = {name: sensor_id for sensor_id, name in known_sensors(connection, None)}
        for one in changes:
            sensor_id = None if one.sensor is None else ids.get(one.sensor)
            same = (
                ConditionRow.kind == one.kind,
                ConditionRow.sensor_id.is_(None)
                if sensor_id is None
                else ConditionRow.sensor_id == sensor_id,
                ConditionRow.raised_us == one.raised_us,
            )
            if connection.execute(select(ConditionRow.id).where(*same)).first() is None:
                values = {
                    "sensor_id": sensor_id,
                    "kind": one.kind,
                    "severity": one.severity.value,
                    "raised_us": one.raised_us,
                    "cleared_us": one.cleared_us,
                    "sentence": one.sentence,
                    "advice": one.advice,
                }
                connection.execute(insert(ConditionRow).values(values))
            elif one.cleared_us is not None:
                connection.execute(update(ConditionRow).where(*same).values(cleared_us=one.cleared_us))


def open_conditions(store: Store) -> list[Condition]:
    """What is wrong now, the oldest first."""
    with store.reading() as connection:
        return _conditions(connection, ConditionRow.cleared_us.is_(None))


def conditions(store: Store, start_us: int, end_us: int) -> list[Condition]:
    """What was wrong at any time of [start_us, end_us), the oldest first."""
    still = func.coalesce(ConditionRow.cleared_us, end_us)
    with store.reading() as connection:
        return _conditions(connection, ConditionRow.raised_us < end_us, still > start_us)


def _conditions(connection: Connection, *which: Any) -> list[Condition]:
    rows = connection.execute(
        select(SensorRow.name.label("sensor"), *ConditionRow.__table__.columns)
        .join(SensorRow, SensorRow.id == ConditionRow.sensor_id, isouter=True)
        .where(*which)
        .order_by(ConditionRow.raised_us, ConditionRow.id)
    )
    return [
        Condition(
            kind=row.kind,
            sensor=row.sensor,
            severity=Severity(row.severity),
            raised_us=row.raised_us,
            cleared_us=row.cleared_us,
            sentence=row.sentence,
            advice=row.advice,
        )
        for row in rows
    ]


def _sample(row: Row[Any]) -> HealthSample:
    measures = {name: unscaled(getattr(row, column), per) for name, column, per in _MEASURES}
    for name in _WHOLE:
        value = measures[name]
        measures[name] = None if value is None else round(value)
    return HealthSample(at_us=row.at_us, dropped_samples=row.dropped_samples, **measures)  # type: ignore[arg-type] # by name
