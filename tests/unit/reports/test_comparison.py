"""Before and after over a log with a known change; holidays as the law of the country has them."""

from __future__ import annotations

from datetime import date, timedelta

import numpy as np
import pytest
from tests.unit.reports.invented import DUBLIN, HOUR, NORTH, A, at, heard, passed

from ginnel.errors import ConfigError
from ginnel.reports import compare
from ginnel.store import Store
from ginnel.words import Passage

FIRST = date(2026, 3, 2)  # a Monday


def midnight(day: date) -> int:
    return at(day.year, day.month, day.day)


@pytest.fixture
def changed(store: Store) -> Store:
    """Four weeks, then four with 25 % fewer and 0.2 m/s slower; nobody on St Patrick's Day."""
    rng = np.random.default_rng(17)
    log: list[Passage] = []
    for i in range(56):
        day = FIRST + timedelta(days=i)
        start, end = midnight(day), midnight(day + timedelta(days=1))
        is_after = i >= 28
        mean = (60 if day.weekday() < 5 else 20) * (0.75 if is_after else 1.0)
        n = 0 if day == date(2026, 3, 17) else int(rng.negative_binomial(30, 30 / (30 + mean)))
        times = np.sort(rng.integers(start + HOUR, end - HOUR, n)).tolist()
        speeds = rng.normal(1.4 - 0.2 * is_after + rng.normal(0, 0.02), 0.2, n)
        log += [passed(t, A, float(v)) for t, v in zip(times, speeds, strict=True)]
    heard(store, NORTH, midnight(FIRST), midnight(FIRST + timedelta(days=56)), log)
    return store


def stretches() -> tuple[tuple[int, int], tuple[int, int]]:
    edges = [midnight(FIRST + timedelta(days=days)) for days in (0, 28, 56)]
    return (edges[0], edges[1]), (edges[1], edges[2])


def test_a_known_change_lies_within_the_limits(changed: Store) -> None:
    found = compare(changed, "north", *stretches(), DUBLIN, holidays_of="IE")
    assert found.rate is not None
    assert found.rate.low < 0.75 < found.rate.high
    assert found.rate.high < 1
    assert found.speed is not None
    assert found.speed.low < -0.2 < found.speed.high < 0
    # 17 March, and Easter Monday 6 April 2026
    assert found.holidays == (date(2026, 3, 17), date(2026, 4, 6))
    assert (found.rate.n_before, found.rate.n_after) == (27, 27)
    assert found.cautions == ()


def test_holidays_stay_in_unless_asked(changed: Store) -> None:
    found = compare(changed, "north", *stretches(), DUBLIN)
    without = compare(changed, "north", *stretches(), DUBLIN, holidays_of="IE")
    assert found.holidays == ()
    assert found.rate is not None
    assert without.rate is not None
    assert found.rate.n_before == 28
    assert found.rate.ratio > without.rate.ratio  # a day of nobody makes 'before' look quieter


def test_days_hardly_heard_are_left_out_and_told(changed: Store) -> None:
    before, after = stretches()
    short = (before[0], before[0] + 5 * 24 * HOUR), (after[0], after[1] + 2 * 24 * HOUR)
    found = compare(changed, "north", *short, DUBLIN)
    assert any("0 before, 2 after" in caution for caution in found.cautions)
    assert any("weekdays that only one" in caution for caution in found.cautions)
    assert found.rate is not None
    assert (found.rate.n_before, found.rate.n_after) == (5, 20)


def test_a_country_nobody_knows_is_refused(changed: Store) -> None:
    with pytest.raises(ConfigError, match="no holidays known of 'Atlantis'"):
        compare(changed, "north", *stretches(), DUBLIN, holidays_of="Atlantis")


def test_holidays_of_a_part_of_a_country(changed: Store) -> None:
    found = compare(changed, "north", *stretches(), DUBLIN, holidays_of="GB-NIR")
    assert date(2026, 4, 3) in found.holidays  # Good Friday, no public holiday in Ireland
    assert date(2026, 3, 17) in found.holidays
