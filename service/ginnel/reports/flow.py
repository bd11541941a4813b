"""Counts along time as arrays, and what is usual for each interval: made for charts, fast over years.

Whole hours come from the roll-ups, anything finer from the passages themselves; both say the same.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import timedelta, tzinfo

import numpy as np

from ginnel import store as log
from ginnel.reports.calendar import calendar
from ginnel.reports.intervals import Every, cut
from ginnel.reports.parts import spans_us
from ginnel.stats import poisson_limits, union_us_in
from ginnel.stats.counts import IntArray
from ginnel.stats.unusual import middle_and_spread
from ginnel.store import Store
from ginnel.times import from_us, to_us
from ginnel.words import US_PER_S, Direction, FloatArray

USUAL_WEEKS = 8
LEAST_ALIKE = 4
#: An interval that was listened to less than this says little about what is usual.
ENOUGH_COVERAGE = 0.9
_HOURS_A_WEEK = 7 * 24
_TWO_WAYS = (Direction.APPROACHING, Direction.RECEDING)


@dataclass(frozen=True, slots=True, kw_only=True)
class Flow:
    """Passages and listening of one sensor in consecutive intervals; arrays of shape (m,)."""

    edges_us: IntArray  # shape (m + 1,)
    listened_us: IntArray
    counts: dict[Direction, IntArray]  # approaching and receding always, unknown where there is any

    @property
    def both(self) -> IntArray:
        """All directions together."""
        summed: IntArray = np.sum(list(self.counts.values()), axis=0)
        return summed

    @property
    def is_known(self) -> np.ndarray[tuple[int], np.dtype[np.bool_]]:
        """Whether there is a count: somebody listened, or something was counted all the same."""
        return (self.listened_us > 0) | (self.both > 0)

    @property
    def coverage(self) -> FloatArray:
        """Share of each interval that was listened to."""
        return self.listened_us / np.diff(self.edges_us)


@dataclass(frozen=True, slots=True, kw_only=True)
class Total:
    """All of a stretch of time in numbers; counts are None where nobody listened."""

    counts: dict[Direction, int | None]
    both: int | None
    low: float | None  # exact 95 % Poisson limits of both ways together
    high: float | None
    listened_s: float
    coverage: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Usual:
    """What is usual for like intervals: their median, and two standard deviations to both sides."""

    median: FloatArray  # shape (m,), NaN where too few like intervals were heard
    low: FloatArray
    high: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class TypicalWeek:
    """Passages an hour by weekday (0 is Monday) and hour of the local clock, over a stretch of time."""

    rate: FloatArray  # shape (7, 24), passages per hour listened; NaN where nobody listened
    listened_h: FloatArray  # shape (7, 24)


def flow(store: Store, sensor: str, edges_us: IntArray) -> Flow:
    """Count passages and listening between ascending edges."""
    start_us, end_us = int(edges_us[0]), int(edges_us[-1])
    if log.are_whole_hours(edges_us):
        heard = log.hourly_listening(store, sensor, start_us, end_us)
        counted = log.hourly_counts(store, sensor, start_us, end_us)
        listened_us = _summed(heard.hour_us, heard.listened_us, edges_us)
        by_way = {way: counted.of(way) for way in Direction}
        counts = {way: _summed(one.hour_us, one.count, edges_us) for way, one in by_way.items()}
    else:
        listened_us = union_us_in(edges_us, *spans_us(store, sensor, start_us, end_us))
        passages = log.passage_arrays(store, sensor, start_us, end_us)
        counts = {way: np.diff(np.searchsorted(passages.of(way).crossed_us, edges_us)) for way in Direction}
    if not counts[Direction.UNKNOWN].any():
        del counts[Direction.UNKNOWN]
    return Flow(edges_us=edges_us, listened_us=listened_us, counts=counts)


def joined(fine: Flow, edges_us: IntArray) -> Flow:
    """Join the intervals of a flow to longer ones, whose edges are among its own."""
    at = np.searchsorted(fine.edges_us, edges_us)

    def summed(values: IntArray) -> IntArray:
        return np.diff(np.concatenate([[0], np.cumsum(values)])[at]).astype(np.int64)

    return Flow(
        edges_us=edges_us,
        listened_us=summed(fine.listened_us),
        counts={way: summed(count) for way, count in fine.counts.items()},
    )


def total(one: Flow, now_us: int | None = None) -> Total:
    """Add up the intervals of a flow; coverage is of the time until now, since what is to come is no gap."""
    known = bool(one.is_known.any())
    both = int(one.both.sum())
    low, high = poisson_limits(np.array([both]))
    start_us, end_us = int(one.edges_us[0]), int(one.edges_us[-1])
    listened_us = int(one.listened_us.sum())
    if now_us is not None:
        # what was listened to is past, whatever the clock says now
        end_us = min(end_us, max(now_us, start_us + listened_us))
    return Total(
        counts={way: int(count.sum()) if known else None for way, count in one.counts.items()},
        both=both if known else None,
        low=float(low[0]) if known else None,
        high=float(high[0]) if known else None,
        listened_s=listened_us / US_PER_S,
        coverage=listened_us / max(end_us - start_us, 1),
    )


def usual(
    store: Store, sensor: str, edges_us: IntArray, every: Every, zone: tzinfo
) -> dict[Direction | None, Usual]:
    """Tell what like intervals of the eight weeks before had: approaching, receding, and both (None).

    Hours are alike in weekday and clock hour, days in weekday; for other lengths nothing is usual.
    Only intervals that were listened to for 90 % count.

    Notes
    -----
    Median and twice the spread to both sides, on square roots: see `middle_and_spread`.
    """
    if every not in (Every.HOUR, Every.DAY) or len(edges_us) < 2:
        nothing = np.full(max(len(edges_us) - 1, 0), np.nan)
        return dict.fromkeys((*_TWO_WAYS, None), Usual(median=nothing, low=nothing, high=nothing))
    first = from_us(int(edges_us[0]), zone) - timedelta(weeks=USUAL_WEEKS)
    past = flow(store, sensor, cut(to_us(first), int(edges_us[0]), every, zone))
    group, wanted = _group(past.edges_us, every, zone), _group(edges_us, every, zone)
    enough = past.coverage >= ENOUGH_COVERAGE
    counts = {way: past.counts[way] for way in _TWO_WAYS} | {None: past.both}
    return {way: _usual(np.where(enough, count, np.nan), group, wanted) for way, count in counts.items()}


def typical_week(store: Store, sensor: str, start_us: int, end_us: int, zone: tzinfo) -> TypicalWeek:
    """Typical week of a stretch of time: see `typical_week_of`."""
    return typical_week_of(flow(store, sensor, cut(start_us, end_us, Every.HOUR, zone)), zone)


def typical_week_of(hours: Flow, zone: tzinfo) -> TypicalWeek:
    """Passages an hour by weekday and clock hour: all that were counted over all hours listened."""
    group = _group(hours.edges_us, Every.HOUR, zone)
    counted = np.bincount(group, weights=hours.both, minlength=_HOURS_A_WEEK)
    listened_h = np.bincount(group, weights=hours.listened_us, minlength=_HOURS_A_WEEK) / 3600 / US_PER_S
    rate = np.divide(counted, listened_h, out=np.full(_HOURS_A_WEEK, np.nan), where=listened_h > 0)
    return TypicalWeek(rate=rate.reshape(7, 24), listened_h=listened_h.reshape(7, 24))


def _usual(counts: FloatArray, group: IntArray, wanted: IntArray) -> Usual:
    middle, spread = np.full(_HOURS_A_WEEK, np.nan), np.full(_HOURS_A_WEEK, np.nan)
    for one in np.unique(wanted):
        alike = counts[(group == one) & np.isfinite(counts)]
        if len(alike) >= LEAST_ALIKE:
            middle[one], spread[one] = middle_and_spread(alike)
    return Usual(
        median=middle[wanted] ** 2,
        low=np.maximum(middle - 2 * spread, 0.0)[wanted] ** 2,
        high=(middle + 2 * spread)[wanted] ** 2,
    )


def _group(edges_us: IntArray, every: Every, zone: tzinfo) -> IntArray:
    """Number of the hour in the week, or of the weekday, in which each interval begins."""
    local = calendar(edges_us[:-1], zone)
    return local.weekday if every is Every.DAY else 24 * local.weekday + local.hour


def _summed(hour_us: IntArray, values: IntArray, edges_us: IntArray) -> IntArray:
    """Sum the values of the hours in each interval."""
    before = np.concatenate([[0], np.cumsum(values)])
    return np.diff(before[np.searchsorted(hour_us, edges_us)]).astype(np.int64)
