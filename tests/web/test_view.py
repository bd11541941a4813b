"""What a page looks at, from the words of its address; calendars checked against the standard library."""

from __future__ import annotations

from datetime import date, timedelta
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.reports import Every
from ginnel.web.view import Show, View, ViewError, bounds, read_view
from ginnel.words import US_PER_S, Sensor

DUBLIN = ZoneInfo("Europe/Dublin")
SENSOR = Sensor(name="lane")
days = st.dates(min_value=date(1972, 1, 10), max_value=date(2190, 12, 20))
HOUR_US = 3600 * US_PER_S


def view(**asked: str) -> View:
    return read_view(asked, SENSOR, DUBLIN, date(2026, 3, 2))


def test_without_words_it_is_the_newest_day() -> None:
    assert (view().show, view().first, view().last) == (Show.DAY, date(2026, 3, 2), date(2026, 3, 2))


@given(days)
def test_a_week_is_the_iso_week_that_holds_the_day(day: date) -> None:
    first, last = bounds(Show.WEEK, day)
    assert first.isocalendar()[:2] == last.isocalendar()[:2] == day.isocalendar()[:2]
    assert (first.isoweekday(), last.isoweekday()) == (1, 7)


@given(days)
def test_a_month_ends_the_day_before_the_next_one(day: date) -> None:
    first, last = bounds(Show.MONTH, day)
    assert first.day == 1
    assert (last + timedelta(days=1)).day == 1
    assert (first.year, first.month) == (last.year, last.month) == (day.year, day.month)


@given(days, st.sampled_from(Show))
def test_there_and_back_again(day: date, show: Show) -> None:
    here = view(show=show, on=day.isoformat(), to=(day + timedelta(days=9)).isoformat())
    earlier, later = here.earlier(), here.later()
    assert earlier is not None
    assert later is not None
    assert earlier.last + timedelta(days=1) == here.first
    assert later.first - timedelta(days=1) == here.last
    assert earlier.later() == later.earlier() == here


@given(days, st.sampled_from(Show))
def test_the_address_of_a_view_gives_the_view(day: date, show: Show) -> None:
    here = view(show=show, on=day.isoformat(), to=(day + timedelta(days=9)).isoformat())
    assert view(**here.query) == here


@pytest.mark.parametrize(("day", "hours"), [("2026-03-29", 23), ("2026-10-25", 25), ("2026-03-30", 24)])
def test_days_are_as_long_as_the_clock_makes_them(day: str, hours: int) -> None:
    # Ireland's summer time begins on the last Sunday of March and ends on the last of October (EU 2000/84/EC)
    here = view(on=day)
    assert here.end_us - here.start_us == hours * HOUR_US


def test_intervals_fit_the_length() -> None:
    assert view(show="day").every is view(show="week").every is Every.HOUR
    assert view(show="month").every is Every.DAY
    assert view(show="year").every is Every.WEEK


def test_a_range_may_be_given_the_wrong_way_round() -> None:
    assert view(show="range", on="2026-03-09", to="2026-03-02").first == date(2026, 3, 2)


@pytest.mark.parametrize(
    ("asked", "said"),
    [
        ({"show": "decade"}, "show=decade is not understood: it is one of day, week"),
        ({"on": "2026-02-30"}, "2026-02-30 is not a day"),
        ({"on": "1066-10-14"}, "outside the years"),
        ({"show": "range", "on": "2001-01-01", "to": "2026-01-01"}, "more than ten years"),
    ],
)
def test_what_no_calendar_has_is_refused(asked: dict[str, str], said: str) -> None:
    with pytest.raises(ViewError, match=said):
        view(**asked)
