"""336,776 timed events of a year, put into local hours across two clock changes without one misplaced."""

from __future__ import annotations

from zoneinfo import ZoneInfo

import numpy as np
import pandas as pd
import pytest

from ginnel.reports import Every, cut
from ginnel.reports.calendar import calendar
from ginnel.stats import counts_in
from ginnel.stats.counts import IntArray

NEW_YORK = ZoneInfo("America/New_York")


@pytest.fixture(scope="module")
def departures_us(flights: pd.DataFrame) -> IntArray:
    """UTC moments, from the UTC hour and the minute: the local hour in the data is left for the check."""
    hours = pd.to_datetime(flights["time_hour"], utc=True)
    minutes = pd.to_timedelta(flights["minute"], unit="m")
    return np.asarray((hours + minutes).dt.as_unit("us").astype("int64"), np.int64)


def test_every_event_lies_in_the_local_hour_that_the_data_name(
    flights: pd.DataFrame, departures_us: IntArray
) -> None:
    edges_us = cut(int(departures_us.min()), int(departures_us.max()) + 1, Every.HOUR, NEW_YORK)
    local = calendar(edges_us[:-1], NEW_YORK)
    found = np.searchsorted(edges_us, departures_us, side="right") - 1
    assert len(departures_us) == 336_776
    for name in ("year", "month", "hour"):
        np.testing.assert_array_equal(getattr(local, name)[found], flights[name])
    dates = pd.to_datetime(flights[["year", "month", "day"]])
    np.testing.assert_array_equal(local.day[found], dates.map(pd.Timestamp.toordinal))


def test_hours_and_days_hold_what_pandas_counts(flights: pd.DataFrame, departures_us: IntArray) -> None:
    start_us, end_us = int(departures_us.min()), int(departures_us.max()) + 1
    hours_us = cut(start_us, end_us, Every.HOUR, NEW_YORK)
    counts = counts_in(departures_us, hours_us)
    assert counts.sum() == 336_776
    by_clock = np.bincount(calendar(hours_us[:-1], NEW_YORK).hour, weights=counts, minlength=24)
    expected = flights.groupby("hour").size().reindex(range(24), fill_value=0)
    np.testing.assert_array_equal(by_clock, expected)
    assert (int(np.argmax(by_clock)), int(by_clock.max())) == (8, 27_242)
    days = counts_in(departures_us, cut(start_us, end_us, Every.DAY, NEW_YORK))
    assert (len(days), days.max(), days.min()) == (365, 1014, 634)
    assert days.mean() == pytest.approx(922.674, abs=5e-4)
    np.testing.assert_array_equal(days, flights.groupby(["month", "day"]).size())


def test_the_days_of_the_clock_changes_are_23_and_25_hours_long(
    departures_us: IntArray,
) -> None:
    days = cut(int(departures_us.min()), int(departures_us.max()), Every.DAY, NEW_YORK)
    lengths = pd.Series(np.diff(days) // 3_600_000_000, pd.date_range("2013-01-01", periods=365))
    assert lengths[lengths != 24].to_dict() == {
        pd.Timestamp("2013-03-10"): 23,
        pd.Timestamp("2013-11-03"): 25,
    }


def test_weeks_and_months_hold_what_pandas_counts(flights: pd.DataFrame, departures_us: IntArray) -> None:
    start_us, end_us = int(departures_us.min()), int(departures_us.max()) + 1
    dates = pd.to_datetime(flights[["year", "month", "day"]])
    months = counts_in(departures_us, cut(start_us, end_us, Every.MONTH, NEW_YORK))
    np.testing.assert_array_equal(months, flights.groupby("month").size())
    weeks = counts_in(departures_us, cut(start_us, end_us, Every.WEEK, NEW_YORK))
    iso = dates.dt.isocalendar()
    np.testing.assert_array_equal(weeks, flights.groupby([iso["year"], iso["week"]]).size())
