"""Before and after: two stretches of days compared, weekdays with their like."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, tzinfo

import numpy as np
from numpy.typing import NDArray

from ginnel import store as log
from ginnel.errors import ConfigError
from ginnel.reports.calendar import Calendar, calendar
from ginnel.reports.flow import Flow, flow
from ginnel.reports.intervals import Every, cut
from ginnel.reports.volumes import LEAST_COVERAGE
from ginnel.stats.comparison import MeanChange, RateRatio, mean_change, rate_ratio
from ginnel.stats.counts import IntArray
from ginnel.store import Store
from ginnel.words import FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Comparison:
    """What changed from one stretch of days to another, both as they were counted."""

    rate: RateRatio | None  # None: too few days to tell
    speed: MeanChange | None
    holidays: tuple[date, ...]  # left out
    cautions: tuple[str, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class _Days:
    """Days of one stretch, holidays left out; arrays of shape (n,)."""

    count: FloatArray
    exposure: FloatArray  # share of the day that was listened to; 0 where too little
    weekday: IntArray
    bounds_us: IntArray  # shape (n, 2)
    holidays: tuple[date, ...]


def compare(
    store: Store,
    sensor: str,
    before_us: tuple[int, int],
    after_us: tuple[int, int],
    zone: tzinfo,
    *,
    holidays_of: str | None = None,
) -> Comparison:
    """Compare the local days that share time with two stretches [start_us, end_us).

    A weekday counts only if both stretches have it. ``holidays_of`` names a country, or a country and a
    part of it (``IE``, ``DE-BY``: ISO 3166), whose public holidays are left out.
    """
    before, after = (
        _days(flow(store, sensor, cut(*stretch_us, Every.DAY, zone)), zone, holidays_of)
        for stretch_us in (before_us, after_us)
    )
    speed = mean_change(*_speeds(store, sensor, before), *_speeds(store, sensor, after))
    return _comparison(before, after, speed)


def compare_of(before: Flow, after: Flow, zone: tzinfo, *, holidays_of: str | None = None) -> Comparison:
    """Compare days of a sensor or counted by others; speeds are not known then."""
    return _comparison(_days(before, zone, holidays_of), _days(after, zone, holidays_of), None)


def _days(days: Flow, zone: tzinfo, holidays_of: str | None) -> _Days:
    local = calendar(days.edges_us[:-1], zone)
    is_holiday = _holidays(local, holidays_of)
    kept = ~is_holiday
    coverage = days.coverage[kept]
    return _Days(
        count=days.both[kept].astype(float),
        exposure=np.where(coverage >= LEAST_COVERAGE, coverage, 0.0),
        weekday=local.weekday[kept],
        bounds_us=np.stack([days.edges_us[:-1], days.edges_us[1:]], axis=1)[kept],
        holidays=tuple(date.fromordinal(int(day)) for day in local.day[is_holiday]),
    )


def _comparison(before: _Days, after: _Days, speed: MeanChange | None) -> Comparison:
    return Comparison(
        rate=rate_ratio(
            np.concatenate([before.count, after.count]),
            np.concatenate([before.exposure, after.exposure]),
            np.arange(len(before.count) + len(after.count)) >= len(before.count),
            np.concatenate([before.weekday, after.weekday]),
        ),
        speed=speed,
        holidays=tuple(sorted({*before.holidays, *after.holidays})),
        cautions=tuple(_cautions(before, after)),
    )


def _holidays(local: Calendar, holidays_of: str | None) -> NDArray[np.bool_]:
    if holidays_of is None:
        return np.zeros(len(local.day), np.bool_)
    import holidays

    country, _, part = holidays_of.partition("-")
    years = np.unique(local.year).tolist()
    try:
        known = holidays.country_holidays(country, subdiv=part or None, years=years)
    except NotImplementedError as error:
        raise ConfigError(f"no holidays known of {holidays_of!r}: name a country as IE or DE-BY") from error
    return np.isin(local.day, [day.toordinal() for day in known])


def _speeds(store: Store, sensor: str, days: _Days) -> tuple[FloatArray, IntArray]:
    """Sum and number of measured speeds of each day."""
    sums, n = np.zeros(len(days.count)), np.zeros(len(days.count), np.int64)
    for i, (start_us, end_us) in enumerate(days.bounds_us.tolist()):
        speed_mps = log.passage_arrays(store, sensor, start_us, end_us).speed_mps
        measured = speed_mps[np.isfinite(speed_mps)]
        sums[i], n[i] = measured.sum(), len(measured)
    return sums, n


def _cautions(before: _Days, after: _Days) -> list[str]:
    found = []
    lost = int(np.sum(before.exposure == 0)), int(np.sum(after.exposure == 0))
    if any(lost):
        found.append(
            f"days left out because less than {LEAST_COVERAGE:.0%} of them was listened to: "
            f"{lost[0]} before, {lost[1]} after"
        )
    weekdays = [set(one.weekday[one.exposure > 0].tolist()) for one in (before, after)]
    if weekdays[0] ^ weekdays[1]:
        found.append("weekdays that only one of the stretches has are left out of the ratio of the counts")
    return found
