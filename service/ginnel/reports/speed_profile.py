"""Speeds of a stretch of time: distribution, percentiles, pace and share over a limit, fast over years.

Whole hours come from the histograms of the roll-ups, in classes of 1 cm/s; anything else from the passages.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import tzinfo
from itertools import pairwise

import numpy as np

from ginnel import store as log
from ginnel.reports.calendar import calendar
from ginnel.reports.intervals import Every, cut
from ginnel.stats import SpeedSummary
from ginnel.stats.counts import IntArray
from ginnel.stats.histograms import grouped_pace
from ginnel.stats.pace import Pace
from ginnel.store import HourlySpeeds, Rollup, Store, merge
from ginnel.store.rollup import BIN_MPS, roll_up
from ginnel.words import Direction, FloatArray

_UMPS = 1e6


@dataclass(frozen=True, slots=True, kw_only=True)
class SpeedProfile:
    """Speeds of one direction, or of all (None)."""

    direction: Direction | None
    summary: SpeedSummary
    pace: Pace | None
    over_limit: float | None  # share of speeds above the limit; None without limit or speeds
    edges_mps: FloatArray  # shape (n + 1,), of the histogram; empty without speeds
    counts: IntArray  # shape (n,)


def read_speeds(store: Store, sensor: str, start_us: int, end_us: int, zone: tzinfo) -> HourlySpeeds:
    """Roll-ups by hour of the local clock and direction, read once for all that is asked of them."""
    edges_us = cut(start_us, end_us, Every.HOUR, zone)
    if log.are_whole_hours(edges_us):
        return log.hourly_speeds(store, sensor, start_us, end_us)
    passages = log.passage_arrays(store, sensor, start_us, end_us)
    umps = np.round(np.nan_to_num(passages.speed_mps, nan=-1.0) * _UMPS).astype(np.int64)
    hour = np.searchsorted(edges_us, passages.crossed_us, side="right") - 1
    keys, which = np.unique(np.stack([hour, passages.direction], axis=1), axis=0, return_inverse=True)
    return HourlySpeeds(
        hour_us=edges_us[keys[:, 0]],
        direction=keys[:, 1].astype(np.int8),
        rollups=tuple(roll_up(umps[which == number]) for number in range(len(keys))),
    )


def profiles_of(
    hours: HourlySpeeds, *, bin_mps: float, pace_width_mps: float, limit_mps: float | None = None
) -> tuple[SpeedProfile, ...]:
    """Profiles of approaching, receding, unknown where there is any, and of all together, in this order.

    ``bin_mps`` is the width of the histogram's classes, ``pace_width_mps`` that of the pace.
    """
    ways = (Direction.APPROACHING, Direction.RECEDING, Direction.UNKNOWN)
    found = {way: merge(hours.of(way).rollups) for way in ways}
    together = merge(list(found.values()))
    if not found[Direction.UNKNOWN].measured:
        del found[Direction.UNKNOWN]
    return tuple(
        _profile(way, rollup, bin_mps, pace_width_mps, limit_mps)
        for way, rollup in [*found.items(), (None, together)]
    )


def speed_profiles(
    store: Store,
    sensor: str,
    start_us: int,
    end_us: int,
    *,
    bin_mps: float,
    pace_width_mps: float,
    limit_mps: float | None = None,
) -> tuple[SpeedProfile, ...]:
    """Profiles of a stretch of time: see `profiles_of`."""
    rolled = speed_rollups(store, sensor, np.array([start_us, end_us], np.int64))
    return tuple(
        _profile(way, rollups[0], bin_mps, pace_width_mps, limit_mps)
        for way, rollups in rolled.items()
        if way is not Direction.UNKNOWN or rollups[0].measured
    )


def speed_rollups(
    store: Store, sensor: str, edges_us: IntArray
) -> dict[Direction | None, tuple[Rollup, ...]]:
    """Roll-ups of each interval between the edges, by direction and all together."""
    start_us, end_us = int(edges_us[0]), int(edges_us[-1])
    ways: tuple[Direction | None, ...] = (Direction.APPROACHING, Direction.RECEDING, Direction.UNKNOWN, None)
    pairs = list(pairwise(edges_us.tolist()))
    rolled: dict[Direction | None, tuple[Rollup, ...]] = {}
    if log.are_whole_hours(edges_us):
        hourly = log.hourly_speeds(store, sensor, start_us, end_us)
        for way in ways:
            hours = hourly.of(way)
            rolled[way] = tuple(hours.between(*pair) for pair in pairs)
        return rolled
    passages = log.passage_arrays(store, sensor, start_us, end_us)
    for way in ways:
        own = passages.of(way)
        umps = np.round(np.nan_to_num(own.speed_mps, nan=-1.0) * _UMPS).astype(np.int64)
        first = np.searchsorted(own.crossed_us, edges_us)
        rolled[way] = tuple(roll_up(umps[a:b]) for a, b in pairwise(first))
    return rolled


def speeds_along(hours: HourlySpeeds, edges_us: IntArray) -> tuple[SpeedSummary, ...]:
    """Summaries of all speeds between edges that lie on hours."""
    pairs = pairwise(edges_us.tolist())
    return tuple(summary_of(hours.between(start_us, end_us)) for start_us, end_us in pairs)


def clock_hours(hours: HourlySpeeds, zone: tzinfo) -> tuple[SpeedSummary, ...]:
    """Summaries of all speeds by hour of the local clock, 24 of them."""
    clock = calendar(hours.hour_us, zone).hour
    return tuple(
        summary_of(merge([hours.rollups[i] for i in np.flatnonzero(clock == hour)])) for hour in range(24)
    )


def summary_of(rollup: Rollup) -> SpeedSummary:
    """Summarise rolled-up speeds; percentiles are within half a centimetre a second."""
    middle_mps, n = rollup.speed_cells()
    if not rollup.measured:
        return SpeedSummary(n=0)
    p15, p50, p85, p95 = _quantiles(middle_mps, n, [0.15, 0.5, 0.85, 0.95])
    return SpeedSummary(
        n=rollup.measured,
        mean_mps=rollup.mean_mps,
        space_mean_mps=rollup.space_mean_mps,
        sd_mps=rollup.sd_mps,
        p15_mps=p15,
        p50_mps=p50,
        p85_mps=p85,
        p95_mps=p95,
    )


def _profile(
    way: Direction | None, rollup: Rollup, bin_mps: float, pace_width_mps: float, limit_mps: float | None
) -> SpeedProfile:
    middle_mps, n = rollup.speed_cells()
    fine, fine_counts = _dense(middle_mps, n)
    over = None
    if limit_mps is not None and rollup.measured:
        over = float(n[middle_mps > limit_mps].sum() / rollup.measured)
    edges_mps, counts = _binned(middle_mps, n, bin_mps)
    return SpeedProfile(
        direction=way,
        summary=summary_of(rollup),
        pace=grouped_pace(fine_counts, fine, pace_width_mps) if rollup.measured else None,
        over_limit=over,
        edges_mps=edges_mps,
        counts=counts,
    )


def _quantiles(middle_mps: FloatArray, n: IntArray, probabilities: list[float]) -> list[float]:
    """Quantiles as in `stats.quantiles`, of speeds that are at the middles of their classes."""
    last = np.cumsum(n)
    position = np.array(probabilities) * (last[-1] - 1)
    below = np.searchsorted(last, np.floor(position), side="right")
    above = np.searchsorted(last, np.ceil(position), side="right")
    part = position - np.floor(position)
    found = middle_mps[below] + part * (middle_mps[above] - middle_mps[below])
    return [float(value) for value in found]


def _dense(middle_mps: FloatArray, n: IntArray) -> tuple[FloatArray, IntArray]:
    """Every class from the slowest to the fastest, the empty ones too."""
    if not len(n):
        return np.empty(0), np.empty(0, np.int64)
    at = np.floor(middle_mps / BIN_MPS).astype(np.int64)
    counts = np.bincount(at - at[0], weights=n).astype(np.int64)
    return np.arange(at[0], at[0] + len(counts) + 1) * BIN_MPS, counts


def _binned(middle_mps: FloatArray, n: IntArray, bin_mps: float) -> tuple[FloatArray, IntArray]:
    """Histogram in wider classes, which begin at multiples of their width."""
    if not len(n):
        return np.empty(0), np.empty(0, np.int64)
    at = np.floor(middle_mps / bin_mps).astype(np.int64)
    counts = np.bincount(at - at[0], weights=n).astype(np.int64)
    return np.arange(at[0], at[0] + len(counts) + 1) * bin_mps, counts
