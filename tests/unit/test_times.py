"""Times as microseconds and as text."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta
from zoneinfo import ZoneInfo

import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.times import from_us, to_us, utc_text


def test_published_moments() -> None:
    # POSIX: 2001-09-09T01:46:40Z is second 1,000,000,000
    assert to_us(datetime(2001, 9, 9, 1, 46, 40, tzinfo=UTC)) == 1_000_000_000_000_000
    assert utc_text(1_000_000_000_000_000) == "2001-09-09T01:46:40.000000Z"
    assert utc_text(-1) == "1969-12-31T23:59:59.999999Z"


@given(st.datetimes(datetime(1970, 1, 1), datetime(2200, 1, 1)))  # noqa: DTZ001 (a zone is given below)
def test_there_and_back_is_exact(moment: datetime) -> None:
    aware = moment.replace(tzinfo=UTC)
    assert from_us(to_us(aware)) == aware
    assert datetime.fromisoformat(utc_text(to_us(aware))) == aware


def test_the_hour_shown_twice_is_told_apart() -> None:
    zone = ZoneInfo("Europe/Dublin")
    first = to_us(datetime(2026, 10, 25, 1, 30, tzinfo=zone))
    second = to_us(datetime(2026, 10, 25, 1, 30, tzinfo=zone, fold=1))
    assert second - first == timedelta(hours=1) // timedelta(microseconds=1)


def test_a_time_without_an_offset_is_refused() -> None:
    with pytest.raises(ValueError, match="has no UTC offset"):
        to_us(datetime(2026, 3, 2))  # noqa: DTZ001 (that is the point)
