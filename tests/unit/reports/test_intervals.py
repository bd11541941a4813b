"""Cutting time in a zone: lengths on the days that clocks change, alignment, odd zones; then laws."""

from __future__ import annotations

from datetime import datetime, timedelta
from itertools import pairwise
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ginnel.reports import Every, cut
from ginnel.times import from_us, to_us

S = 1_000_000
HOUR = 3600 * S


def us(zone: str, *local: int, fold: int = 0) -> int:
    return to_us(datetime(*local, tzinfo=ZoneInfo(zone), fold=fold))  # type: ignore[arg-type,misc] # year to minute


def lengths_h(start_us: int, end_us: int, every: Every, zone: str) -> list[float]:
    return [
        (high - low) / HOUR for low, high in pairwise(cut(start_us, end_us, every, ZoneInfo(zone)).tolist())
    ]


def labels(start_us: int, end_us: int, every: Every, zone: str) -> list[str]:
    edges = cut(start_us, end_us, every, ZoneInfo(zone)).tolist()
    return [from_us(edge, ZoneInfo(zone)).isoformat() for edge in edges]


# Published rules of the zones (IANA tz database): Dublin 29 March and 25 October 2026, Auckland 5 April
# and 27 September 2026, Santiago changes at midnight.
@pytest.mark.parametrize(
    ("zone", "day", "hours"),
    [
        ("Europe/Dublin", (2026, 3, 28), 24),
        ("Europe/Dublin", (2026, 3, 29), 23),
        ("Europe/Dublin", (2026, 10, 25), 25),
        ("Pacific/Auckland", (2026, 9, 27), 23),
        ("Pacific/Auckland", (2026, 4, 5), 25),
        ("America/New_York", (2026, 3, 8), 23),
        ("Australia/Lord_Howe", (2026, 10, 4), 23.5),
        ("Australia/Lord_Howe", (2026, 4, 5), 24.5),
        ("America/Santiago", (2026, 9, 6), 23),  # has no midnight
        ("America/Santiago", (2026, 4, 4), 25),  # shows 23 o'clock twice
        ("Asia/Kolkata", (2026, 3, 29), 24),
    ],
)
def test_days_are_as_long_as_the_zone_says(zone: str, day: tuple[int, int, int], hours: float) -> None:
    noon = us(zone, *day, 12)
    assert lengths_h(noon, noon + 1, Every.DAY, zone) == [hours]
    n_quarters = len(cut(us(zone, *day, 1), noon, Every.QUARTER_HOUR, ZoneInfo(zone)))
    assert n_quarters > 0
    start_us, end_us = cut(noon, noon + 1, Every.DAY, ZoneInfo(zone)).tolist()
    assert len(cut(start_us, end_us, Every.FIVE_MINUTES, ZoneInfo(zone))) - 1 == hours * 12
    assert from_us(start_us, ZoneInfo(zone)).date() == datetime(*day).date()  # noqa: DTZ001 (a date)
    assert from_us(start_us - 1, ZoneInfo(zone)).date() < datetime(*day).date()  # noqa: DTZ001


def test_the_hour_shown_twice_is_two_intervals() -> None:
    zone = "Europe/Dublin"
    start_us = us(zone, 2026, 10, 25, 0)
    assert labels(start_us, start_us + 4 * HOUR, Every.HOUR, zone) == [
        "2026-10-25T00:00:00+01:00",
        "2026-10-25T01:00:00+01:00",
        "2026-10-25T01:00:00+00:00",
        "2026-10-25T02:00:00+00:00",
        "2026-10-25T03:00:00+00:00",
    ]


def test_the_hour_skipped_is_no_interval() -> None:
    zone = "Europe/Dublin"
    start_us = us(zone, 2026, 3, 29, 0)
    assert labels(start_us, start_us + 2 * HOUR, Every.HOUR, zone) == [
        "2026-03-29T00:00:00+00:00",
        "2026-03-29T02:00:00+01:00",
        "2026-03-29T03:00:00+01:00",
    ]


def test_a_change_by_half_an_hour_leaves_hours_aligned_to_the_clock() -> None:
    zone = "Australia/Lord_Howe"  # 2026-10-04: 02:00 becomes 02:30
    start_us = us(zone, 2026, 10, 4, 0)
    assert labels(start_us, start_us + 3 * HOUR, Every.HOUR, zone) == [
        "2026-10-04T00:00:00+10:30",
        "2026-10-04T01:00:00+10:30",
        "2026-10-04T02:30:00+11:00",
        "2026-10-04T03:00:00+11:00",
        "2026-10-04T04:00:00+11:00",
    ]


def test_hours_of_a_zone_off_by_a_half_hour_begin_on_its_hours() -> None:
    start_us = us("Asia/Kolkata", 2026, 3, 2, 9, 40)
    assert labels(start_us, start_us + 1, Every.HOUR, "Asia/Kolkata") == [
        "2026-03-02T09:00:00+05:30",
        "2026-03-02T10:00:00+05:30",
    ]


def test_weeks_begin_on_monday_as_iso_8601_has_it() -> None:
    zone = "Europe/Dublin"
    sunday = us(zone, 2026, 3, 29, 23, 59)
    assert labels(sunday, sunday + 1, Every.WEEK, zone) == [
        "2026-03-23T00:00:00+00:00",
        "2026-03-30T00:00:00+01:00",
    ]
    assert lengths_h(sunday, sunday + 1, Every.WEEK, zone) == [7 * 24 - 1]


def test_months_have_their_own_lengths() -> None:
    zone = "Europe/Dublin"
    got = lengths_h(us(zone, 2028, 1, 31), us(zone, 2029, 1, 1), Every.MONTH, zone)
    days = [31, 29, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31]
    assert got == [24 * n - (month == 3) + (month == 10) for month, n in enumerate(days, 1)]


def test_a_zone_that_skipped_a_day_has_no_interval_for_it() -> None:
    # Samoa went from 29 to 31 December 2011.
    zone = "Pacific/Apia"
    got = labels(us(zone, 2011, 12, 29, 12), us(zone, 2011, 12, 31, 12), Every.DAY, zone)
    assert [label[:10] for label in got] == ["2011-12-29", "2011-12-31", "2012-01-01"]


def test_no_time_has_no_intervals() -> None:
    for every in Every:
        assert cut(5, 5, every, ZoneInfo("UTC")).tolist() == []


@pytest.mark.parametrize("every", list(Every))
def test_whole_intervals_are_not_widened(every: Every) -> None:
    zone = ZoneInfo("Europe/Dublin")
    start_us, end_us = us("Europe/Dublin", 2026, 6, 1), us("Europe/Dublin", 2026, 6, 8)
    edges = cut(start_us, end_us, every, zone)
    if every is not Every.MONTH:
        assert (edges[0], edges[-1]) == (start_us, end_us)
    assert cut(int(edges[0]), int(edges[1]), every, zone).tolist() == edges[:2].tolist()


zones = st.sampled_from(
    ["UTC", "Europe/Dublin", "Pacific/Auckland", "Australia/Lord_Howe", "America/Santiago", "Asia/Kathmandu"]
)
moments = st.integers(1_700_000_000 * S, 1_900_000_000 * S)


@settings(deadline=None, max_examples=60)
@given(zones, moments, st.integers(1, 40 * 24 * HOUR), st.sampled_from(list(Every)))
def test_intervals_cover_the_period_and_no_more(
    zone: str, start_us: int, length_us: int, every: Every
) -> None:
    edges = cut(start_us, start_us + length_us, every, ZoneInfo(zone)).tolist()
    assert all(low < high for low, high in pairwise(edges))
    assert edges[0] <= start_us < edges[1]
    assert edges[-2] < start_us + length_us <= edges[-1]


@settings(deadline=None, max_examples=30)
@given(zones, moments)
def test_hours_agree_with_watching_the_clock_minute_by_minute(zone: str, start_us: int) -> None:
    """The slow version: an interval begins whenever the clock comes to show another hour, or jumps back."""
    start_us -= start_us % HOUR
    local = ZoneInfo(zone)
    edges = cut(start_us, start_us + 30 * HOUR, Every.HOUR, local).tolist()
    watched = []
    for minute_us in range(edges[0], edges[-1], 60 * S):
        now, before = from_us(minute_us, local), from_us(minute_us - 60 * S, local)
        again = now.replace(tzinfo=None) < before.replace(tzinfo=None) and now.minute == 0
        if now.hour != before.hour or again:
            watched.append(minute_us)
    assert edges[:-1] == watched


@settings(deadline=None, max_examples=30)
@given(zones, moments)
def test_days_agree_with_the_calendar(zone: str, start_us: int) -> None:
    local = ZoneInfo(zone)
    edges = cut(start_us, start_us + 50 * 24 * HOUR, Every.DAY, local).tolist()
    days = [from_us(edge, local).date() for edge in edges]
    assert days == [days[0] + timedelta(days=i) for i in range(len(days))]
    assert all(from_us(edge - 1, local).date() < day for edge, day in zip(edges, days, strict=True))
