"""Traffic volumes of a year or any other stretch: average days, factors, design hours, directional split."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from datetime import date, tzinfo

import numpy as np
from numpy.typing import NDArray

from ginnel.reports.calendar import Calendar, calendar
from ginnel.reports.flow import Flow, flow
from ginnel.reports.intervals import Every, cut
from ginnel.stats import Mean, expand, mean_with_limits
from ginnel.stats.counts import IntArray
from ginnel.stats.volumes import Aadt, aadt, directional_split, factors, highest_hour, k_factor
from ginnel.store import Store
from ginnel.words import Direction, FloatArray

#: A day or hour that was listened to less than this is left out; above, its count is expanded.
LEAST_COVERAGE = 0.9


@dataclass(frozen=True, slots=True, kw_only=True)
class DayCount:
    """One day of the site's calendar and how many passed."""

    day: date
    count: float


@dataclass(frozen=True, slots=True, kw_only=True)
class DesignHour:
    """The n-th highest hour of the stretch."""

    n: int
    volume: float
    k: float | None  # share of an average day
    d: float | None  # directional split in the hours of at least this volume


@dataclass(frozen=True, slots=True, kw_only=True)
class Volumes:
    """What a traffic engineer wants to know of a stretch of whole days.

    Average daily traffic is the counts of whole days over their number; over a year that is the simple AADT.
    Source: FHWA Traffic Monitoring Guide (2022), appendix L.
    """

    days: int  # used
    days_left_out: int  # not listened to, or too little
    average: Mean | None  # ADT: simple mean over days, with limits and over-dispersion
    aadt: Aadt  # AASHTO, from 84 cells, which missing days do not bias
    base: float | None  # what factors and K refer to: the AASHTO mean if days are missing, else the simple
    directional_split: float | None  # of the whole stretch
    design_hours: tuple[DesignHour, ...]  # highest, 30th, 100th, as far as there are as many
    busiest: DayCount | None
    quietest: DayCount | None
    weekdays: tuple[Mean | None, ...]  # average Monday to Sunday
    weekday_factors: tuple[float | None, ...]
    months: tuple[Mean | None, ...]  # average day of January to December
    month_factors: tuple[float | None, ...]


def volumes(store: Store, sensor: str, start_us: int, end_us: int, zone: tzinfo) -> Volumes:
    """Volumes of the local days that share time with [start_us, end_us)."""
    whole_days = cut(start_us, end_us, Every.DAY, zone)
    return volumes_of(
        flow(store, sensor, cut(int(whole_days[0]), int(whole_days[-1]), Every.HOUR, zone)), zone
    )


def volumes_of(hours: Flow, zone: tzinfo) -> Volumes:
    """Volumes from the hours of whole local days, of a sensor or counted by others."""
    days = by_day(hours, zone)
    calendar_days = calendar(days.edges_us[:-1], zone)
    day_counts, hour_counts = complete(days), complete(hours)
    average = mean_with_limits(day_counts)
    yearly = aadt(day_counts, calendar_days.weekday, calendar_days.month)
    n_days = 0 if average is None else average.n
    base = None if average is None else average.mean
    if n_days < len(day_counts) and yearly.value is not None:
        base = yearly.value
    weekday, month = calendar_days.weekday, calendar_days.month - 1
    return Volumes(
        days=n_days,
        days_left_out=len(day_counts) - n_days,
        average=average,
        aadt=yearly,
        base=base,
        directional_split=_split(hours, np.isfinite(hour_counts)),
        design_hours=tuple(_design_hours(hours, hour_counts, base)),
        busiest=_extreme(day_counts, calendar_days, np.nanargmax),
        quietest=_extreme(day_counts, calendar_days, np.nanargmin),
        weekdays=tuple(mean_with_limits(day_counts[weekday == one]) for one in range(7)),
        weekday_factors=_factors(day_counts, weekday, 7, base),
        months=tuple(mean_with_limits(day_counts[month == one]) for one in range(12)),
        month_factors=_factors(day_counts, month, 12, base),
    )


def by_day(hours: Flow, zone: tzinfo) -> Flow:
    """Join the hours of each local day, 23 or 25 where the clock changes."""
    day = calendar(hours.edges_us[:-1], zone).day
    first = np.flatnonzero(np.diff(day, prepend=-1))
    if not len(first):
        return hours
    return Flow(
        edges_us=np.append(hours.edges_us[first], hours.edges_us[-1:]),
        listened_us=np.add.reduceat(hours.listened_us, first),
        counts={way: np.add.reduceat(count, first) for way, count in hours.counts.items()},
    )


def complete(one: Flow, least: float = LEAST_COVERAGE) -> FloatArray:
    """Counts of both ways, expanded to whole intervals; NaN where less than ``least`` was listened to."""
    return np.where(one.coverage >= least, expand(one.both.astype(float), one.coverage), np.nan)


def _design_hours(hours: Flow, hour_counts: FloatArray, base: float | None) -> Iterator[DesignHour]:
    for n in (1, 30, 100):
        volume = highest_hour(hour_counts, n)
        if volume is None:
            return
        k = None if base is None else k_factor(hour_counts, n, base)
        yield DesignHour(n=n, volume=volume, k=k, d=_split(hours, hour_counts >= volume))


def _split(hours: Flow, chosen: NDArray[np.bool_]) -> float | None:
    ways = (hours.counts.get(way) for way in (Direction.APPROACHING, Direction.RECEDING))
    one, other = (0.0 if way is None else float(way[chosen].sum()) for way in ways)
    return directional_split(one, other)


def _extreme(
    day_counts: FloatArray, days: Calendar, find: Callable[[FloatArray], np.intp]
) -> DayCount | None:
    if not np.any(np.isfinite(day_counts)):
        return None
    i = int(find(day_counts))
    return DayCount(day=date.fromordinal(int(days.day[i])), count=float(day_counts[i]))


def _factors(
    day_counts: FloatArray, group: IntArray, n_groups: int, base: float | None
) -> tuple[float | None, ...]:
    if base is None:
        return (None,) * n_groups
    found = factors(day_counts, group, n_groups, base)
    return tuple(float(factor) if np.isfinite(factor) else None for factor in found)
