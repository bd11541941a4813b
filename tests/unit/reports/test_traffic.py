"""Volumes, peaks, the average day, headways and levels of service of a log whose answers are known."""

from __future__ import annotations

from datetime import date

import pytest
from tests.unit.reports.invented import (
    DUBLIN,
    HOUR,
    MINUTE,
    NORTH,
    A,
    R,
    S,
    at,
    heard,
    passed,
    spread,
)

from ginnel.reports import average_day, busiest, daily_peaks, headways, volumes, walkway
from ginnel.stats.walkway import FOOT_M, Level
from ginnel.store import Store

MONDAY = at(2026, 3, 2, 0)
DAY = 24 * HOUR


@pytest.fixture
def week(store: Store) -> Store:
    """Monday to Friday 120 each between 8 and 10, on Saturday 20, Sunday heard for an hour only."""
    for i in range(5):
        start = MONDAY + i * DAY
        rush = [
            *spread(start + 8 * HOUR, start + 9 * HOUR, 80, (A, A, A, R)),
            *spread(start + 9 * HOUR, start + 10 * HOUR, 40, (A, R)),
        ]
        heard(store, NORTH, start, start + DAY, rush)
    saturday = MONDAY + 5 * DAY
    heard(store, NORTH, saturday, saturday + DAY, spread(saturday + 12 * HOUR, saturday + 13 * HOUR, 20))
    heard(store, NORTH, saturday + DAY, saturday + DAY + HOUR, [passed(saturday + DAY + MINUTE)])
    return store


def test_volumes_of_a_week(week: Store) -> None:
    found = volumes(week, "north", MONDAY, MONDAY + 7 * DAY, DUBLIN)
    assert (found.days, found.days_left_out) == (6, 1)
    assert found.average is not None
    assert found.average.mean == pytest.approx((5 * 120 + 20) / 6)
    assert found.aadt.value is None
    assert found.base == found.average.mean  # less than a year: the simple mean stands in
    assert found.busiest is not None
    assert found.quietest is not None
    assert (found.busiest.day, found.busiest.count) == (date(2026, 3, 2), 120)
    assert (found.quietest.day, found.quietest.count) == (date(2026, 3, 7), 20)
    assert [mean and mean.mean for mean in found.weekdays] == [120] * 5 + [20, None]
    assert found.weekday_factors[0] == pytest.approx(found.base / 120)
    assert found.weekday_factors[6] is None
    highest, thirtieth, hundredth = found.design_hours
    assert (highest.volume, thirtieth.volume, hundredth.volume) == (80, 0, 0)
    assert highest.d == pytest.approx(0.75)  # of the five hours with 80
    # 300 + 100 + 20 approaching, 100 + 100 receding, and one heard on Sunday
    assert found.directional_split == pytest.approx(421 / 621)


def test_a_day_heard_in_part_is_expanded_or_left_out(store: Store) -> None:
    heard(store, NORTH, MONDAY, MONDAY + 23 * HOUR, spread(MONDAY, MONDAY + 23 * HOUR, 230))
    heard(store, NORTH, MONDAY + DAY, MONDAY + DAY + 12 * HOUR, spread(MONDAY + DAY, MONDAY + DAY + HOUR, 99))
    found = volumes(store, "north", MONDAY, MONDAY + 2 * DAY, DUBLIN)
    assert (found.days, found.days_left_out) == (1, 1)
    assert found.average is not None
    assert found.average.mean == pytest.approx(240)
    assert found.average.low is None  # one day does not tell how much days vary


def test_days_of_a_changed_clock_are_whole_days(store: Store) -> None:
    """29 March 2026 has 23 hours in Dublin: heard throughout, nothing is expanded."""
    day = at(2026, 3, 29, 0)
    heard(store, NORTH, day, day + 23 * HOUR, spread(day, day + 23 * HOUR, 46))
    found = volumes(store, "north", day, day + HOUR, DUBLIN)
    assert found.average is not None
    assert (found.days, found.average.mean) == (1, 46)


def test_peak_hours_of_each_day(week: Store) -> None:
    found = daily_peaks(week, "north", MONDAY, MONDAY + 7 * DAY, DUBLIN)
    assert [(peak.day.day, peak.volume) for peak in found] == [
        (2, 80),
        (3, 80),
        (4, 80),
        (5, 80),
        (6, 80),
        (7, 20),
        (8, 1),
    ]
    monday = found[0]
    assert (monday.start_us, monday.end_us) == (MONDAY + 8 * HOUR, MONDAY + 9 * HOUR)
    assert monday.peak_hour_factor == 1  # 20 in each quarter
    assert monday.directional_split == pytest.approx(0.75)
    assert monday.quarter_volume == 20
    best = busiest(found)
    assert best is not None
    assert best.day == date(2026, 3, 2)
    assert busiest([]) is None


def test_the_peak_hour_need_not_begin_on_the_hour(store: Store) -> None:
    # quarters of 900, 1000, 1200, 850 (published example of a peak hour factor: 0.8229), here 18, 20, 24, 17
    quarters = zip((30, 45, 60, 75), (18, 20, 24, 17), strict=True)
    rush = [
        one
        for minute, n in quarters
        for one in spread(MONDAY + 7 * HOUR + minute * MINUTE, MONDAY + 7 * HOUR + (minute + 15) * MINUTE, n)
    ]
    heard(store, NORTH, MONDAY, MONDAY + DAY, rush)
    (peak,) = daily_peaks(store, "north", MONDAY, MONDAY + DAY, DUBLIN)
    assert (peak.start_us - MONDAY) / MINUTE == 7 * 60 + 30
    assert peak.peak_hour_factor == pytest.approx(0.8229, abs=5e-5)
    assert (peak.quarter_start_us - MONDAY) / MINUTE == 8 * 60
    assert peak.quarter_volume == 24


def test_average_day_of_some_weekdays(week: Store) -> None:
    hours = average_day(week, "north", MONDAY, MONDAY + 7 * DAY, DUBLIN, weekdays=range(5))
    means = {hour.hour: hour.mean for hour in hours}
    assert len(hours) == 24
    assert means[8] is not None
    assert (means[8].n, means[8].mean) == (5, 80)
    saturday = average_day(week, "north", MONDAY, MONDAY + 7 * DAY, DUBLIN, weekdays=[5])
    assert saturday[12].mean is not None
    assert saturday[12].mean.mean == 20
    sunday = average_day(week, "north", MONDAY, MONDAY + 7 * DAY, DUBLIN, weekdays=[6])
    assert sunday[8].mean is None
    assert average_day(week, "north", MONDAY, MONDAY + DAY, DUBLIN, months=[4])[8].mean is None


def test_headways_leave_out_gaps_in_listening(store: Store) -> None:
    nine = MONDAY + 9 * HOUR
    heard(store, NORTH, nine, nine + HOUR, [passed(nine + seconds * S) for seconds in (10, 14, 24, 3598)])
    heard(
        store, NORTH, nine + 2 * HOUR, nine + 3 * HOUR, [passed(nine + 2 * HOUR + s * S, R) for s in (2, 4)]
    )
    found = headways(store, "north", nine, nine + 3 * HOUR)
    assert found.summary.n == 4  # 4, 10, 3574 and 2 s
    assert found.summary.mean_s == pytest.approx((4 + 10 + 3574 + 2) / 4)
    in_class = {one.low_s: one.n for one in found.classes if one.n}
    assert in_class == {2: 1, 3: 1, 10: 1, 300: 1}
    assert sum(one.random_share for one in found.classes) == pytest.approx(1)
    assert headways(store, "north", nine, nine + 3 * HOUR, R).summary.n == 1
    assert headways(store, "north", nine - HOUR, nine).classes == ()


def test_level_of_service_of_the_manuals_example(store: Store) -> None:
    """HCM 7th edition, chapter 35, problem 1: 100 in a quarter hour, 5 ft, 240 ft/min: 180 ft2, level A."""
    nine = MONDAY + 9 * HOUR
    walkers = [passed(nine + i * 9 * S + S, A, 240 * FOOT_M / 60, stay_s=1) for i in range(100)]
    heard(store, NORTH, nine, nine + 30 * MINUTE, walkers)
    busy, empty, unheard, *_ = walkway(store, "north", nine, nine + HOUR, DUBLIN, width_m=5 * FOOT_M)
    assert busy.flow_per_min_m == pytest.approx(1.3333 / FOOT_M, rel=1e-4)
    assert busy.space_m2 == pytest.approx(180 * FOOT_M**2, rel=1e-4)
    assert (busy.level, busy.platoon_level) == (Level.A, Level.B)
    assert (empty.count, empty.level) == (0, Level.A)
    assert (unheard.count, unheard.level) == (None, None)
