"""How many passed, and how much of the time somebody listened."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from ginnel import store as log
from ginnel.reports.intervals import Every, Period, period
from ginnel.stats import counts_in, listened_us_in, poisson_limits
from ginnel.stats.counts import IntArray
from ginnel.store import PassageArrays, Store
from ginnel.words import US_PER_S, Direction


@dataclass(frozen=True, slots=True, kw_only=True)
class CountRow:
    """Passages of one sensor and direction in one interval."""

    sensor: str
    interval_start_us: int
    interval_end_us: int
    direction: Direction | None  # None: all directions together
    count: int | None  # None: never listened
    count_low: float | None  # exact 95 % Poisson limits
    count_high: float | None
    corrected: float | None  # by tallies; None as long as there are none
    coverage: float  # 0 to 1
    listened_s: float


@dataclass(frozen=True, slots=True, kw_only=True)
class CoverageRow:
    """How much of one interval a sensor was listening."""

    sensor: str
    interval_start_us: int
    interval_end_us: int
    coverage: float
    listened_s: float


def counts(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
    *,
    together: bool = False,
) -> tuple[CountRow, ...]:
    """Count by interval and direction: see `iter_counts`."""
    return tuple(iter_counts(store, sensors, start_us, end_us, every, tz, together=together))


def iter_counts(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
    *,
    together: bool = False,
) -> Iterator[CountRow]:
    """Count by sensor, interval and direction, in this order.

    Every interval has a row for approaching and one for receding, and one for unknown if the sensor
    has any passage of unknown direction in the period; with ``together`` it has one row in all. The
    counts of an interval that was listened to in part are what was counted: coverage says how much
    of it that was. A crossing may lie just outside the time listened; it is counted all the same.
    """
    names = chosen_sensors(store, sensors)
    cut_up = period(store, every, start_us, end_us, tz, names)
    for sensor in names:
        yield from _sensor_counts(store, sensor, cut_up, together=together)


def coverage(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
) -> tuple[CoverageRow, ...]:
    """Tell by sensor and interval how much of it was listened to."""
    names = chosen_sensors(store, sensors)
    cut_up = period(store, every, start_us, end_us, tz, names)
    return tuple(
        CoverageRow(
            sensor=sensor,
            interval_start_us=int(cut_up.edges_us[i]),
            interval_end_us=int(cut_up.edges_us[i + 1]),
            coverage=float(listened_us / (cut_up.edges_us[i + 1] - cut_up.edges_us[i])),
            listened_s=float(listened_us / US_PER_S),
        )
        for sensor in names
        for i, listened_us in enumerate(listened(store, sensor, cut_up))
    )


def chosen_sensors(store: Store, sensors: Sequence[str] | None) -> list[str]:
    """Names of the sensors asked for, or of all, in order of name."""
    return [sensor.name for sensor in log.sensors(store)] if sensors is None else sorted(set(sensors))


def listened(store: Store, sensor: str, cut_up: Period) -> IntArray:
    """Microseconds listened in each interval."""
    if not len(cut_up):
        return np.empty(0, np.int64)
    heard = log.spans(store, sensor, int(cut_up.edges_us[0]), int(cut_up.edges_us[-1]))
    return listened_us_in(
        cut_up.edges_us,
        np.array([one.span.started_us for one in heard], np.int64),
        np.array([one.span.ended_us for one in heard], np.int64),
    )


def shown_directions(passages: PassageArrays, *, together: bool) -> list[Direction | None]:
    """Directions that get a row: approaching and receding always, unknown where there are any."""
    if together:
        return [None]
    shown: list[Direction | None] = [Direction.APPROACHING, Direction.RECEDING]
    if len(passages.of(Direction.UNKNOWN).crossed_us):
        shown.append(Direction.UNKNOWN)
    return shown


def _sensor_counts(store: Store, sensor: str, cut_up: Period, *, together: bool) -> Iterator[CountRow]:
    if not len(cut_up):
        return
    edges_us = cut_up.edges_us
    passages = log.passage_arrays(store, sensor, int(edges_us[0]), int(edges_us[-1]))
    listened_us = listened(store, sensor, cut_up)
    known = (listened_us > 0) | (counts_in(passages.crossed_us, edges_us) > 0)
    directions = shown_directions(passages, together=together)
    columns = []
    for direction in directions:
        count = counts_in(passages.of(direction).crossed_us, edges_us)
        columns.append((direction, count, *poisson_limits(count)))
    for i in range(len(cut_up)):
        length_us = int(edges_us[i + 1] - edges_us[i])
        for direction, count, low, high in columns:
            yield CountRow(
                sensor=sensor,
                interval_start_us=int(edges_us[i]),
                interval_end_us=int(edges_us[i + 1]),
                direction=direction,
                count=int(count[i]) if known[i] else None,
                count_low=float(low[i]) if known[i] else None,
                count_high=float(high[i]) if known[i] else None,
                corrected=None,
                coverage=int(listened_us[i]) / length_us,
                listened_s=int(listened_us[i]) / US_PER_S,
            )
