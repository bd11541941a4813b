"""Records of fixed width by the FHWA Traffic Monitoring Guide, editions of 2013 and 2016.

Hourly volumes: a record of 143 columns a day and direction. Speeds: a record of 105 columns an hour and
direction, in 15 bins of 5 mph that are closed above. A record has no place for coverage, so an hour that was
not heard in full is blank in the one and has no record in the other. Days are the site's; of an hour that
the clock shows twice both go into its one place, and one that it skips is blank.

Sources: field notes of the 2013 and 2016 editions as reprinted in a public library for reading such files.
From memory: the record type "3", codes of directions and days (1 is Sunday), restriction "0" for none.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path
from typing import BinaryIO
from zoneinfo import ZoneInfo

import numpy as np

from ginnel import reports
from ginnel.config import StationSettings
from ginnel.errors import ConfigError
from ginnel.export.draft import check_place, whole
from ginnel.export.tables import Question
from ginnel.reports.counts import WHOLE
from ginnel.reports.speed_bins import speed_bins
from ginnel.store import Store
from ginnel.times import from_us
from ginnel.words import Direction, FloatArray

_MPS_PER_MPH = 0.44704  # exact: 1609.344 m in 3600 s
#: Upper ends of all bins but the last, in the micrometres a second that speeds are kept in.
_UPPERS_MPS: FloatArray = np.round(np.arange(20, 90, 5) * _MPS_PER_MPH, 6)
_WAYS = (Direction.APPROACHING, Direction.RECEDING)


@dataclass(frozen=True, slots=True, kw_only=True)
class Records:
    """Lines of fixed width, and how many passages are in none since nobody knows which way they went."""

    lines: tuple[str, ...]
    n_without_direction: int


def volume_records(store: Store, asked: Question, stations: Mapping[str, StationSettings]) -> Records:
    """Hourly volumes of every day asked for in which any hour was heard in full."""
    lines, unknown = [], 0
    for sensor in _named(store, asked):
        station = _station(sensor, stations)
        hours, n_unknown = _volumes(store, sensor, asked)
        unknown += n_unknown
        for (day, direction), volumes in hours.items():
            if any(volume is not None for volume in volumes):
                lines.append(_volume_line(station, direction, day, volumes))
    return Records(lines=tuple(lines), n_without_direction=unknown)


def speed_records(store: Store, asked: Question, stations: Mapping[str, StationSettings]) -> Records:
    """Speeds of every hour asked for that was heard in full."""
    lines, unknown = [], 0
    for sensor in _named(store, asked):
        station = _station(sensor, stations)
        listened = reports.coverage(store, [sensor], asked.start_us, asked.end_us, reports.Every.HOUR)
        if not listened:
            continue
        edges_us = np.array([row.interval_start_us for row in listened] + [listened[-1].interval_end_us])
        binned = speed_bins(store, sensor, edges_us, _UPPERS_MPS)
        unknown += int(binned[Direction.UNKNOWN].total.sum())
        zone = reports.zone(store)
        for i, row in enumerate(listened):
            if row.coverage < WHOLE:
                continue
            hour = from_us(row.interval_start_us, zone)
            for way in _WAYS:
                one = binned[way]
                lines.append(_speed_line(station, way, hour, int(one.total[i]), one.binned[i].tolist()))
    return Records(lines=tuple(lines), n_without_direction=unknown)


def _named(store: Store, asked: Question) -> list[str]:
    return [facts.sensor.name for facts in reports.sensor_facts(store, asked.sensors)]


def _station(sensor: str, stations: Mapping[str, StationSettings]) -> StationSettings:
    if sensor not in stations:
        raise ConfigError(
            f"{sensor} has no [sensor.station] in the settings: tmg needs its state, station, "
            "functional_class, approaching and receding"
        )
    return stations[sensor]


_Hours = dict[tuple[datetime, Direction], list[int | None]]


def _volumes(store: Store, sensor: str, asked: Question) -> tuple[_Hours, int]:
    """Volumes by local midnight and direction, 24 each, and the passages of unknown direction."""
    zone = reports.zone(store)
    found: _Hours = {}
    broken: set[tuple[datetime, int]] = set()
    unknown = 0
    for row in reports.iter_counts(store, [sensor], asked.start_us, asked.end_us, reports.Every.HOUR):
        if row.direction not in _WAYS:
            unknown += row.count or 0
            continue
        hour, day = _hour_and_day(row.interval_start_us, zone)
        volumes = found.setdefault((day, row.direction), [None] * 24)
        if row.count is None or row.coverage < WHOLE or (day, hour) in broken:
            broken.add((day, hour))
            volumes[hour] = None
        else:
            volumes[hour] = (volumes[hour] or 0) + row.count
    return found, unknown


def _hour_and_day(moment_us: int, zone: ZoneInfo) -> tuple[int, datetime]:
    moment = from_us(moment_us, zone)
    return moment.hour, datetime(moment.year, moment.month, moment.day)  # noqa: DTZ001 (a date as a key)


def _volume_line(station: StationSettings, way: Direction, day: datetime, volumes: list[int | None]) -> str:
    weekday = day.isoweekday() % 7 + 1  # from Sunday
    hours = "".join(" " * 5 if volume is None else f"{volume:05d}" for volume in volumes)
    return (
        f"3{station.state}{station.functional_class}{station.station.zfill(6)}{_code(station, way)}"
        f"{station.lane}{day:%Y%m%d}{weekday}{hours}0"
    )


def _speed_line(station: StationSettings, way: Direction, hour: datetime, total: int, bins: list[int]) -> str:
    counts = "".join(f"{count:05d}" for count in bins)
    return (
        f"T{station.state}{station.station.zfill(6)}{_code(station, way)}{station.lane}{hour:%Y%m%d%H}"
        f"  {len(bins):02d}{total:05d}{counts}"
    )


def _code(station: StationSettings, way: Direction) -> int:
    return station.approaching if way is Direction.APPROACHING else station.receding


def write_records(records: Records, output: Path | BinaryIO) -> None:
    """Write records to a stream, or to a file, which appears whole or not at all."""
    text = "".join(f"{line}\n" for line in records.lines).encode("ascii")
    if not isinstance(output, Path):
        output.write(text)
        return
    with whole(check_place(output)) as draft:
        draft.write_bytes(text)
