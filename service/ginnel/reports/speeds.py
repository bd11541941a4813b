"""How fast they passed."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import groupby

import numpy as np

from ginnel import store as log
from ginnel.reports.cells import iter_cells
from ginnel.reports.intervals import Every, period
from ginnel.reports.parts import chosen_sensors
from ginnel.stats import SpeedSummary, band_counts, summarise_speeds
from ginnel.store import Store
from ginnel.words import Direction, FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class SpeedRow:
    """Speeds of one sensor and direction in one interval."""

    sensor: str
    interval_start_us: int
    interval_end_us: int
    direction: Direction | None  # None: all directions together
    summary: SpeedSummary | None  # None: never listened
    bands: tuple[int, ...] | None  # passages in each band of the sensor, slowest first


def speeds(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
    *,
    together: bool = False,
) -> tuple[SpeedRow, ...]:
    """Summarise speeds by interval and direction: see `iter_speeds`."""
    return tuple(iter_speeds(store, sensors, start_us, end_us, every, tz, together=together))


def iter_speeds(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
    *,
    together: bool = False,
) -> Iterator[SpeedRow]:
    """Summarise speeds by sensor, interval and direction, in this order; rows as in `iter_counts`.

    ``n`` is the number of passages with a measured speed, which may be fewer than passed.
    """
    names = chosen_sensors(store, sensors)
    cut_up = period(store, every, start_us, end_us, tz, names)
    bands = {sensor.name: sensor.speed_bands_mps for sensor in log.sensors(store)}
    for sensor, cells in groupby(
        iter_cells(store, names, cut_up, together=together), lambda cell: cell.sensor
    ):
        passages = log.passage_arrays(store, sensor, int(cut_up.edges_us[0]), int(cut_up.edges_us[-1]))
        ways = {direction: passages.of(direction) for direction in (None, *Direction)}
        for cell in cells:
            own = ways[cell.direction]
            first, last = np.searchsorted(own.crossed_us, [cell.start_us, cell.end_us])
            speed_mps = own.speed_mps[first:last]
            yield SpeedRow(
                sensor=sensor,
                interval_start_us=cell.start_us,
                interval_end_us=cell.end_us,
                direction=cell.direction,
                summary=None if cell.count is None else summarise_speeds(speed_mps),
                bands=None if cell.count is None else tuple(band_counts(speed_mps, bands[sensor]).tolist()),
            )


def speed_histogram(
    store: Store,
    sensor: str,
    start_us: int | None = None,
    end_us: int | None = None,
    direction: Direction | None = None,
    bin_mps: float = 0.1,
) -> tuple[FloatArray, FloatArray, SpeedSummary]:
    """Histogram of the speeds of one sensor, with their summary.

    Returns
    -------
    edges_mps : array, shape (n + 1,), multiples of ``bin_mps`` from the one below the slowest
    counts : array, shape (n,); both are empty where no speed was measured
    summary : of the same speeds
    """
    if not bin_mps > 0:
        raise ValueError(f"{bin_mps=} must be positive")
    speed_mps = log.passage_arrays(store, sensor, start_us, end_us).of(direction).speed_mps
    measured = speed_mps[np.isfinite(speed_mps)]
    summary = summarise_speeds(measured)
    if not len(measured):
        return np.empty(0), np.empty(0), summary
    first, last = np.floor(measured.min() / bin_mps), np.floor(measured.max() / bin_mps) + 1
    edges_mps = np.arange(first, last + 1) * bin_mps
    return edges_mps, band_counts(measured, edges_mps[1:-1].tolist()).astype(float), summary
