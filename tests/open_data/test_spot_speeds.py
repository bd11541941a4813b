"""8437 real spot speeds. Expected values: facts of the data set, recomputed with pandas and numpy 2.4."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from ginnel.stats import pace, quantiles, share_over, space_mean, summarise_speeds
from ginnel.stats.histograms import grouped_pace, grouped_quantiles
from ginnel.words import FloatArray


@pytest.fixture
def mph(spot_speeds: pd.DataFrame) -> FloatArray:
    return np.asarray(spot_speeds["speed"], float)


def test_summary_of_all_speeds(mph: FloatArray) -> None:
    summary = summarise_speeds(mph)
    assert summary.n == 8437
    assert summary.mean_mps == pytest.approx(37.82423, abs=5e-6)
    assert summary.sd_mps == pytest.approx(6.50754, abs=5e-6)
    assert (summary.p15_mps, summary.p50_mps, summary.p85_mps, summary.p95_mps) == (31, 37, 44, 49)
    assert summary.space_mean_mps == pytest.approx(36.71813, abs=5e-6)


def test_space_mean_is_near_what_the_spot_variance_makes_of_the_time_mean(
    mph: FloatArray,
) -> None:
    # Wardrop (1952), the other way round: vs is about vt - variance / vt, here 36.70476
    approximate = np.mean(mph) - np.var(mph) / np.mean(mph)
    assert approximate == pytest.approx(36.70476, abs=5e-4)
    assert space_mean(mph) == pytest.approx(approximate, rel=5e-4)


def test_shares_over_limits(mph: FloatArray) -> None:
    assert share_over(mph, 30) == pytest.approx(0.87294, abs=5e-6)
    assert share_over(mph, 35) == pytest.approx(0.62119, abs=5e-6)
    assert share_over(mph, 40) == pytest.approx(0.31184, abs=5e-6)


def test_the_10_mph_pace(mph: FloatArray) -> None:
    best = pace(mph, 10)  # ten whole numbers: 33 to 42
    assert best is not None
    assert (best.low_mps, best.high_mps, best.n) == (33, 43, 4799)
    assert best.share == pytest.approx(0.56880, abs=5e-6)
    eleven = pace(mph, 11)
    assert eleven is not None
    assert eleven.low_mps == 32
    assert eleven.share == pytest.approx(0.61598, abs=5e-6)


def test_85th_percentiles_by_warning_and_period(spot_speeds: pd.DataFrame) -> None:
    got = {
        group: quantiles(own["speed"].to_numpy(float), [0.85])[0]
        for group, own in spot_speeds.groupby(["warning", "period"])
    }
    expected = {(1, 1): 43, (1, 2): 42, (1, 3): 44, (2, 1): 45, (2, 2): 46, (2, 3): 46.9}
    assert got == pytest.approx(expected, abs=0.05)


def test_classes_of_5_mph(mph: FloatArray) -> None:
    counts, _ = np.histogram(mph, np.arange(15, 75, 5))
    assert counts.tolist() == [1, 80, 661, 1922, 2645, 1868, 843, 317, 81, 16, 3]
    for first, p85 in ((14.5, 44.4851), (15.0, 44.9851)):  # limits between, or on, the whole numbers
        edges = first + 5.0 * np.arange(12)
        assert grouped_quantiles(counts, edges, [0.85]) == pytest.approx([p85], abs=5e-5)
    two_classes = grouped_pace(counts, np.arange(15.0, 75.0, 5.0), 10)
    assert two_classes is not None
    assert (two_classes.low_mps, two_classes.high_mps, two_classes.n) == (30, 40, 1922 + 2645)
