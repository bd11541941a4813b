"""Making the roll-ups by UTC hour out of spans and passages.

A roll-up is right unless its hour is marked stale (see `stale.py`); `roll_up_hours` makes those that are
marked again. Doing so twice, or late, gives the same rows. Hours whose passages are gone by retention are
final: they stay as they are.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import asdict, dataclass, fields
from itertools import chain, pairwise

import numpy as np
from sqlalchemy import Connection, delete, func, insert, select

from ginnel.store.engine import Store
from ginnel.store.rollup import Rollup, roll_up
from ginnel.store.stale import HOUR_US
from ginnel.store.tables import HourPassagesRow, HourRow, PassageRow, SensorRow, SpanRow, StaleHourRow

#: Hours made in one transaction: a writer waits no longer than that takes.
_HOURS_AT_ONCE = 168

ROLLUP_COLUMNS = tuple(field.name for field in fields(Rollup))
Key = tuple[int, int, int]  # hour, story and direction, in the table's codes


@dataclass(frozen=True, slots=True, kw_only=True)
class RolledHours:
    """Roll-ups of some hours of one sensor. What is not there is nothing."""

    listened_us: dict[int, int]  # by hour
    passages: dict[Key, Rollup]


def roll_up_hours(store: Store, until_us: int) -> int:
    """Make the stale roll-ups of hours that end by a time; tells how many hours were made.

    Raises
    ------
    StoreError
        The store cannot be written. What was made so far stays, the rest stays marked.
    """
    before_hour = until_us // HOUR_US
    with store.reading() as connection:
        sensor_ids = connection.execute(select(SensorRow.id)).scalars().all()
    return sum(_made(store, sensor_id, before_hour) for sensor_id in sensor_ids)


def _made(store: Store, sensor_id: int, before_hour: int) -> int:
    n_made = 0
    while True:
        with store.writing() as connection:
            # the lock that writers of spans and passages take too: no mark can slip through in between
            connection.execute(select(SensorRow.id).where(SensorRow.id == sensor_id).with_for_update())
            hours = stale_hours(connection, sensor_id, 0, before_hour, _HOURS_AT_ONCE)
            if not hours:
                return n_made
            put_hours(connection, sensor_id, sorted(set(hours) - final_hours(connection, sensor_id, hours)))
            marks = (StaleHourRow.sensor_id == sensor_id) & StaleHourRow.hour.in_(hours)
            connection.execute(delete(StaleHourRow).where(marks))
        n_made += len(hours)


def put_hours(connection: Connection, sensor_id: int, hours: Sequence[int]) -> None:
    """Store the roll-ups of some hours, in place of what was there."""
    for table in (HourPassagesRow, HourRow):
        connection.execute(delete(table).where(table.sensor_id == sensor_id, table.hour.in_(hours)))
    for first, last in runs(hours):
        rolled = built_hours(connection, sensor_id, first, last)
        if rolled.listened_us:
            rows = [
                {"sensor_id": sensor_id, "hour": hour, "listened_us": listened_us, "is_final": False}
                for hour, listened_us in rolled.listened_us.items()
            ]
            connection.execute(insert(HourRow), rows)
        if rolled.passages:
            rows = [
                {"sensor_id": sensor_id, "hour": hour, "story": story, "direction": way, **asdict(rollup)}
                for (hour, story, way), rollup in rolled.passages.items()
            ]
            connection.execute(insert(HourPassagesRow), rows)


def built_hours(connection: Connection, sensor_id: int, first: int, last: int) -> RolledHours:
    """Roll up the hours [first, last) from spans and passages as they are."""
    return RolledHours(
        listened_us=_listened_us(connection, sensor_id, first, last),
        passages=dict(_passages(connection, sensor_id, first, last)),
    )


def stored_hours(connection: Connection, sensor_id: int, first: int, last: int) -> RolledHours:
    """Roll-ups of the hours [first, last) as they are stored, right or not."""
    heard = select(HourRow.hour, HourRow.listened_us).where(
        HourRow.sensor_id == sensor_id, HourRow.hour >= first, HourRow.hour < last
    )
    table = HourPassagesRow
    columns = [getattr(table, name) for name in ("hour", "story", "direction", *ROLLUP_COLUMNS)]
    passed = select(*columns).where(table.sensor_id == sensor_id, table.hour >= first, table.hour < last)
    return RolledHours(
        listened_us={row.hour: row.listened_us for row in connection.execute(heard)},
        passages={
            (row[0], row[1], row[2]): Rollup(**dict(zip(ROLLUP_COLUMNS, row[3:], strict=True)))
            for row in connection.execute(passed)
        },
    )


def stale_hours(
    connection: Connection, sensor_id: int, first: int, last: int, most: int | None = None
) -> list[int]:
    """Hours of [first, last) that are marked, in order, ``most`` of them where that is given."""
    marked = select(StaleHourRow.hour).where(
        StaleHourRow.sensor_id == sensor_id, StaleHourRow.hour >= first, StaleHourRow.hour < last
    )
    return list(connection.execute(marked.order_by(StaleHourRow.hour).limit(most)).scalars())


def final_hours(connection: Connection, sensor_id: int, hours: Sequence[int]) -> set[int]:
    """Those of some hours, in order, whose passages are gone by retention."""
    if not hours:
        return set()
    final = select(HourRow.hour).where(
        HourRow.sensor_id == sensor_id, HourRow.hour.between(hours[0], hours[-1]), HourRow.is_final
    )
    return set(connection.execute(final).scalars()).intersection(hours)


def runs(hours: Sequence[int]) -> Iterator[tuple[int, int]]:
    """Unbroken runs [first, last) of ascending hours."""
    breaks = [0, *(i + 1 for i, (a, b) in enumerate(pairwise(hours)) if b != a + 1), len(hours)]
    for begin, end in pairwise(breaks):
        if begin < end:
            yield hours[begin], hours[end - 1] + 1


def _listened_us(connection: Connection, sensor_id: int, first: int, last: int) -> dict[int, int]:
    spans = connection.execute(
        select(SpanRow.started_us, SpanRow.ended_us).where(
            SpanRow.sensor_id == sensor_id,
            SpanRow.started_us < last * HOUR_US,
            SpanRow.ended_us > first * HOUR_US,
        )
    ).all()
    if not spans:
        return {}
    bounds = np.fromiter(chain.from_iterable(spans), np.int64).reshape(-1, 2)
    starts_us = np.arange(first, last, dtype=np.int64)[:, None] * HOUR_US
    shared_us = np.minimum(bounds[:, 1], starts_us + HOUR_US) - np.maximum(bounds[:, 0], starts_us)
    listened_us = np.maximum(shared_us, 0).sum(axis=1)  # spans of a sensor never overlap
    return {first + int(i): int(listened_us[i]) for i in np.flatnonzero(listened_us)}


def _passages(connection: Connection, sensor_id: int, first: int, last: int) -> Iterator[tuple[Key, Rollup]]:
    rows = connection.execute(
        select(
            PassageRow.crossed_us,
            PassageRow.story,
            PassageRow.direction,
            func.coalesce(PassageRow.speed_umps, -1),
        ).where(
            PassageRow.sensor_id == sensor_id,
            PassageRow.crossed_us >= first * HOUR_US,
            PassageRow.crossed_us < last * HOUR_US,
        )
    ).all()
    values = np.fromiter(chain.from_iterable(rows), np.int64)
    crossed_us, story, direction, speed_umps = values.reshape(-1, 4).T
    keys, which = np.unique(
        np.stack([crossed_us // HOUR_US, story, direction], axis=1), axis=0, return_inverse=True
    )
    order = np.argsort(which, kind="stable")
    ends = np.cumsum(np.bincount(which, minlength=len(keys)))
    for key, speeds in zip(keys.tolist(), np.split(speed_umps[order], ends[:-1]), strict=False):
        yield (key[0], key[1], key[2]), roll_up(speeds)
