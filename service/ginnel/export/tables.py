"""The tables that are exported: their columns and their rows as text.

Rows come from an iterator, so that a table of any length takes little
memory. A blank cell means unknown; an interval never listened to has blanks, not zeros.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import astuple, dataclass, fields
from datetime import tzinfo
from itertools import pairwise

from ginnel import reports
from ginnel.export.columns import COUNT_COLUMNS, PASSAGE_COLUMNS, SPEED_COLUMNS, Column
from ginnel.reports import CountRow, Every, PassageEntry, SensorFacts, SpeedRow
from ginnel.stats import SpeedSummary
from ginnel.store import Store
from ginnel.times import from_us, utc_text
from ginnel.words import Flag, Sensor, Story, speed_band_labels


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """Columns and rows of text, ready to be written once."""

    name: str
    title: str
    columns: tuple[Column, ...]
    primary_key: tuple[str, ...]
    sensors: tuple[SensorFacts, ...]
    rows: Iterator[list[str]]


def passages_table(
    store: Store,
    names: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    *,
    with_uncounted: bool = False,
) -> Table:
    """Tabulate passages that cross in [start_us, end_us), in order of crossing."""
    entries = reports.iter_entries(store, names, start_us, end_us, with_uncounted=with_uncounted)
    return Table(
        name="passages",
        title="Passages",
        columns=PASSAGE_COLUMNS,
        primary_key=("passage_id",),
        sensors=reports.sensor_facts(store, names),
        rows=(_passage_cells(entry) for entry in entries),
    )


def counts_table(
    store: Store,
    names: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
) -> Table:
    """Tabulate counts by sensor, interval and direction; an interval touched is there as a whole."""
    zone = reports.zone(store)
    rows = reports.iter_counts(store, names, start_us, end_us, every)
    return Table(
        name="counts",
        title=f"Counts by {every.value}",
        columns=COUNT_COLUMNS,
        primary_key=("sensor", "interval_start", "direction"),
        sensors=reports.sensor_facts(store, names),
        rows=(_count_cells(row, zone) for row in rows),
    )


def speeds_table(
    store: Store,
    names: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
) -> Table:
    """Tabulate speeds by sensor, interval and direction, with a column for each speed band of any sensor."""
    zone = reports.zone(store)
    facts = reports.sensor_facts(store, names)
    chosen = [one.sensor for one in facts]
    labels = _band_labels(chosen)
    own = {sensor.name: speed_band_labels(sensor.speed_bands_mps) for sensor in chosen}
    bands = tuple(
        Column(
            name=f"band_{label}",
            type="integer",
            description=f"passages in the speed band {label} m/s, closed below and open above",
            unit="1",
        )
        for label in labels
    )
    rows = reports.iter_speeds(store, names, start_us, end_us, every)
    return Table(
        name="speeds",
        title=f"Speeds by {every.value}",
        columns=SPEED_COLUMNS + bands,
        primary_key=("sensor", "interval_start", "direction"),
        sensors=facts,
        rows=(_speed_cells(row, zone, labels, own[row.sensor]) for row in rows),
    )


def _band_labels(chosen: Sequence[Sensor]) -> list[str]:
    """Labels of all bands of all sensors, slowest first, each once."""
    infinity = float("inf")
    bands: dict[tuple[float, float], str] = {}
    for sensor in chosen:
        edges = [-infinity, *sensor.speed_bands_mps, infinity]
        labels = speed_band_labels(sensor.speed_bands_mps)
        bands |= dict(zip(pairwise(edges), labels, strict=True))
    return list(dict.fromkeys(bands[key] for key in sorted(bands)))


def _passage_cells(entry: PassageEntry) -> list[str]:
    passage = entry.passage
    flags = [flag.value for flag in Flag if flag in passage.flags] if passage.flags else []
    if passage.story is not Story.PASSAGE:
        flags.insert(0, passage.story.value)
    return [
        safe_text(entry.passage_id),
        safe_text(entry.sensor),
        utc_text(passage.started_us),
        utc_text(passage.crossed_us),
        utc_text(passage.ended_us),
        passage.direction.value,
        number_text(passage.direction_confidence, 4),
        number_text(passage.speed_mps, 4),
        number_text(passage.speed_se_mps, 4),
        safe_text(entry.speed_band),
        number_text(passage.snr_db, 2),
        passage.mover.value if passage.mover else "",
        ";".join(flags),
    ]


def _count_cells(row: CountRow, zone: tzinfo) -> list[str]:
    return [
        *_interval_cells(row, zone),
        "" if row.count is None else str(row.count),
        number_text(row.count_low, 4),
        number_text(row.count_high, 4),
        number_text(row.corrected, 4),
        number_text(row.coverage, 6),
        number_text(row.listened_s, 6),
    ]


def _speed_cells(row: SpeedRow, zone: tzinfo, labels: Sequence[str], own: Sequence[str]) -> list[str]:
    cells = _interval_cells(row, zone)
    if row.summary is None or row.bands is None:
        return cells + [""] * (len(fields(SpeedSummary)) + len(labels))
    n, *numbers = astuple(row.summary)
    held = dict(zip(own, row.bands, strict=True))
    return [
        *cells,
        str(n),
        *(number_text(number, 4) for number in numbers),
        *(str(held[label]) if label in held else "" for label in labels),
    ]


def _interval_cells(row: CountRow | SpeedRow, zone: tzinfo) -> list[str]:
    return [
        safe_text(row.sensor),
        from_us(row.interval_start_us, zone).isoformat(),
        from_us(row.interval_end_us, zone).isoformat(),
        row.direction.value if row.direction else "",
    ]


def number_text(value: float | None, decimals: int) -> str:
    """Write a number with a fixed number of decimals; blank where unknown, never ``-0``."""
    if value is None:
        return ""
    text = f"{value:.{decimals}f}"
    return text.removeprefix("-") if float(text) == 0 else text


def safe_text(text: str) -> str:
    """Text that no spreadsheet takes for a formula; an apostrophe goes before what looks like one."""
    return f"'{text}" if text.startswith(("=", "+", "-", "@", "\t", "\r", "\n")) else text
