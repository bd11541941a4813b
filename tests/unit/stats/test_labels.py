"""Labels of hours: made wrong here in known ways; the open data have real ones."""

from __future__ import annotations

import numpy as np
import pytest

from ginnel.stats.labels import clock_hours, first_hour_of_days, profile_shift

DAY = np.repeat(np.arange(100, 110), 24)


@pytest.mark.parametrize("first", [0, 6, 23])
def test_the_hour_with_which_days_begin(first: int) -> None:
    hour = np.tile(np.roll(np.arange(24), -first), 10)
    assert first_hour_of_days(DAY, hour) == first
    np.testing.assert_array_equal(clock_hours(DAY, hour, first), np.arange(240) + 2400 + first)


def test_one_odd_day_does_not_decide() -> None:
    hour = np.tile(np.arange(24), 10)
    assert first_hour_of_days(DAY[5:], hour[5:]) == 0  # the file begins at five


@pytest.mark.parametrize("moved", [-2, -1, 0, 1, 2])
def test_a_profile_moved_is_found(moved: int) -> None:
    profile = np.array(
        [1.0, 1, 1, 1, 2, 5, 20, 60, 90, 40, 30, 50, 70, 60, 40, 50, 80, 99, 60, 30, 20, 9, 4, 2]
    )
    shift = profile_shift(profile, np.roll(3 * profile, moved))
    assert shift is not None
    assert shift.hours == moved
    assert shift.correlation == pytest.approx(1)


def test_a_flat_or_unknown_profile_tells_nothing() -> None:
    profile = np.arange(24.0)
    assert profile_shift(profile, np.ones(24)) is None
    assert profile_shift(profile, np.full(24, np.nan)) is None
