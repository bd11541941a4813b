"""How fast they passed."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from ginnel import store as log
from ginnel.reports.counts import chosen_sensors, listened, shown_directions
from ginnel.reports.intervals import Every, Period, period
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
    for sensor in names:
        if len(cut_up):
            yield from _sensor_speeds(store, sensor, bands.get(sensor, ()), cut_up, together=together)


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


def _sensor_speeds(
    store: Store, sensor: str, bands_mps: Sequence[float], cut_up: Period, *, together: bool
) -> Iterator[SpeedRow]:
    edges_us = cut_up.edges_us
    passages = log.passage_arrays(store, sensor, int(edges_us[0]), int(edges_us[-1]))
    known = listened(store, sensor, cut_up) > 0
    known |= np.diff(np.searchsorted(passages.crossed_us, edges_us)) > 0
    columns = []
    for direction in shown_directions(passages, together=together):
        chosen = passages.of(direction)
        columns.append((direction, chosen.speed_mps, np.searchsorted(chosen.crossed_us, edges_us)))
    for i in range(len(cut_up)):
        for direction, speed_mps, at in columns:
            here = speed_mps[at[i] : at[i + 1]]
            yield SpeedRow(
                sensor=sensor,
                interval_start_us=int(edges_us[i]),
                interval_end_us=int(edges_us[i + 1]),
                direction=direction,
                summary=summarise_speeds(here) if known[i] else None,
                bands=tuple(band_counts(here, bands_mps).tolist()) if known[i] else None,
            )
