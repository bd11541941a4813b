"""Limits of counts, shares and means, against published tables, reference libraries and what they promise."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from ginnel.stats import dispersion, expand, mean_with_limits, poisson_limits, wilson_limits

# F. Garwood, Biometrika 28 (1936); k = 0, 10 and 25 read in two pages that cite it, the rest recomputed.
GARWOOD = {
    0.90: {
        0: (0, 2.9957),
        1: (0.0513, 4.7439),
        5: (1.9701, 10.5130),
        10: (5.4254, 16.9622),
        25: (17.3821, 34.9161),
        100: (84.1393, 118.0793),
        1000: (948.5598, 1053.6031),
    },
    0.95: {
        0: (0, 3.6889),
        1: (0.0253, 5.5716),
        2: (0.2422, 7.2247),
        5: (1.6235, 11.6683),
        10: (4.7954, 18.3904),
        25: (16.1787, 36.9049),
        100: (81.3640, 121.6268),
        500: (457.1286, 545.8093),
        1000: (938.9730, 1063.9521),
    },
    0.99: {0: (0, 5.2983), 3: (0.3379, 10.9775), 10: (3.7169, 21.3978), 25: (13.9954, 41.0004)},
}


@pytest.mark.parametrize("level", GARWOOD)
def test_limits_are_those_of_the_published_table(level: float) -> None:
    counts = np.array(list(GARWOOD[level]))
    low, high = poisson_limits(counts, level)
    np.testing.assert_allclose(np.column_stack([low, high]), list(GARWOOD[level].values()), atol=1e-4)


def test_limits_leave_exactly_the_tails_outside() -> None:
    """What defines them: at a limit, a count as far off has the tail's probability (scipy's Poisson)."""
    counts = np.arange(1, 400)
    low, high = poisson_limits(counts)
    np.testing.assert_allclose(stats.poisson.sf(counts - 1, low), 0.025, rtol=1e-9)
    np.testing.assert_allclose(stats.poisson.cdf(counts, high), 0.025, rtol=1e-9)


def test_limits_near_byars_closed_form() -> None:
    # Byar's approximation, recomputed: 100 gives 81.362 to 121.628
    low, high = poisson_limits(np.array([100]))
    np.testing.assert_allclose([low[0], high[0]], [81.362, 121.628], atol=3e-3)


def test_shape_is_kept() -> None:
    low, high = poisson_limits(np.zeros((2, 3), np.int64))
    assert low.shape == high.shape == (2, 3)
    assert poisson_limits(np.empty(0, np.int64))[0].shape == (0,)


def test_nonsense_is_refused() -> None:
    with pytest.raises(ValueError, match="negative"):
        poisson_limits(np.array([-1]))
    with pytest.raises(ValueError, match="between 0 and 1"):
        poisson_limits(np.array([1]), 95)


@pytest.mark.parametrize(
    ("k", "n", "low", "high"),
    [
        # R. G. Newcombe, Statistics in Medicine 17 (1998), Table I (from memory), recomputed
        (81, 263, 0.25529, 0.36621),
        (15, 148, 0.06239, 0.16049),
        # recomputed from Wilson's formula
        (4, 20, 0.08066, 0.41602),
        (45, 50, 0.78640, 0.95652),
        (190, 200, 0.91042, 0.97262),
        (0, 10, 0, 0.27753),
        (10, 10, 0.72247, 1),
        (0, 0, 0, 1),
    ],
)
def test_wilson_limits(k: int, n: int, low: float, high: float) -> None:
    found = wilson_limits(np.array([k]), np.array([n]))
    assert (found[0][0], found[1][0]) == pytest.approx((low, high), abs=5e-6)


def test_wilson_limits_are_those_of_scipy() -> None:
    for n in (1, 7, 30):
        k = np.arange(n + 1)
        low, high = wilson_limits(k, np.full(n + 1, n), 0.9)
        for i in k:
            expected = stats.binomtest(int(i), n).proportion_ci(0.9, method="wilson")
            assert (low[i], high[i]) == pytest.approx((expected.low, expected.high), abs=1e-12)
    with pytest.raises(ValueError, match="between 0 and n"):
        wilson_limits(np.array([3]), np.array([2]))


def test_dispersion_by_hand() -> None:
    # recomputed: mean 16.375, variance 47.125, chi-square 20.145 on 7 degrees of freedom
    found = dispersion(np.array([12.0, 15, 9, 22, 18, 30, 11, 14, np.nan]))
    assert found is not None
    assert (found.n, found.mean) == (8, 16.375)
    assert found.variance == pytest.approx(47.125)
    assert found.ratio == pytest.approx(2.8779, abs=5e-5)
    assert found.p_value == pytest.approx(0.00526, abs=5e-6)
    assert dispersion(np.zeros(5)) is None
    assert dispersion(np.array([4.0])) is None


def test_mean_limits_are_those_of_scipy_and_wider_than_poissons_where_days_vary() -> None:
    days = np.array([12.0, 15, 9, 22, 18, 30, 11, 14])
    found = mean_with_limits(days)
    assert found is not None
    expected = stats.ttest_1samp(days, 0).confidence_interval(0.95)
    assert (found.low, found.high) == pytest.approx((expected.low, expected.high))
    low, high = poisson_limits(np.array([int(days.sum())]))
    assert found.low is not None
    assert found.high is not None
    assert found.high - found.low > (high[0] - low[0]) / len(days)
    one = mean_with_limits(np.array([np.nan, 7.0]))
    assert one is not None
    assert (one.n, one.mean, one.low) == (1, 7.0, None)
    assert mean_with_limits(np.array([np.nan])) is None


def test_what_was_counted_in_a_part_is_expanded_to_the_whole() -> None:
    np.testing.assert_array_equal(expand(np.array([10.0, 3, 0]), np.array([0.5, 1.0, 0.0])), [20, 3, np.nan])


def test_expanded_limits_hold_the_mean_of_the_whole() -> None:
    """40 an hour, listened to for 20 minutes: limits of the hour's mean hold it as often as they promise."""
    rng = np.random.default_rng(12)
    counts = rng.poisson(40 / 3, 20_000)
    low, high = (expand(limit, np.full(len(counts), 1 / 3)) for limit in poisson_limits(counts))
    assert np.mean((low <= 40) & (high >= 40)) >= 0.95
