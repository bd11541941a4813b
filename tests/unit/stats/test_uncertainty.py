"""Limits of counts, against the published table and against what they promise."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from ginnel.stats import poisson_limits

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
