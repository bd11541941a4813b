"""What does not fit: against scipy's robust statistics and streams with a fault put in."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from ginnel.stats.unusual import (
    against_history,
    chance_of_none,
    runs,
    silent_runs,
    trend,
    usual_but_for_silence,
)


def test_random_counts_are_hardly_ever_surprising() -> None:
    """A year of Poisson hours with a weekly pattern: 4.5 standard deviations in none of them, about."""
    rng = np.random.default_rng(1)
    group = np.arange(52 * 168) % 168
    counts = rng.poisson(20 + 15 * np.sin(group / 24 * 2 * np.pi)).astype(float)
    history = against_history(counts, group, 168)
    assert np.sum(np.abs(history.surprise) > 4.5) <= 8
    assert np.std(history.surprise) == pytest.approx(1, abs=0.15)


def test_an_odd_hour_stands_out_and_does_not_change_what_is_usual() -> None:
    counts = np.array([100.0, 96, 104, 99, 103, 98, 101, 400])
    history = against_history(counts, np.zeros(8, np.int64), 1)
    assert history.median[0] == pytest.approx(100.5, abs=0.01)
    assert history.surprise[-1] > 15
    assert np.abs(history.surprise[:-1]).max() < 2.5
    # the same by scipy: roots over their scaled median absolute deviation, here below 1/2
    roots = np.sqrt(counts)
    assert stats.median_abs_deviation(roots, scale="normal") < 0.5
    np.testing.assert_allclose(history.surprise, (roots - np.median(roots)) / 0.5)


def test_where_counts_vary_much_more_is_needed_to_be_odd() -> None:
    counts = np.array([100.0, 400, 225, 144, 324, 256, 169])
    roots = np.sqrt(counts)
    history = against_history(counts, np.zeros(7, np.int64), 1)
    # scipy's scale is 1 / 0.67449 = 1.482602
    expected = (roots - np.median(roots)) / stats.median_abs_deviation(roots, scale="normal")
    np.testing.assert_allclose(history.surprise, expected, rtol=1e-5)


def test_a_short_history_is_none() -> None:
    history = against_history(np.array([1.0, 2, np.nan, 4, 5, 6]), np.zeros(6, np.int64), 1)
    assert np.isnan(history.surprise).all()


def test_silence_counts_by_what_is_usual() -> None:
    usual = np.full(10, 12.0)
    counts = np.array([5.0, 0, 0, 0, 9, 0, 0, np.nan, 0, 0])
    (run,) = silent_runs(counts, usual)
    assert (run.first, run.n, run.expected) == (1, 3, 36)
    assert silent_runs(np.zeros(10), np.full(10, 0.1)) == []


def test_long_silence_is_not_learnt_as_usual() -> None:
    counts = np.tile([4.0, 6.0], 100)
    counts[50:150] = 0
    usual = usual_but_for_silence(counts, np.arange(200) % 2, 2)
    np.testing.assert_array_equal(usual[:2], [4, 6])
    counts[:] = np.tile([4.0, 0.0], 100)  # short silences are
    np.testing.assert_array_equal(usual_but_for_silence(counts, np.arange(200) % 2, 2)[:2], [4, 0])


def test_runs_of_true() -> None:
    assert runs(np.array([True, False, True, True])) == [(0, 1), (2, 4)]
    assert runs(np.array([], bool)) == []


def test_chance_of_none_by_hand() -> None:
    np.testing.assert_allclose(chance_of_none(np.array([0, 1, 20]), 0.5), [1, 0.5, 2.0**-20])


def test_trend_is_that_of_scipy() -> None:
    rng = np.random.default_rng(6)
    t = np.arange(60.0)
    values = 20 - 0.05 * t + rng.standard_normal(60)
    found = trend(t, values)
    assert found is not None
    assert found.slope == pytest.approx(stats.theilslopes(values, t).slope, rel=1e-12)
    tau = stats.kendalltau(t, values, method="asymptotic")
    assert found.p_value == pytest.approx(tau.pvalue, rel=0.1)  # scipy's is without continuity
    assert found.p_value > tau.pvalue


def test_trend_of_nothing_much() -> None:
    assert trend(np.arange(7.0), np.arange(7.0)) is None
    flat = trend(np.arange(20.0), np.full(20, 3.0))
    assert flat is not None
    assert (flat.slope, flat.p_value) == (0, 1)
    gaps = trend(np.arange(20.0), np.where(np.arange(20) % 2, np.nan, np.arange(20.0)))
    assert gaps is not None
    assert gaps.slope == 1
