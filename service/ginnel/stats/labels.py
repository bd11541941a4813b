"""Do labels of hours mean what they say? Checks on counts that others made and labelled."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.stats.counts import IntArray
from ginnel.words import FloatArray

_HOURS_A_DAY = 24


@dataclass(frozen=True, slots=True, kw_only=True)
class Shift:
    """How well one daily profile follows another, straight and moved by the hours that fit best."""

    hours: int  # negative: what used to come at 17 now comes at 16
    correlation: float  # so moved
    unmoved: float  # as they stand


def first_hour_of_days(day: IntArray, hour: IntArray) -> int:
    """Hour with which the rows of a day mostly begin: 0, or 6 where hours 0 to 5 come last.

    Parameters
    ----------
    day, hour : arrays, shape (n,), n > 0, labels in the order of the file
    """
    begins = np.flatnonzero(np.diff(day, prepend=day[0] - 1))
    return int(np.argmax(np.bincount(hour[begins], minlength=_HOURS_A_DAY)))


def clock_hours(day: IntArray, hour: IntArray, first_hour: int) -> IntArray:
    """Hours of the clock, numbered through, where days begin at another hour than 0.

    Hours before ``first_hour`` belong to the next day of the calendar than the label says.
    """
    return day * _HOURS_A_DAY + hour + np.where(hour < first_hour, _HOURS_A_DAY, 0)


def profile_shift(before: FloatArray, after: FloatArray, reach: int = 2) -> Shift | None:
    """Find by how many hours a daily profile has moved; None where one of them is flat or not known.

    Parameters
    ----------
    before, after : arrays, shape (24,), mean count of each hour
    reach : int, most hours that are tried, both ways

    Notes
    -----
    Pearson's correlation of ``before`` with ``after`` moved round the clock.
    """
    if not (np.all(np.isfinite(before)) and np.all(np.isfinite(after)) and np.ptp(before) and np.ptp(after)):
        return None
    found = {
        hours: float(np.corrcoef(before, np.roll(after, -hours))[0, 1]) for hours in range(-reach, reach + 1)
    }
    best = max(found, key=lambda hours: found[hours])
    return Shift(hours=best, correlation=found[best], unmoved=found[0])
