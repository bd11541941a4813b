"""Where intervals lie in the site's calendar, as arrays to group by."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, tzinfo

import numpy as np

from ginnel.reports.intervals import DAY_US, offset_changes, offset_us
from ginnel.stats.counts import IntArray

_HOUR_US = DAY_US // 24
_EPOCH = date(1970, 1, 1).toordinal()


@dataclass(frozen=True, slots=True, kw_only=True)
class Calendar:
    """The local date and hour in which each interval begins; arrays of shape (m,)."""

    year: IntArray
    month: IntArray  # 1 to 12
    weekday: IntArray  # 0 (Monday) to 6
    hour: IntArray  # 0 to 23, as the clock shows it
    day: IntArray  # proleptic Gregorian ordinal: see datetime.date.fromordinal


def calendar(starts_us: IntArray, zone: tzinfo) -> Calendar:
    """Look up when some moments are in a zone."""
    local_us = starts_us + _offsets_us(starts_us, zone)
    days = local_us // DAY_US  # since 1970-01-01, a Thursday
    months = days.astype("datetime64[D]").astype("datetime64[M]").astype(np.int64)
    return Calendar(
        year=1970 + months // 12,
        month=1 + months % 12,
        weekday=(days + 3) % 7,
        hour=(local_us % DAY_US) // _HOUR_US,
        day=days + _EPOCH,
    )


def _offsets_us(starts_us: IntArray, zone: tzinfo) -> IntArray:
    """How far the zone's clock is ahead of UTC at each moment."""
    if not len(starts_us):
        return np.zeros(0, np.int64)
    first_us, last_us = int(starts_us.min()), int(starts_us.max()) + 1
    changes = offset_changes(first_us, last_us, zone)
    ahead_us = np.array([offset_us(moment, zone) for moment in (first_us, *changes)], np.int64)
    return ahead_us[np.searchsorted(np.array(changes, np.int64), starts_us, side="right")]
