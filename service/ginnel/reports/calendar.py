"""Where intervals lie in the site's calendar, as arrays to group by."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import tzinfo

import numpy as np

from ginnel.stats.counts import IntArray
from ginnel.times import from_us


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
    local = [from_us(start_us, zone) for start_us in starts_us.tolist()]
    fields = np.array(
        [(at.year, at.month, at.weekday(), at.hour, at.toordinal()) for at in local], np.int64
    ).reshape(-1, 5)
    year, month, weekday, hour, day = np.ascontiguousarray(fields.T)
    return Calendar(year=year, month=month, weekday=weekday, hour=hour, day=day)
