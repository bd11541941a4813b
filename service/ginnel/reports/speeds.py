"""How fast they passed."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from ginnel import store as log
from ginnel.reports.intervals import Every
from ginnel.reports.parts import iter_cells
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
    bands = {sensor.name: sensor.speed_bands_mps for sensor in log.sensors(store)}
    for cell in iter_cells(store, sensors, start_us, end_us, every, tz, together=together):
        speed_mps = cell.part.speed_mps(cell.i)
        yield SpeedRow(
            sensor=cell.sensor,
            interval_start_us=cell.start_us,
            interval_end_us=cell.end_us,
            direction=cell.part.direction,
            summary=summarise_speeds(speed_mps) if cell.known else None,
            bands=tuple(band_counts(speed_mps, bands[cell.sensor]).tolist()) if cell.known else None,
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
