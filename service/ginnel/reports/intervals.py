"""Cutting time into the site's hours, days, weeks and months.

An interval is where the local clock shows one and the same hour (day, ...), half-open and named by
its start. So a day may last 23 or 25 hours, and the hour that a clock shows twice in autumn is two
intervals an hour long each, told apart by their UTC offset.
"""

from __future__ import annotations

import zoneinfo
from dataclasses import dataclass
from datetime import UTC, date, datetime, timedelta, tzinfo
from enum import StrEnum
from itertools import pairwise

import numpy as np

from ginnel import store as log
from ginnel.errors import ConfigError
from ginnel.reports.facts import site
from ginnel.stats.counts import IntArray
from ginnel.store import Store
from ginnel.times import from_us, to_us
from ginnel.words import US_PER_S

DAY_US = 86_400 * US_PER_S


class Every(StrEnum):
    """How long an interval is."""

    FIVE_MINUTES = "5min"
    QUARTER_HOUR = "15min"
    HOUR = "hour"
    DAY = "day"
    WEEK = "week"  # from Monday, as ISO 8601 has it
    MONTH = "month"


_STEP_US = {
    Every.FIVE_MINUTES: 300 * US_PER_S,
    Every.QUARTER_HOUR: 900 * US_PER_S,
    Every.HOUR: 3600 * US_PER_S,
}


@dataclass(frozen=True, slots=True, kw_only=True)
class Period:
    """A stretch of time in a zone, cut into intervals; interval i is [edges_us[i], edges_us[i + 1])."""

    zone: tzinfo
    edges_us: IntArray

    def __len__(self) -> int:
        return max(len(self.edges_us) - 1, 0)


def zone(store: Store, tz: str | None = None) -> zoneinfo.ZoneInfo:
    """Get the site's time zone, or one by its IANA name."""
    name = site(store).timezone if tz is None else tz
    try:
        return zoneinfo.ZoneInfo(name)
    except (zoneinfo.ZoneInfoNotFoundError, ValueError, OSError) as error:
        raise ConfigError(f"{name!r} is no IANA time zone such as Europe/Dublin") from error


def period(
    store: Store,
    every: Every,
    start_us: int | None = None,
    end_us: int | None = None,
    tz: str | None = None,
    sensors: list[str] | None = None,
) -> Period:
    """Intervals that share time with [start_us, end_us), each whole, in the site's zone or another.

    An end that is not given is where the log of the sensors begins or ends. Without a log there are
    no intervals.
    """
    local = zone(store, tz)
    if start_us is None or end_us is None:
        extent = log.extent_us(store, sensors)
        if extent is None:
            return Period(zone=local, edges_us=np.empty(0, np.int64))
        start_us = extent[0] if start_us is None else start_us
        end_us = extent[1] if end_us is None else end_us
    return Period(zone=local, edges_us=cut(start_us, end_us, every, local))


def cut(start_us: int, end_us: int, every: Every, zone: tzinfo) -> IntArray:
    """Edges of the intervals that share time with [start_us, end_us), each interval whole.

    Returns
    -------
    array of ascending integer microseconds, one more than intervals; empty where start >= end
    """
    if start_us >= end_us:
        return np.empty(0, np.int64)
    if every in _STEP_US:
        first_us = _day_start_us(_day_of(start_us, zone), zone)
        last_us = _day_start_us(_day_of(end_us - 1, zone) + timedelta(days=1), zone)
        edges = _clock_edges(first_us, last_us, _STEP_US[every], zone)
    else:
        edges = _calendar_edges(start_us, end_us, every, zone)
    first = int(np.searchsorted(edges, start_us, side="right")) - 1
    last = int(np.searchsorted(edges, end_us, side="left"))
    return edges[first : last + 1]


def _calendar_edges(start_us: int, end_us: int, every: Every, zone: tzinfo) -> IntArray:
    day = _day_of(start_us, zone)
    if every is Every.WEEK:
        day -= timedelta(days=day.weekday())
    elif every is Every.MONTH:
        day = day.replace(day=1)
    edges = [_day_start_us(day, zone)]
    while edges[-1] < end_us:
        if every is Every.MONTH:
            day = (day + timedelta(days=31)).replace(day=1)
        else:
            day += timedelta(days=7 if every is Every.WEEK else 1)
        edges.append(_day_start_us(day, zone))
    return np.unique(np.array(edges, np.int64))  # a zone that skipped a whole day has it no interval


def _clock_edges(first_us: int, last_us: int, step_us: int, zone: tzinfo) -> IntArray:
    """Every moment at which the local clock comes to show another multiple of a step."""
    pieces = []
    bounds = [first_us, *offset_changes(first_us, last_us, zone), last_us]
    for begin_us, stop_us in pairwise(bounds):
        ahead_us = offset_us(begin_us, zone)
        local_us = begin_us + ahead_us
        aligned_us = -(-local_us // step_us) * step_us - ahead_us
        inner = np.arange(aligned_us, stop_us, step_us, dtype=np.int64)
        shown_before = (begin_us - 1 + offset_us(begin_us - 1, zone)) // step_us
        if aligned_us != begin_us and (begin_us == first_us or shown_before != local_us // step_us):
            inner = np.concatenate([[begin_us], inner])
        pieces.append(inner)
    return np.concatenate([*pieces, [last_us]])


def offset_changes(first_us: int, last_us: int, zone: tzinfo) -> list[int]:
    """Moments at which the zone's offset from UTC changes; at most one a day is looked for."""
    changes = []
    looks = [*range(first_us, last_us, DAY_US), last_us]
    for low_us, high_us in pairwise(looks):
        before = offset_us(low_us, zone)
        if before == offset_us(high_us, zone):
            continue
        while high_us - low_us > 1:
            middle_us = (low_us + high_us) // 2
            if offset_us(middle_us, zone) == before:
                low_us = middle_us
            else:
                high_us = middle_us
        changes.append(high_us)
    return changes


def offset_us(moment_us: int, zone: tzinfo) -> int:
    """Tell how far a zone's clock is ahead of UTC."""
    offset = from_us(moment_us, zone).utcoffset()
    assert offset is not None  # noqa: S101 (a zone always has one)
    return offset // timedelta(microseconds=1)


def _day_of(moment_us: int, zone: tzinfo) -> date:
    return from_us(moment_us, zone).date()


def _day_start_us(day: date, zone: tzinfo) -> int:
    """First moment of a local day. Where midnight is skipped, fold 0 names the moment of the skip."""
    return to_us(datetime(day.year, day.month, day.day, tzinfo=zone).astimezone(UTC))
