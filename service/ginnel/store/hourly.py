"""Reading the roll-ups by UTC hour, as arrays in order of hour.

An answer is always that of spans and passages themselves: hours that are marked stale, such as the one
that is still going on, are rolled up on the way. Hours start on whole hours of UTC, so an interval that
does not (half-hour time zones) has to be answered from passages.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from itertools import chain
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import ColumnElement, Connection, select

from ginnel.store.codes import DIRECTION_CODES, STORY_CODES
from ginnel.store.engine import Store
from ginnel.store.hours import ROLLUP_COLUMNS, RolledHours, built_hours, final_hours, runs, stale_hours
from ginnel.store.query import known_sensors
from ginnel.store.rollup import IntArray, Rollup, merge
from ginnel.store.stale import HOUR_US
from ginnel.store.tables import HourPassagesRow, HourRow
from ginnel.words import Direction, Story


@dataclass(frozen=True, slots=True, kw_only=True)
class HourlyListening:
    """Hours in which a sensor listened at all; arrays of shape (n,)."""

    hour_us: IntArray  # when the hour starts
    listened_us: IntArray


@dataclass(frozen=True, slots=True, kw_only=True)
class HourlyCounts:
    """Passages by hour and direction; arrays of shape (n,). What has none has no row."""

    hour_us: IntArray
    direction: NDArray[np.int8]  # codes; see `of`
    count: IntArray

    def of(self, direction: Direction | None) -> HourlyCounts:
        """Those of one direction; all where it is None."""
        if direction is None:
            return self
        chosen = self.direction == DIRECTION_CODES[direction]
        return replace(
            self, hour_us=self.hour_us[chosen], direction=self.direction[chosen], count=self.count[chosen]
        )


@dataclass(frozen=True, slots=True, kw_only=True)
class HourlySpeeds:
    """Roll-ups by hour and direction; all of shape (n,). What has no passages has no row."""

    hour_us: IntArray
    direction: NDArray[np.int8]  # codes; see `of`
    rollups: tuple[Rollup, ...]

    def of(self, direction: Direction | None) -> HourlySpeeds:
        """Those of one direction; all where it is None."""
        if direction is None:
            return self
        chosen = np.flatnonzero(self.direction == DIRECTION_CODES[direction])
        return HourlySpeeds(
            hour_us=self.hour_us[chosen],
            direction=self.direction[chosen],
            rollups=tuple(self.rollups[i] for i in chosen),
        )

    def between(self, start_us: int, end_us: int) -> Rollup:
        """Merge the hours that start in [start_us, end_us)."""
        first, last = np.searchsorted(self.hour_us, [start_us, end_us])
        return merge(self.rollups[first:last])


def are_whole_hours(edges_us: IntArray) -> bool:
    """Whether intervals with these edges can be answered from roll-ups."""
    return not np.any(edges_us % HOUR_US)


def hourly_listening(store: Store, sensor: str, start_us: int, end_us: int) -> HourlyListening:
    """Time listened in each UTC hour that starts in [start_us, end_us)."""
    with store.reading() as connection:
        sensor_id, first, last = _asked(connection, sensor, start_us, end_us)
        rows = connection.execute(
            select(HourRow.hour, HourRow.listened_us).where(*_in(HourRow, sensor_id, first, last))
        )
        listened = {row.hour: row.listened_us for row in rows}
        for rolled, hours in _remade(connection, sensor_id, first, last):
            for hour in hours:
                listened.pop(hour, None)
            listened |= rolled.listened_us
    hours_us = np.array(sorted(listened.items()), np.int64).reshape(-1, 2)
    return HourlyListening(hour_us=hours_us[:, 0] * HOUR_US, listened_us=hours_us[:, 1])


def hourly_counts(
    store: Store, sensor: str, start_us: int, end_us: int, story: Story = Story.PASSAGE
) -> HourlyCounts:
    """Count passages, or another story, in each UTC hour that starts in [start_us, end_us)."""
    rows = _rows(store, sensor, start_us, end_us, story, ("count",))
    # numpy asks each row whether it is an array, which takes ages; so it is given the bare numbers
    table = np.fromiter(chain.from_iterable(rows), np.int64).reshape(-1, 3)
    return HourlyCounts(
        hour_us=table[:, 0] * HOUR_US, direction=table[:, 1].astype(np.int8), count=table[:, 2]
    )


def hourly_speeds(
    store: Store, sensor: str, start_us: int, end_us: int, story: Story = Story.PASSAGE
) -> HourlySpeeds:
    """Roll-ups of the passages in each UTC hour that starts in [start_us, end_us)."""
    rows = _rows(store, sensor, start_us, end_us, story, ROLLUP_COLUMNS)
    return HourlySpeeds(
        hour_us=np.array([row[0] * HOUR_US for row in rows], np.int64),
        direction=np.array([row[1] for row in rows], np.int8),
        rollups=tuple(Rollup(**dict(zip(ROLLUP_COLUMNS, row[2:], strict=True))) for row in rows),
    )


def _rows(
    store: Store, sensor: str, start_us: int, end_us: int, story: Story, columns: Sequence[str]
) -> list[Any]:
    """Hour, direction and some columns of roll-ups, in order."""
    table, code = HourPassagesRow, STORY_CODES[story]
    with store.reading() as connection:
        sensor_id, first, last = _asked(connection, sensor, start_us, end_us)
        query = (
            select(table.hour, table.direction, *(getattr(table, name) for name in columns))
            .where(*_in(table, sensor_id, first, last), table.story == code)
            .order_by(table.hour, table.direction)
        )
        rows: list[Any] = list(connection.execute(query).all())
        for rolled, hours in _remade(connection, sensor_id, first, last):
            rows = [row for row in rows if row[0] not in hours]
            for (hour, its_code, way), rollup in rolled.passages.items():
                if its_code == code:
                    rows.append((hour, way, *(getattr(rollup, name) for name in columns)))
            rows.sort()
    return rows


def _asked(connection: Connection, sensor: str, start_us: int, end_us: int) -> tuple[int, int, int]:
    ((sensor_id, _),) = known_sensors(connection, sensor)
    return sensor_id, -(-start_us // HOUR_US), -(-end_us // HOUR_US)


def _in(
    table: type[HourRow] | type[HourPassagesRow], sensor_id: int, first: int, last: int
) -> tuple[ColumnElement[bool], ...]:
    return table.sensor_id == sensor_id, table.hour >= first, table.hour < last


def _remade(connection: Connection, sensor_id: int, first: int, last: int) -> list[tuple[RolledHours, range]]:
    """Roll-ups of the hours that are marked, with these hours."""
    stale = stale_hours(connection, sensor_id, first, last)
    stale = sorted(set(stale) - final_hours(connection, sensor_id, stale))
    return [(built_hours(connection, sensor_id, *run), range(*run)) for run in runs(stale)]
