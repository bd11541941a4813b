"""Looking for what is wrong inside a store: broken pages, dangling rows, a log that contradicts itself.

Nothing is changed. Reading all of a log takes some seconds for a million passages, minutes on a small board.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from itertools import chain

import numpy as np
from sqlalchemy import Connection, func, inspect, select

from ginnel.store.engine import Store
from ginnel.store.hours import RolledHours, built_hours, final_hours, stale_hours, stored_hours
from ginnel.store.stale import HOUR_US
from ginnel.store.tables import Base, HourPassagesRow, HourRow, PassageRow, SensorRow, SpanRow
from ginnel.times import utc_text

#: Hours compared at once: memory stays small.
_HOURS_AT_ONCE = 336
_SHOWN = 5

OnProgress = Callable[[float], None]


def find_faults(store: Store, from_us: int = 0, on_progress: OnProgress | None = None) -> list[str]:
    """Lines that say what is wrong; none where all is well. Progress is told in parts of the whole.

    ``from_us`` limits the comparison of roll-ups with passages to hours from then on.

    Raises
    ------
    StoreDamagedError
        It cannot even be read.
    """
    advance = on_progress or (lambda part: None)
    with store.reading() as connection:
        if found := list(_broken_pages(connection)):
            return found  # the rest could not be relied on
        found += _dangling_rows(connection)
        sensors = connection.execute(select(SensorRow.id, SensorRow.name).order_by(SensorRow.name)).all()
        for sensor_id, name in sensors:
            found += (f"{name}: {line}" for line in _bad_spans(connection, sensor_id))
            found += (f"{name}: {line}" for line in _bad_hours(connection, sensor_id, from_us // HOUR_US))
            advance(1 / len(sensors))
    return found


def _broken_pages(connection: Connection) -> Iterator[str]:
    if connection.dialect.name == "sqlite":
        for (line,) in connection.exec_driver_sql(f"PRAGMA integrity_check({_SHOWN})"):
            if line != "ok":
                yield " ".join(line.split())


def _dangling_rows(connection: Connection) -> Iterator[str]:
    """Rows whose foreign key leads nowhere. A database that checks them as they are written has none."""
    present = set(inspect(connection).get_table_names())
    for table in Base.metadata.sorted_tables:
        if table.name not in present:
            continue
        for key in table.foreign_key_constraints:
            column, target = key.elements[0].parent, key.elements[0].column
            there = select(target).where(target == column).exists()
            n = connection.execute(
                select(func.count()).select_from(table).where(column.is_not(None), ~there)
            ).scalar_one()
            if n:
                yield f"{n} rows of {table.name} refer to a {target.table.name} that is not there"


def _bad_spans(connection: Connection, sensor_id: int) -> Iterator[str]:
    """Spans that overlap, and passages that begin in none."""
    rows = connection.execute(
        select(SpanRow.started_us, SpanRow.ended_us)
        .where(SpanRow.sensor_id == sensor_id)
        .order_by(SpanRow.started_us, SpanRow.ended_us)
    ).all()
    bounds = np.fromiter(chain.from_iterable(rows), np.int64).reshape(-1, 2)
    for i in np.flatnonzero(bounds[1:, 0] < bounds[:-1, 1])[:_SHOWN]:
        yield f"the spans from {utc_text(int(bounds[i, 0]))} and {utc_text(int(bounds[i + 1, 0]))} overlap"
    passages = (
        connection.execution_options(yield_per=20_000)
        .execute(select(PassageRow.started_us).where(PassageRow.sensor_id == sensor_id))
        .scalars()
    )
    n_astray = 0
    for part in passages.partitions():
        started_us = np.fromiter(part, np.int64)
        span_idx = np.searchsorted(bounds[:, 0], started_us, side="right") - 1
        if len(bounds) == 0:
            n_astray += len(started_us)
            continue
        ended_us = np.maximum(bounds[span_idx, 1], bounds[span_idx, 0] + 1)
        n_astray += int(np.count_nonzero((span_idx < 0) | (started_us >= ended_us)))
    if n_astray:
        yield f"{n_astray} passages lie in no span"


def _bad_hours(connection: Connection, sensor_id: int, from_hour: int) -> Iterator[str]:
    """Hours whose roll-up contradicts spans and passages, though nothing marks it as stale."""
    first, last = _extent(connection, sensor_id)
    for begin in range(max(first, from_hour), last, _HOURS_AT_ONCE):
        hours = range(begin, min(begin + _HOURS_AT_ONCE, last))
        stored = stored_hours(connection, sensor_id, hours.start, hours.stop)
        built = built_hours(connection, sensor_id, hours.start, hours.stop)
        excused = {
            *stale_hours(connection, sensor_id, hours.start, hours.stop),
            *final_hours(connection, sensor_id, hours),
        }
        for hour in sorted(_differing(stored, built) - excused):
            yield f"the roll-up of {utc_text(hour * HOUR_US)[:13]}h contradicts the passages"


def _differing(stored: RolledHours, built: RolledHours) -> set[int]:
    listened = {hour for hour, _ in stored.listened_us.items() ^ built.listened_us.items()}
    keys = stored.passages.keys() | built.passages.keys()
    passages = {key[0] for key in keys if stored.passages.get(key) != built.passages.get(key)}
    return listened | passages


def _extent(connection: Connection, sensor_id: int) -> tuple[int, int]:
    """Hours [first, last) of which anything is known."""
    bounds = []
    for table, first, last, per_hour in (
        (SpanRow, SpanRow.started_us, SpanRow.ended_us, HOUR_US),
        (PassageRow, PassageRow.crossed_us, PassageRow.crossed_us, HOUR_US),
        (HourRow, HourRow.hour, HourRow.hour, 1),
        (HourPassagesRow, HourPassagesRow.hour, HourPassagesRow.hour, 1),
    ):
        least, most = connection.execute(
            select(func.min(first), func.max(last)).where(table.sensor_id == sensor_id)
        ).one()
        if least is not None:
            bounds.append((least // per_hour, most // per_hour + 1))
    return min((one[0] for one in bounds), default=0), max((one[1] for one in bounds), default=0)
