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
from ginnel.reports.speed_profile import speed_rollups, summary_of
from ginnel.stats import Pace, SpeedSummary, band_counts, pace, share_over, summarise_speeds
from ginnel.stats.counts import IntArray
from ginnel.store import Rollup, Store
from ginnel.words import Direction


@dataclass(frozen=True, slots=True, kw_only=True)
class SpeedRow:
    """Speeds of one sensor and direction in one interval."""

    sensor: str
    interval_start_us: int
    interval_end_us: int
    direction: Direction | None  # None: all directions together
    summary: SpeedSummary | None  # None: never listened
    bands: tuple[int, ...] | None  # passages in each band of the sensor, slowest first
    is_grouped: bool = False  # percentiles and bands come from classes of 1 cm/s: passages are gone
    pace: Pace | None = None  # where a width was asked for
    over_limit: float | None = None  # share of measured speeds above the limit asked for


def speeds(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
    *,
    together: bool = False,
    pace_width_mps: float | None = None,
    limit_mps: float | None = None,
) -> tuple[SpeedRow, ...]:
    """Summarise speeds by interval and direction: see `iter_speeds`."""
    rows = iter_speeds(
        store,
        sensors,
        start_us,
        end_us,
        every,
        tz,
        together=together,
        pace_width_mps=pace_width_mps,
        limit_mps=limit_mps,
    )
    return tuple(rows)


def iter_speeds(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
    *,
    together: bool = False,
    pace_width_mps: float | None = None,
    limit_mps: float | None = None,
) -> Iterator[SpeedRow]:
    """Summarise speeds by sensor, interval and direction, in this order; rows as in `iter_counts`.

    ``n`` is the number of passages with a measured speed, which may be fewer than passed. Percentiles are
    those of the passages, and where these are gone by retention those of the roll-ups, within 1 cm/s.
    """
    names = chosen_sensors(store, sensors)
    cut_up = period(store, every, start_us, end_us, tz, names)
    bands = {sensor.name: sensor.speed_bands_mps for sensor in log.sensors(store)}
    for sensor, cells in groupby(
        iter_cells(store, names, cut_up, together=together), lambda cell: cell.sensor
    ):
        passages = log.passage_arrays(store, sensor, int(cut_up.edges_us[0]), int(cut_up.edges_us[-1]))
        ways = {direction: passages.of(direction) for direction in (None, *Direction)}
        rolled = None
        for cell in cells:
            own = ways[cell.part.direction]
            first, last = np.searchsorted(own.crossed_us, [cell.start_us, cell.end_us])
            speed_mps = own.speed_mps[first:last]
            summary = summarise_speeds(speed_mps)
            is_grouped = cell.count is not None and cell.count > len(speed_mps)
            if is_grouped:  # some passages are gone by retention: what they amounted to is kept
                rolled = rolled or _by_start(store, sensor, cut_up.edges_us)
                rollup = rolled[cell.part.direction, cell.start_us]
                summary, speed_mps = summary_of(rollup), rollup.speed_mps()
            yield SpeedRow(
                sensor=sensor,
                interval_start_us=cell.start_us,
                interval_end_us=cell.end_us,
                direction=cell.part.direction,
                summary=None if cell.count is None else summary,
                bands=None if cell.count is None else tuple(band_counts(speed_mps, bands[sensor]).tolist()),
                is_grouped=is_grouped,
                pace=None if pace_width_mps is None else pace(speed_mps, pace_width_mps),
                over_limit=None if limit_mps is None else share_over(speed_mps, limit_mps),
            )


def _by_start(store: Store, sensor: str, edges_us: IntArray) -> dict[tuple[Direction | None, int], Rollup]:
    """Roll-ups of a sensor by direction and start of the interval."""
    return {
        (direction, start_us): rollup
        for direction, rollups in speed_rollups(store, sensor, edges_us).items()
        for start_us, rollup in zip(edges_us[:-1].tolist(), rollups, strict=True)
    }
