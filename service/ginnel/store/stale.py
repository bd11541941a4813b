"""Which hours' roll-ups may be wrong.

Whoever changes spans or passages marks the hours that it touches, in the same transaction and under
the sensor's lock (see `readings.sensor_row_id`). Marking an hour that is marked already writes nothing.
"""

from __future__ import annotations

from collections.abc import Iterable

from sqlalchemy import Connection
from sqlalchemy.dialects import postgresql, sqlite

from ginnel.store.tables import StaleHourRow
from ginnel.words import US_PER_S

HOUR_US = 3600 * US_PER_S


def mark_stale(
    connection: Connection, sensor_id: int, start_us: int, end_us: int, crossings_us: Iterable[int] = ()
) -> None:
    """Mark the UTC hours that share time with [start_us, end_us), or hold one of these crossings."""
    hours = set(range(start_us // HOUR_US, max(-(-end_us // HOUR_US), start_us // HOUR_US + 1)))
    hours.update(crossed_us // HOUR_US for crossed_us in crossings_us)
    dialect = sqlite if connection.dialect.name == "sqlite" else postgresql
    connection.execute(
        dialect.insert(StaleHourRow).on_conflict_do_nothing(),
        [{"sensor_id": sensor_id, "hour": hour} for hour in sorted(hours)],
    )
