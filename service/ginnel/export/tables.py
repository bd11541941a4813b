"""The tables that are exported: their columns and their rows as text.

The columns are a contract. Rows come from an iterator, so that a table of any length takes little
memory. A blank cell means unknown; an interval never listened to has blanks, not zeros.
"""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import astuple, dataclass, fields
from datetime import tzinfo
from itertools import pairwise

from ginnel import reports
from ginnel.reports import CountRow, Every, PassageEntry, SensorFacts, SpeedRow
from ginnel.stats import SpeedSummary
from ginnel.stats.speeds import PERCENTILE_METHOD
from ginnel.store import Store
from ginnel.times import from_us, utc_text
from ginnel.words import Direction, Flag, MoverKind, Sensor, Story, speed_band_labels


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One column: what a reader must know to use it."""

    name: str
    type: str  # of the Table Schema standard: string, datetime, number, integer
    description: str
    unit: str = ""
    required: bool = False
    values: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class Table:
    """Columns and rows of text, ready to be written once."""

    name: str
    title: str
    columns: tuple[Column, ...]
    primary_key: tuple[str, ...]
    sensors: tuple[SensorFacts, ...]
    rows: Iterator[list[str]]


_DIRECTIONS = tuple(Direction)
_SENSOR = Column(name="sensor", type="string", description="name of the sensor", required=True)
_DIRECTION = Column(
    name="direction",
    type="string",
    description="as the sensor sees it; the plain names of both ways are with the sensors below",
    required=True,
    values=_DIRECTIONS,
)
_INTERVAL = (
    _SENSOR,
    Column(
        name="interval_start",
        type="datetime",
        description="start of the interval, with the offset from UTC that holds at the site then",
        required=True,
    ),
    Column(
        name="interval_end",
        type="datetime",
        description="end of the interval, which is not part of it",
        required=True,
    ),
    _DIRECTION,
)

PASSAGE_COLUMNS = (
    Column(
        name="passage_id",
        type="string",
        description="lasting name: the sensor, and the crossing in microseconds since 1970 UTC",
        required=True,
    ),
    _SENSOR,
    Column(name="started_at", type="datetime", description="first heard, UTC", required=True),
    Column(
        name="crossed_at", type="datetime", description="beside or beneath the sensor, UTC", required=True
    ),
    Column(name="ended_at", type="datetime", description="last heard, UTC", required=True),
    _DIRECTION,
    Column(
        name="direction_confidence",
        type="number",
        description="probability that the direction is right, 0.5 to 1; blank where it is unknown",
        unit="1",
    ),
    Column(name="speed_mps", type="number", description="speed along the path", unit="m/s"),
    Column(name="speed_se_mps", type="number", description="standard error of the speed", unit="m/s"),
    Column(
        name="speed_band",
        type="string",
        description="speed band, in m/s, closed below and open above",
    ),
    Column(name="snr_db", type="number", description="signal to noise ratio", unit="dB"),
    Column(
        name="mover",
        type="string",
        description="what moved; blank where that cannot be told",
        values=tuple(MoverKind),
    ),
    Column(
        name="flags",
        type="string",
        description=(
            "what to know before trusting the passage, parted by semicolons, from: "
            + ", ".join([*(story for story in Story if story is not Story.PASSAGE), *Flag])
            + "; turn-backs and fidgeting are no passages and do not count"
        ),
    ),
)

COUNT_COLUMNS = (
    *_INTERVAL,
    Column(
        name="count",
        type="integer",
        description="passages counted while listening; blank where the interval was never listened to",
        unit="1",
    ),
    Column(
        name="count_low", type="number", description="lower exact 95 % Poisson limit of the count", unit="1"
    ),
    Column(
        name="count_high", type="number", description="upper exact 95 % Poisson limit of the count", unit="1"
    ),
    Column(
        name="corrected",
        type="number",
        description="count corrected by tallies; blank where there is no tally",
        unit="1",
    ),
    Column(
        name="coverage", type="number", description="share of the interval that was listened to", unit="1"
    ),
    Column(name="listened_s", type="number", description="time listened in the interval", unit="s"),
)

SPEED_COLUMNS = (
    *_INTERVAL,
    Column(
        name="n",
        type="integer",
        description="passages with a measured speed; blank where the interval was never listened to",
        unit="1",
    ),
    Column(name="mean_mps", type="number", description="mean over passages (time-mean speed)", unit="m/s"),
    Column(name="space_mean_mps", type="number", description="harmonic mean (space-mean speed)", unit="m/s"),
    Column(name="sd_mps", type="number", description="sample standard deviation, n - 1", unit="m/s"),
    *(
        Column(
            name=f"p{percent}_mps",
            type="number",
            description=f"{percent}th percentile ({PERCENTILE_METHOD})",
            unit="m/s",
        )
        for percent in (15, 50, 85, 95)
    ),
)


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
    flags = [flag.value for flag in Flag if flag in passage.flags]
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
