"""Average days, factors and design hours against worked examples and pandas; real years: tests/open_data."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.stats import mean_with_limits
from ginnel.stats.volumes import (
    aadt,
    directional_split,
    factors,
    group_means,
    highest_hour,
    k_factor,
)
from ginnel.words import FloatArray

counts_or_nothing = st.one_of(st.just(np.nan), st.integers(0, 10_000).map(float))


def test_average_daily_traffic_of_a_worked_example() -> None:
    # 52,800 vehicles in 30 days: 1,760 a day, arithmetic by hand
    days = np.full(30, 1700.0)
    days[0] += 52_800 - 30 * 1700
    found = mean_with_limits(days)
    assert found is not None
    assert found.mean == 1760


def test_aashto_average_by_pandas() -> None:
    """The definition, FHWA Traffic Monitoring Guide (2022) appendix L, spelt out with a pivot table."""
    rng = np.random.default_rng(20260302)
    days = pd.date_range("2026-01-01", "2026-12-31")
    counts = rng.poisson(800 + 300 * (days.day_of_week < 5) + 40 * days.month).astype(float)
    counts[rng.random(365) < 0.25] = np.nan
    table = pd.DataFrame({"count": counts, "weekday": days.day_of_week, "month": days.month})
    cells = table.pivot_table("count", "weekday", "month", aggfunc="mean")
    assert cells.notna().all(axis=None)
    found = aadt(counts, np.asarray(days.day_of_week, np.int64), np.asarray(days.month, np.int64))
    assert found.value == pytest.approx(cells.mean(axis=1).mean(), rel=1e-12)
    assert found.empty_cells == 0


def test_aashto_average_is_not_bent_by_days_that_are_missing() -> None:
    # Mondays to Fridays have 100, weekends 30: 80 a day by hand, whichever days are missing
    days = pd.date_range("2026-01-01", "2026-12-31")
    counts = np.where(days.day_of_week < 5, 100.0, 30.0)
    counts[(days.day_of_week >= 5) & (days.day > 8)] = np.nan  # most weekends
    found = aadt(counts, np.asarray(days.day_of_week, np.int64), np.asarray(days.month, np.int64))
    assert found.value == pytest.approx(80)
    simple = mean_with_limits(counts)
    assert simple is not None
    assert simple.mean > 90


def test_aashto_average_needs_all_84_cells() -> None:
    weekday, month = np.divmod(np.arange(84), 12)
    assert aadt(np.full(84, 5.0), weekday, month + 1).value == 5
    one_short = aadt(np.append(np.full(83, 5.0), np.nan), weekday, month + 1)
    assert (one_short.value, one_short.empty_cells) == (None, 1)


def test_k_of_a_worked_example() -> None:
    # a 30th highest hour of 1,500 at an AADT of 10,000 is 15 % (worked example, by hand)
    hours = np.concatenate([np.full(29, 2000.0), [1500.0], np.full(500, 100.0), [np.nan]])
    assert highest_hour(hours, 30) == 1500
    assert k_factor(hours, 30, 10_000) == pytest.approx(0.15)
    assert (k_factor(hours, 1000, 10_000), k_factor(hours, 30, 0)) == (None, None)


def test_directional_split_is_the_share_of_the_busier_way() -> None:
    assert directional_split(300, 200) == pytest.approx(0.6)
    assert directional_split(200, 300) == pytest.approx(0.6)
    assert directional_split(0, 0) is None


def test_factors_turn_a_groups_average_into_the_years() -> None:
    # by hand: a group that averages 50 against 80 has 1.6; one without a day, or without anybody, has none
    found = factors(np.array([40.0, 60.0, np.nan, 0.0]), np.array([0, 0, 1, 2]), 3, 80.0)
    np.testing.assert_array_equal(found, [1.6, np.nan, np.nan])


@given(st.lists(st.tuples(counts_or_nothing, st.integers(0, 4)), max_size=40))
def test_group_means_are_those_of_pandas(rows: list[tuple[float, int]]) -> None:
    values: FloatArray = np.array([row[0] for row in rows], float)
    group = np.array([row[1] for row in rows], np.int64)
    means, n = group_means(values, group, 5)
    by_group = pd.Series(values).groupby(group)
    np.testing.assert_allclose(means, by_group.mean().reindex(range(5)), rtol=1e-12)
    np.testing.assert_array_equal(n, by_group.count().reindex(range(5), fill_value=0))


@given(st.lists(counts_or_nothing, min_size=1, max_size=60), st.integers(1, 60))
def test_nth_highest_hour_is_that_of_pandas(values: list[float], n: int) -> None:
    known = pd.Series(values, dtype=float).dropna()
    expected = known.nlargest(n).iloc[-1] if n <= len(known) else None
    assert highest_hour(np.array(values), n) == expected
