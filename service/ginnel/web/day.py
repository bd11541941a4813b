"""One day of one sensor: everything that the page and its charts show."""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass
from datetime import date, datetime, timedelta
from zoneinfo import ZoneInfo

import numpy as np

from ginnel import reports
from ginnel.reports import overview as about
from ginnel.reports.counts import CountRow
from ginnel.reports.passages import PassageEntry
from ginnel.stats import SpeedSummary
from ginnel.store import Store
from ginnel.times import from_us, to_us
from ginnel.words import US_PER_S, Direction, FloatArray, Sensor, Site

LAST_SHOWN = 20
US_PER_HOUR = 3600 * US_PER_S


@dataclass(frozen=True, slots=True, kw_only=True)
class Hour:
    """One hour of the local clock; a direction that has no count is not in ``counts``."""

    start_us: int
    end_us: int
    label: str
    counts: dict[Direction, CountRow]
    coverage: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Speeds:
    """Speeds of a day: a histogram for each direction over common edges, and summaries."""

    edges_mps: FloatArray
    counts: dict[Direction, FloatArray]
    summaries: dict[Direction | None, SpeedSummary]


@dataclass(frozen=True, slots=True, kw_only=True)
class Day:
    """What is known of one sensor's day."""

    site: Site
    sensor: Sensor
    day: date
    zone: ZoneInfo
    start_us: int
    end_us: int
    hours: tuple[Hour, ...]
    totals: dict[Direction, CountRow]
    coverage: float
    listened_s: float
    heard: tuple[about.Stretch, ...]
    speeds: Speeds
    last: tuple[PassageEntry, ...]

    @property
    def directions(self) -> tuple[Direction, ...]:
        """Directions to show: approaching, receding, and unknown where there is any."""
        return tuple(self.totals)

    def gaps_us(self) -> list[tuple[int, int]]:
        """Stretches of the day without listening."""
        edges = [self.start_us]
        for stretch in self.heard:
            edges += [stretch.started_us, stretch.ended_us]
        edges.append(self.end_us)
        return [(a, b) for a, b in zip(edges[::2], edges[1::2], strict=True) if b > a]


def name_of(direction: Direction, sensor: Sensor) -> str:
    """Plain name of a direction at this sensor."""
    names = {Direction.APPROACHING: sensor.approaching_name, Direction.RECEDING: sensor.receding_name}
    return names.get(direction, "direction unknown")


def bounds_us(day: date, zone: ZoneInfo) -> tuple[int, int]:
    """Where a local day begins and ends."""
    start = datetime(day.year, day.month, day.day, tzinfo=zone)
    after = day + timedelta(days=1)
    return to_us(start), to_us(datetime(after.year, after.month, after.day, tzinfo=zone))


def last_day(store: Store, sensor: str, zone: ZoneInfo) -> date | None:
    """Find the last local day of which the log knows anything."""
    extent = about.extent_us(store, sensor)
    return None if extent is None else from_us(extent[1] - 1, zone).date()


def look_at(store: Store, site: Site, sensor: Sensor, day: date) -> Day:
    """Ask the reports for one day of one sensor."""
    zone = ZoneInfo(site.timezone)
    start_us, end_us = bounds_us(day, zone)
    rows = reports.counts(store, [sensor.name], start_us, end_us, reports.Every.HOUR, site.timezone)
    totals = reports.counts(store, [sensor.name], start_us, end_us, reports.Every.DAY, site.timezone)
    entries = reports.iter_entries(store, [sensor.name], start_us, end_us)
    return Day(
        site=site,
        sensor=sensor,
        day=day,
        zone=zone,
        start_us=start_us,
        end_us=end_us,
        hours=_hours(rows, zone),
        totals={row.direction: row for row in totals if row.direction is not None},
        coverage=totals[0].coverage,
        listened_s=totals[0].listened_s,
        heard=about.heard(store, sensor.name, start_us, end_us),
        speeds=_speeds(store, sensor, start_us, end_us),
        last=tuple(reversed(deque(entries, maxlen=LAST_SHOWN))),
    )


def _hours(rows: tuple[CountRow, ...], zone: ZoneInfo) -> tuple[Hour, ...]:
    by_start: dict[int, list[CountRow]] = {}
    for row in rows:
        by_start.setdefault(row.interval_start_us, []).append(row)
    return tuple(
        Hour(
            start_us=start_us,
            end_us=same[0].interval_end_us,
            label=f"{from_us(start_us, zone):%H:%M}",
            counts={
                row.direction: row for row in same if row.direction is not None and row.count is not None
            },
            coverage=same[0].coverage,
        )
        for start_us, same in sorted(by_start.items())
    )


def _speeds(store: Store, sensor: Sensor, start_us: int, end_us: int) -> Speeds:
    bin_mps = 0.1 if sensor.max_speed_mps <= 10 else 1.0
    together, _, summary = reports.speed_histogram(store, sensor.name, start_us, end_us, None, bin_mps)
    counts: dict[Direction, FloatArray] = {}
    summaries: dict[Direction | None, SpeedSummary] = {None: summary}
    for direction in Direction:
        edges, n, summaries[direction] = reports.speed_histogram(
            store, sensor.name, start_us, end_us, direction, bin_mps
        )
        counts[direction] = np.zeros(max(len(together) - 1, 0))
        if len(n):
            at = round((edges[0] - together[0]) / bin_mps)
            counts[direction][at : at + len(n)] = n
    return Speeds(edges_mps=together, counts=counts, summaries=summaries)
