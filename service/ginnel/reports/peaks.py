"""The busiest hour of each day: how much, how evenly, which way."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date, tzinfo

import numpy as np

from ginnel.reports.calendar import calendar
from ginnel.reports.flow import Flow, flow
from ginnel.reports.intervals import Every, cut
from ginnel.reports.volumes import complete
from ginnel.stats.peaks import busiest_window, peak_hour_factor
from ginnel.stats.volumes import directional_split
from ginnel.store import Store
from ginnel.words import Direction

_QUARTERS_AN_HOUR = 4


@dataclass(frozen=True, slots=True, kw_only=True)
class PeakHour:
    """The four quarter hours in a row with the most passages of a day; they need not begin on the hour."""

    day: date
    start_us: int
    end_us: int
    volume: float
    peak_hour_factor: float | None
    directional_split: float | None
    quarter_start_us: int  # the busiest quarter hour of the day
    quarter_volume: float


def daily_peaks(store: Store, sensor: str, start_us: int, end_us: int, zone: tzinfo) -> tuple[PeakHour, ...]:
    """Peak hours of the local days that share time with [start_us, end_us)."""
    days = cut(start_us, end_us, Every.DAY, zone)
    quarters = cut(int(days[0]), int(days[-1]), Every.QUARTER_HOUR, zone)
    return daily_peaks_of(flow(store, sensor, quarters), zone)


def daily_peaks_of(quarters: Flow, zone: tzinfo) -> tuple[PeakHour, ...]:
    """Peak hours from quarter hours; a day without four of them in a row that were listened to has none."""
    day = calendar(quarters.edges_us[:-1], zone).day
    counts = complete(quarters)
    none = np.zeros(len(counts))
    one_way = quarters.counts.get(Direction.APPROACHING, none)
    other_way = quarters.counts.get(Direction.RECEDING, none)
    found = []
    for one in np.unique(day):
        own = np.flatnonzero(day == one)
        peak = busiest_window(counts[own], _QUARTERS_AN_HOUR)
        busiest = busiest_window(counts[own], 1)
        if peak is None or busiest is None:
            continue
        first = int(own[0]) + peak.first
        hour = slice(first, first + _QUARTERS_AN_HOUR)
        found.append(
            PeakHour(
                day=date.fromordinal(int(one)),
                start_us=int(quarters.edges_us[first]),
                end_us=int(quarters.edges_us[first + _QUARTERS_AN_HOUR]),
                volume=peak.volume,
                peak_hour_factor=peak_hour_factor(counts[hour]),
                directional_split=directional_split(float(one_way[hour].sum()), float(other_way[hour].sum())),
                quarter_start_us=int(quarters.edges_us[int(own[0]) + busiest.first]),
                quarter_volume=busiest.volume,
            )
        )
    return tuple(found)


def busiest(peaks: Sequence[PeakHour]) -> PeakHour | None:
    """Pick the peak hour with the highest volume, the earliest of equals."""
    return max(peaks, key=lambda peak: peak.volume, default=None)
