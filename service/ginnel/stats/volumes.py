"""Average days, factors and design hours: what a traffic engineer makes of a year of counts."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.stats.counts import IntArray
from ginnel.words import FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Aadt:
    """Annual average daily traffic by the AASHTO method."""

    value: float | None  # None: a weekday of a month was never counted
    empty_cells: int  # of the 84


def group_means(values: FloatArray, group: IntArray, n_groups: int) -> tuple[FloatArray, IntArray]:
    """Mean and number of known values in each group.

    Parameters
    ----------
    values : array, shape (n,); NaN, not counted, is left out
    group : array, shape (n,), 0 to n_groups - 1

    Returns
    -------
    means, n : arrays, shape (n_groups,); NaN and 0 where nothing is known
    """
    known = np.isfinite(values)
    n = np.bincount(group[known], minlength=n_groups).astype(np.int64)
    sums = np.bincount(group[known], weights=values[known], minlength=n_groups)
    return np.divide(sums, n, out=np.full(n_groups, np.nan), where=n > 0), n


def aadt(day_counts: FloatArray, weekday: IntArray, month: IntArray) -> Aadt:
    """Annual average daily traffic by the AASHTO method, which missing days do not bias.

    Parameters
    ----------
    day_counts : array, shape (n,), counts of whole days of one year; NaN, not counted, is left out
    weekday : array, shape (n,), 0 (Monday) to 6
    month : array, shape (n,), 1 to 12

    Notes
    -----
    The mean over the 7 weekdays of the mean over the 12 months of the mean of the days in each of
    these 84 cells. Source: FHWA Traffic Monitoring Guide (2022), appendix L. A cell without a day
    leaves the method undefined.
    """
    cells, n = group_means(day_counts, weekday * 12 + (month - 1), 84)
    empty = int(np.sum(n == 0))
    value = None if empty else float(np.mean(cells))  # all cells weigh the same
    return Aadt(value=value, empty_cells=empty)


def factors(day_counts: FloatArray, group: IntArray, n_groups: int, yearly_average: float) -> FloatArray:
    """Seasonal factors: what turns a group's average day into the year's average day.

    Parameters
    ----------
    day_counts, group, n_groups : as in `group_means`; groups are months or weekdays
    yearly_average : AADT of the same counts

    Returns
    -------
    array, shape (n_groups,); NaN where a group has no day, or nobody passed

    Notes
    -----
    Factor = AADT / average of the group. Source: FHWA Traffic Monitoring Guide (2022), chapter 3.
    """
    means, _ = group_means(day_counts, group, n_groups)
    found: FloatArray = np.full(n_groups, np.nan)
    return np.divide(yearly_average, means, out=found, where=means > 0)


def highest_hour(hour_counts: FloatArray, n: int) -> float | None:
    """Volume of the n-th highest hour; None where fewer hours were counted."""
    known = np.sort(hour_counts[np.isfinite(hour_counts)])
    return float(known[-n]) if 1 <= n <= len(known) else None


def k_factor(hour_counts: FloatArray, n: int, yearly_average: float) -> float | None:
    """Share of an average day that passes in the n-th highest hour of the year, K30 and K100 by name.

    Notes
    -----
    K = volume of the hour / AADT. Source: FHWA-PL-18-027, Traffic Data Computation Method pocket guide
    (2018). A 30th hour of 1,500 at 10,000 a day is 15 %.
    """
    volume = highest_hour(hour_counts, n)
    return None if volume is None or yearly_average <= 0 else volume / yearly_average


def directional_split(one_way: float, other_way: float) -> float | None:
    """Share of the busier direction, D, 0.5 to 1; None where nobody passed.

    Notes
    -----
    Of the two-way volume, in the hour for which one designs. Source: FHWA-PL-18-027 (2018).
    """
    both = one_way + other_way
    return max(one_way, other_way) / both if both > 0 else None
