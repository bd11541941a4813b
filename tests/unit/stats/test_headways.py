"""Headways against the exponential law of random arrivals, and by hand."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from ginnel.stats.headways import headways_s, random_share_below, summarise_headways

S = 1_000_000


def ints(*values: float) -> np.ndarray[tuple[int], np.dtype[np.int64]]:
    return np.array([round(value * S) for value in values], np.int64)


def test_random_headways_at_600_an_hour() -> None:
    # exponential with a mean of 6 s, by the formula: 28.347 % below 2 s, 18.888 % above 10 s
    below = random_share_below(np.array([2.0, 10.0]), 6.0)
    assert below[0] == pytest.approx(0.28347, abs=5e-6)
    assert 1 - below[1] == pytest.approx(0.18888, abs=5e-6)


def test_a_poisson_stream_has_exponential_headways() -> None:
    rng = np.random.default_rng(11)
    crossed = np.sort(rng.integers(0, 100 * 3600 * S, 60_000))
    found = headways_s(crossed, ints(0), ints(100 * 3600))
    below = random_share_below(np.sort(found), float(found.mean()))
    assert stats.kstest(below, "uniform").pvalue > 1e-3
    summary = summarise_headways(found)
    assert summary.n == 59_999
    assert summary.variation == pytest.approx(1, abs=0.02)
    assert summary.p50_s == pytest.approx(np.log(2) * 6, rel=0.02)


def test_a_pair_with_a_gap_between_has_no_headway() -> None:
    # listened 0 to 10 and 20 to 40 s; a crossing at 15 s lies outside
    found = headways_s(ints(1, 4, 9, 15, 21, 22.5, 40), ints(0, 20), ints(10, 40))
    np.testing.assert_allclose(found, [3, 5, 1.5])
    assert len(headways_s(ints(1, 4), ints(), ints())) == 0
    assert len(headways_s(ints(), ints(0), ints(10))) == 0


def test_spans_that_touch_are_two_all_the_same() -> None:
    # whoever passed while one span ended and the next began may have been missed
    np.testing.assert_allclose(headways_s(ints(1, 9, 11, 12), ints(0, 10), ints(10, 20)), [8, 1])


def test_summary_of_few() -> None:
    assert summarise_headways(np.empty(0)).mean_s is None
    one = summarise_headways(np.array([3.0]))
    assert (one.n, one.mean_s, one.sd_s, one.variation) == (1, 3.0, None, None)
