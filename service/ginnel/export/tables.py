"""The tables that are exported, as columns of cells, some thousands of rows at a time.

So a table of any length takes little memory. A blank cell means unknown; an interval never listened
to has blanks, not zeros.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from itertools import islice, pairwise
from typing import TypeVar
from zoneinfo import ZoneInfo

from ginnel import reports
from ginnel.export.cells import Batch, Cells, Numbered, coded, moments, numbers
from ginnel.export.columns import (
    COUNT_COLUMNS,
    HEALTH_COLUMNS,
    OCCUPANCY_COLUMNS,
    PASSAGE_COLUMNS,
    SPEED_COLUMNS,
    Column,
    band_column,
)
from ginnel.reports import BandedPassages, CountRow, Every, OccupancyRow, SensorFacts, SpeedRow
from ginnel.reports.health import iter_health
from ginnel.store import Coded, LoggedHealth, Store
from ginnel.words import FloatArray, Sensor, speed_band_labels

_ROWS_AT_ONCE = 4000
_Row = TypeVar("_Row")


@dataclass(frozen=True, slots=True, kw_only=True)
class Question:
    """What is asked for: which sensors, which time, cut how; the same for every table."""

    sensors: tuple[str, ...] | None = None  # None: all
    start_us: int | None = None  # None: from the beginning of the log
    end_us: int | None = None
    every: Every = Every.HOUR
    with_uncounted: bool = False  # passages: turn-backs and fidgeting too


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """Columns and rows, ready to be written once."""

    name: str
    title: str
    columns: tuple[Column, ...]
    primary_key: tuple[str, ...]
    question: Question
    zone: ZoneInfo  # of the site
    sensors: tuple[SensorFacts, ...]
    batches: Iterator[Batch]


def passages_table(store: Store, asked: Question) -> Table:
    """Tabulate passages that cross in the time asked for, in order of crossing."""
    found = reports.iter_columns(
        store, asked.sensors, asked.start_us, asked.end_us, with_uncounted=asked.with_uncounted
    )
    return Table(
        name="passages",
        title="Passages",
        columns=PASSAGE_COLUMNS,
        primary_key=("passage_id",),
        question=asked,
        zone=reports.zone(store),
        sensors=reports.sensor_facts(store, asked.sensors),
        batches=(_passage_cells(some) for some in found),
    )


def counts_table(store: Store, asked: Question) -> Table:
    """Tabulate counts by sensor, interval and direction; an interval touched is there as a whole."""
    rows = reports.iter_counts(store, asked.sensors, asked.start_us, asked.end_us, asked.every)
    return _interval_table(store, asked, "counts", COUNT_COLUMNS, _batches(rows, _count_cells))


def speeds_table(store: Store, asked: Question) -> Table:
    """Tabulate speeds by sensor, interval and direction, with a column for each speed band of any sensor."""
    chosen = [facts.sensor for facts in reports.sensor_facts(store, asked.sensors)]
    labels = _band_labels(chosen)
    own = {sensor.name: speed_band_labels(sensor.speed_bands_mps) for sensor in chosen}
    columns = SPEED_COLUMNS + tuple(band_column(label) for label in labels)
    rows = reports.iter_speeds(store, asked.sensors, asked.start_us, asked.end_us, asked.every)
    cells = _batches(rows, lambda some: _speed_cells(some, labels, own))
    return _interval_table(store, asked, "speeds", columns, cells)


def occupancy_table(store: Store, asked: Question) -> Table:
    """Tabulate the share of time in which somebody was in the beam, by sensor and interval."""
    rows = reports.iter_occupancy(store, asked.sensors, asked.start_us, asked.end_us, asked.every)
    table = _interval_table(store, asked, "occupancy", OCCUPANCY_COLUMNS, _batches(rows, _occupancy_cells))
    return replace(table, primary_key=("sensor", "interval_start"))


def health_table(store: Store, asked: Question) -> Table:
    """Tabulate how well the sensors heard, minute by minute, in order of sensor and time."""
    rows = iter_health(store, asked.sensors, asked.start_us, asked.end_us)
    table = _interval_table(store, asked, "health", HEALTH_COLUMNS, _batches(rows, _health_cells))
    return replace(table, title="Health by the minute", primary_key=("sensor", "measured_at"))


#: Every table that can be exported, by name.
TABLES: dict[str, Callable[[Store, Question], Table]] = {
    "passages": passages_table,
    "counts": counts_table,
    "speeds": speeds_table,
    "occupancy": occupancy_table,
    "health": health_table,
}


def _interval_table(
    store: Store, asked: Question, name: str, columns: tuple[Column, ...], batches: Iterator[Batch]
) -> Table:
    return Table(
        name=name,
        title=f"{name.capitalize()} by {asked.every.value}",
        columns=columns,
        primary_key=("sensor", "interval_start", "direction"),
        question=asked,
        zone=reports.zone(store),
        sensors=reports.sensor_facts(store, asked.sensors),
        batches=batches,
    )


def _batches(rows: Iterable[_Row], cells: Callable[[list[_Row]], Batch]) -> Iterator[Batch]:
    every_row = iter(rows)
    while some := list(islice(every_row, _ROWS_AT_ONCE)):
        yield cells(some)


def _band_labels(chosen: Sequence[Sensor]) -> list[str]:
    """Labels of all bands of all sensors, slowest first, each once."""
    infinity = float("inf")
    bands: dict[tuple[float, float], str] = {}
    for sensor in chosen:
        edges = [-infinity, *sensor.speed_bands_mps, infinity]
        labels = speed_band_labels(sensor.speed_bands_mps)
        bands |= dict(zip(pairwise(edges), labels, strict=True))
    return list(dict.fromkeys(bands[key] for key in sorted(bands)))


def _passage_cells(some: BandedPassages) -> Batch:
    passages = some.passages
    return (
        Numbered(word=passages.sensor, number=passages.crossed_us),
        passages.sensor,
        moments(passages.started_us),
        moments(passages.crossed_us),
        moments(passages.ended_us),
        passages.direction,
        passages.direction_confidence,
        passages.speed_mps,
        passages.speed_se_mps,
        some.speed_band,
        passages.snr_db,
        passages.mover,
        passages.flags,
    )


def _interval_cells(rows: Sequence[CountRow | SpeedRow | OccupancyRow]) -> tuple[Cells, ...]:
    return (
        coded([row.sensor for row in rows]),
        moments([row.interval_start_us for row in rows]),
        moments([row.interval_end_us for row in rows]),
    )


def _directions(rows: Sequence[CountRow | SpeedRow]) -> Coded:
    return coded([row.direction.value if row.direction else "" for row in rows])


def _named(rows: Sequence[object], columns: Sequence[Column]) -> tuple[FloatArray, ...]:
    """Numbers of rows, each by its column's name; all blank in a row that is None."""
    return tuple(numbers([getattr(row, column.name, None) for row in rows]) for column in columns)


def _count_cells(rows: list[CountRow]) -> Batch:
    return (*_interval_cells(rows), _directions(rows), *_named(rows, COUNT_COLUMNS[4:]))


def _speed_cells(rows: list[SpeedRow], labels: Sequence[str], own: dict[str, list[str]]) -> Batch:
    held = [{} if row.bands is None else dict(zip(own[row.sensor], row.bands, strict=True)) for row in rows]
    return (
        *_interval_cells(rows),
        _directions(rows),
        *_named([row.summary for row in rows], SPEED_COLUMNS[4:]),
        *(numbers([one.get(label) for one in held]) for label in labels),
    )


def _occupancy_cells(rows: list[OccupancyRow]) -> Batch:
    return (*_interval_cells(rows), *_named(rows, OCCUPANCY_COLUMNS[3:]))


def _health_cells(rows: list[LoggedHealth]) -> Batch:
    return (
        coded([row.sensor for row in rows]),
        moments([row.sample.at_us for row in rows]),
        *_named([row.sample for row in rows], HEALTH_COLUMNS[2:]),
    )
