"""Letting go of what is older than it has to be.

Passages go with their spans, a whole span at a time, once its last hour is old enough; their roll-ups are
made first and are final from then on, so that what was counted stays known. Age is measured against a time
that the caller trusts. Everything here may be done twice, or late.
"""

from __future__ import annotations

from sqlalchemy import Connection, delete, func, insert, select, update

from ginnel.store.engine import Store
from ginnel.store.hours import final_hours, put_hours, stale_hours
from ginnel.store.log import of_span
from ginnel.store.stale import HOUR_US
from ginnel.store.tables import (
    ConditionRow,
    HealthRow,
    HourPassagesRow,
    HourRow,
    PassageRow,
    SensorRow,
    SpanRow,
    StaleHourRow,
)
from ginnel.words import Span

_SPANS_AT_ONCE = 50


def prune_passages(store: Store, before_us: int) -> int:
    """Remove spans that ended before a time, with their passages; gives how many passages went."""
    before_us -= before_us % HOUR_US
    with store.reading() as connection:
        sensor_ids = connection.execute(select(SensorRow.id)).scalars().all()
    return sum(_prune_sensor(store, sensor_id, before_us) for sensor_id in sensor_ids)


def prune_rollups(store: Store, before_us: int) -> int:
    """Remove final roll-ups of hours before a time; gives how many hours went.

    Those that could be made again from passages stay with their passages.
    """
    hour = before_us // HOUR_US
    with store.writing() as connection:
        final = select(HourRow.hour).where(
            HourRow.sensor_id == HourPassagesRow.sensor_id,
            HourRow.hour == HourPassagesRow.hour,
            HourRow.is_final,
        )
        connection.execute(delete(HourPassagesRow).where(HourPassagesRow.hour < hour, final.exists()))
        return connection.execute(delete(HourRow).where(HourRow.hour < hour, HourRow.is_final)).rowcount


def prune_health(store: Store, before_us: int) -> int:
    """Remove health samples taken before a time; gives how many."""
    with store.writing() as connection:
        return connection.execute(delete(HealthRow).where(HealthRow.at_us < before_us)).rowcount


def prune_conditions(store: Store, before_us: int) -> int:
    """Remove conditions that were over before a time; gives how many."""
    with store.writing() as connection:
        return connection.execute(delete(ConditionRow).where(ConditionRow.cleared_us < before_us)).rowcount


def newest_us(store: Store) -> int | None:
    """Last moment that the log knows of; None where it is empty."""
    with store.reading() as connection:
        found = [
            connection.execute(select(func.max(column))).scalar()
            for column in (SpanRow.ended_us, HealthRow.at_us)
        ]
    return max((moment for moment in found if moment is not None), default=None)


def _prune_sensor(store: Store, sensor_id: int, before_us: int) -> int:
    n_gone = 0
    while True:
        with store.writing() as connection:
            connection.execute(select(SensorRow.id).where(SensorRow.id == sensor_id).with_for_update())
            old = connection.execute(
                select(SpanRow.id, SpanRow.started_us, SpanRow.ended_us, SpanRow.sample_rate_hz)
                .where(SpanRow.sensor_id == sensor_id, SpanRow.ended_us <= before_us)
                .order_by(SpanRow.started_us)
                .limit(_SPANS_AT_ONCE)
            ).all()
            if not old:
                return n_gone
            for row in old:
                span = Span(
                    started_us=row.started_us, ended_us=row.ended_us, sample_rate_hz=row.sample_rate_hz
                )
                n_gone += _let_go(connection, sensor_id, span)
            connection.execute(delete(SpanRow).where(SpanRow.id.in_([row.id for row in old])))


def _let_go(connection: Connection, sensor_id: int, span: Span) -> int:
    """Make the roll-ups of a span's hours final, then remove its passages."""
    crossings = connection.execute(
        select(func.min(PassageRow.crossed_us), func.max(PassageRow.crossed_us)).where(
            *of_span(sensor_id, span)
        )
    ).one()
    first = min(span.started_us, crossings[0] or span.started_us) // HOUR_US
    last = max(span.ended_us - 1, crossings[1] or span.started_us) // HOUR_US + 1
    _make_final(connection, sensor_id, first, last)
    return connection.execute(delete(PassageRow).where(*of_span(sensor_id, span))).rowcount


def _make_final(connection: Connection, sensor_id: int, first: int, last: int) -> None:
    """Make the roll-ups of the hours [first, last) that are not right yet, and keep them all as they are."""
    stale = stale_hours(connection, sensor_id, first, last)
    put_hours(connection, sensor_id, sorted(set(stale) - final_hours(connection, sensor_id, stale)))
    marks = (StaleHourRow.sensor_id == sensor_id, StaleHourRow.hour >= first, StaleHourRow.hour < last)
    connection.execute(delete(StaleHourRow).where(*marks))
    these = (HourRow.sensor_id == sensor_id, HourRow.hour >= first, HourRow.hour < last)
    connection.execute(update(HourRow).where(*these).values(is_final=True))
    # a crossing may lie in an hour that was not listened to
    listened = connection.execute(select(HourRow.hour).where(*these)).scalars().all()
    unheard = select(HourPassagesRow.hour).where(
        HourPassagesRow.sensor_id == sensor_id,
        HourPassagesRow.hour >= first,
        HourPassagesRow.hour < last,
        HourPassagesRow.hour.not_in(listened),
    )
    for hour in connection.execute(unheard.distinct()).scalars().all():
        connection.execute(
            insert(HourRow).values(sensor_id=sensor_id, hour=hour, listened_us=0, is_final=True)
        )
