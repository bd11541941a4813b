"""The average day: what each hour of the clock has on the weekdays and in the months asked for."""

from __future__ import annotations

from collections.abc import Collection
from dataclasses import dataclass
from datetime import tzinfo

import numpy as np

from ginnel.reports.calendar import calendar
from ginnel.reports.flow import Flow, flow
from ginnel.reports.intervals import Every, cut
from ginnel.reports.volumes import complete
from ginnel.stats import Mean, mean_with_limits
from ginnel.store import Store

ALL_WEEKDAYS = range(7)
ALL_MONTHS = range(1, 13)


@dataclass(frozen=True, slots=True, kw_only=True)
class AverageHour:
    """One hour of the clock over many days."""

    hour: int  # 0 to 23
    mean: Mean | None  # None: never listened to enough of it


def average_day(
    store: Store,
    sensor: str,
    start_us: int,
    end_us: int,
    zone: tzinfo,
    *,
    weekdays: Collection[int] = ALL_WEEKDAYS,
    months: Collection[int] = ALL_MONTHS,
) -> tuple[AverageHour, ...]:
    """Average day of the weekdays (0 is Monday) and months (1 is January) asked for."""
    hours = flow(store, sensor, cut(start_us, end_us, Every.HOUR, zone))
    return average_day_of(hours, zone, weekdays=weekdays, months=months)


def average_day_of(
    hours: Flow,
    zone: tzinfo,
    *,
    weekdays: Collection[int] = ALL_WEEKDAYS,
    months: Collection[int] = ALL_MONTHS,
) -> tuple[AverageHour, ...]:
    """Average day from hours, of a sensor or counted by others.

    An hour that the clock shows twice in autumn is two hours here, one that it skips is none.
    """
    local = calendar(hours.edges_us[:-1], zone)
    counts = complete(hours)
    wanted = np.isin(local.weekday, list(weekdays)) & np.isin(local.month, list(months))
    return tuple(
        AverageHour(hour=hour, mean=mean_with_limits(counts[wanted & (local.hour == hour)]))
        for hour in range(24)
    )
