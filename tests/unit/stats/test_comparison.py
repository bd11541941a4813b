"""Before and after, against statsmodels and simulation."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ginnel.stats.comparison import mean_change, rate_ratio

sm = pytest.importorskip("statsmodels.api")


@pytest.mark.parametrize("seed", range(5))
def test_rate_ratio_is_that_of_a_quasi_poisson_model(seed: int) -> None:
    """statsmodels' Poisson GLM with weekday effects, scale by Pearson's chi-square."""
    rng = np.random.default_rng(seed)
    weekday = np.tile(np.arange(7), 8)
    is_after = np.arange(56) >= 28
    exposure = rng.uniform(0.5, 1.0, 56)
    mean = exposure * (200 - 20 * weekday) * np.where(is_after, 0.8, 1.0)
    counts = rng.negative_binomial(10, 10 / (10 + mean)).astype(float)
    design = np.column_stack([*(weekday == day for day in range(7)), is_after]).astype(float)
    fitted = sm.GLM(counts, design, family=sm.families.Poisson(), exposure=exposure).fit(scale="X2")
    found = rate_ratio(counts, exposure, is_after, weekday)
    assert found is not None
    assert np.log(found.ratio) == pytest.approx(fitted.params[-1], rel=1e-6, abs=1e-8)
    assert found.log_se == pytest.approx(fitted.bse[-1], rel=1e-6)
    assert found.dispersion == pytest.approx(fitted.scale, rel=1e-6)
    assert (found.n_before, found.n_after) == (28, 28)


def test_limits_hold_the_truth_as_often_as_they_promise() -> None:
    rng = np.random.default_rng(7)
    weekday, is_after = np.tile(np.arange(7), 8), np.arange(56) >= 28
    held = 0
    for _ in range(400):
        mean = (300 - 30 * weekday) * np.where(is_after, 1.25, 1.0)
        found = rate_ratio(
            rng.negative_binomial(8, 8 / (8 + mean)).astype(float), np.ones(56), is_after, weekday
        )
        assert found is not None
        held += found.low <= 1.25 <= found.high
    assert 0.92 <= held / 400 <= 0.98


def test_a_weekday_of_one_period_only_is_left_out() -> None:
    # Mondays 100 to 200, and a quiet Sunday that only the first period has: the ratio is 2, by hand
    counts = np.array([100.0, 100, 10, 200, 200])
    found = rate_ratio(counts, np.ones(5), np.array([0, 0, 0, 1, 1], bool), np.array([0, 0, 6, 0, 0]))
    assert found is not None
    assert found.ratio == pytest.approx(2)
    assert (found.n_before, found.n_after) == (2, 2)


def test_less_chance_than_poisson_is_not_believed() -> None:
    # equal days have no spread; the error is still that of counting, sqrt(1/200 + 1/400)
    found = rate_ratio(
        np.array([100.0, 100, 200, 200]), np.ones(4), np.array([0, 0, 1, 1], bool), np.zeros(4, np.int64)
    )
    assert found is not None
    assert found.dispersion == pytest.approx(0, abs=1e-12)
    assert found.log_se == pytest.approx(np.sqrt(1 / 200 + 1 / 400))


def test_exposure_counts_and_days_unheard_do_not() -> None:
    # half the time listened, half the count: no change
    found = rate_ratio(
        np.array([100.0, 50, 100, 50, 0]),
        np.array([1, 0.5, 1, 0.5, 0]),
        np.array([0, 0, 1, 1, 1], bool),
        np.zeros(5, np.int64),
    )
    assert found is not None
    assert found.ratio == pytest.approx(1)
    assert found.n_after == 2


@pytest.mark.parametrize("counts", [[0, 0, 5, 5], [5, 5, 0, 0], [5]])
def test_too_little_has_no_ratio(counts: list[float]) -> None:
    n = len(counts)
    found = rate_ratio(np.array(counts, float), np.ones(n), np.arange(n) >= 2, np.zeros(n, np.int64))
    assert found is None


@settings(deadline=None)
@given(st.lists(st.integers(1, 2000), min_size=8, max_size=30), st.floats(0.05, 20), st.integers(1, 7))
def test_a_ratio_put_in_comes_out(base: list[int], ratio: float, n_strata: int) -> None:
    counts = np.array([*base, *(ratio * one for one in base)], float)
    stratum = np.tile(np.arange(len(base)) % n_strata, 2)
    found = rate_ratio(counts, np.ones(len(counts)), np.arange(len(counts)) >= len(base), stratum)
    assert found is not None
    assert found.ratio == pytest.approx(ratio, rel=1e-6)


def test_change_of_a_mean_is_that_of_clustered_regression() -> None:
    """statsmodels: means of two periods with standard errors clustered by day."""
    rng = np.random.default_rng(2)
    n = rng.integers(20, 200, 24).astype(np.int64)
    day = np.repeat(np.arange(24), n)
    speed_mps = 1.3 + 0.05 * rng.standard_normal(24)[day] + 0.25 * rng.standard_normal(len(day))
    is_after = day >= 14
    sums = np.bincount(day, weights=speed_mps).astype(float)
    found = mean_change(sums[:14], n[:14], sums[14:], n[14:])
    assert found is not None
    variances = []
    for chosen, mean in ((~is_after, found.before), (is_after, found.after)):
        fitted = sm.OLS(speed_mps[chosen], np.ones(chosen.sum())).fit(
            cov_type="cluster", cov_kwds={"groups": day[chosen], "df_correction": False}, use_t=False
        )
        assert mean == pytest.approx(fitted.params[0], rel=1e-9)
        days, rows = len(np.unique(day[chosen])), int(chosen.sum())
        # its correction is days / (days - 1) * (rows - 1) / (rows - 1)
        variances.append(
            fitted.bse[0] ** 2 / (days / (days - 1) * (rows - 1) / (rows - 1)) * days / (days - 1)
        )
    assert found.se == pytest.approx(np.sqrt(sum(variances)), rel=1e-6)
    assert found.low < found.change < found.high


def test_a_single_day_tells_nothing_of_how_days_vary() -> None:
    one, two = np.array([10.0]), np.array([10.0, 11.0])
    assert mean_change(one, np.array([8]), two, np.array([8, 9])) is None
    assert mean_change(two, np.array([8, 0]), two, np.array([8, 9])) is None
