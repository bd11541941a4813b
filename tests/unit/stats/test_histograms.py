"""Grouped percentiles and pace against published spot-speed tables and exact ones."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.stats import pace, quantiles
from ginnel.stats.histograms import grouped_pace, grouped_quantiles

# Iowa Handbook of Simplified Practice for Traffic Studies (CTRE, TR-455), Table 2: mph and vehicles. Its
# printed cumulative 23 at 27 mph is a misprint for 34 (the next is 54).
IOWA_MPH = np.arange(15.0, 49.0, 3.0)
IOWA_N = np.array([1, 2, 6, 12, 13, 20, 18, 14, 6, 6, 1, 1])
# A published spot-speed table of 130 vehicles in classes of 5 km/h, limits at 39.5, 44.5 ...
TABLE_N = np.array([5, 8, 12, 10, 15, 21, 16, 11, 10, 4, 5, 4, 5, 1, 3])
TABLE_KMH = 39.5 + 5.0 * np.arange(16)


def test_iowa_percentiles_by_the_handbooks_formula() -> None:
    # cumulative shares stand at the speeds themselves there: these are the upper limits
    edges = np.concatenate([[12.0], IOWA_MPH])
    assert grouped_quantiles(IOWA_N, edges, [0.15, 0.5, 0.85]) == pytest.approx(
        [22.5, 29.4, 35.7857], abs=5e-5
    )


def test_iowa_pace() -> None:
    speeds = np.repeat(IOWA_MPH, IOWA_N)
    best = pace(speeds, 10)
    assert best is not None
    assert (best.low_mps, best.n) == (27, 65)  # 27, 30, 33 and 36 mph; next best 24 to 33 with 63


def test_130_vehicles() -> None:
    found = grouped_quantiles(TABLE_N, TABLE_KMH, [0.15, 0.5, 0.85, 0.95])
    assert found == pytest.approx([52.2083, 68.0714, 87.6250, 102.0], abs=5e-5)
    published = grouped_quantiles(TABLE_N, TABLE_KMH, [0.5, 0.85])
    assert published == pytest.approx([68.1, 88], abs=0.5)  # the second read off a curve there
    best = grouped_pace(TABLE_N, TABLE_KMH, 10)
    assert best is not None
    assert (best.low_mps, best.high_mps, best.n) == (64.5, 74.5, 37)  # 28.46 %; published 30 % off a curve
    assert best.share == pytest.approx(0.2846, abs=5e-5)


speeds = st.lists(st.floats(1.0, 20.0), min_size=30, max_size=200)


@given(speeds)
def test_percentiles_from_fine_classes_lie_in_the_class_of_the_true_ones(values: list[float]) -> None:
    """Classes of 1 cm/s, as roll-ups have them."""
    speed_mps = np.array(values)
    edges = np.arange(0, 2002) * 0.01
    counts, _ = np.histogram(speed_mps, edges)
    exact = np.quantile(speed_mps, [0.15, 0.5, 0.85, 0.95], method="inverted_cdf")
    found = grouped_quantiles(counts, edges, [0.15, 0.5, 0.85, 0.95])
    assert found is not None
    np.testing.assert_allclose(found, exact, atol=0.01 + 1e-9)


def test_many_walkers_have_the_same_percentiles_from_classes_as_from_passages() -> None:
    rng = np.random.default_rng(4)
    for n in (50, 500, 50_000):
        speed_mps = np.abs(rng.normal(1.34, 0.26, n)) + 0.05  # free walkers (Weidmann 1993)
        counts, edges = np.histogram(speed_mps, np.arange(0, 500) * 0.01)
        found = grouped_quantiles(counts, edges, [0.15, 0.5, 0.85, 0.95])
        assert found is not None
        exact = quantiles(speed_mps, [0.15, 0.5, 0.85, 0.95])
        # what two definitions of a percentile differ by among n speeds comes on top
        between = 2 * np.max(np.diff(np.sort(speed_mps)[: int(0.96 * n)][int(0.14 * n) :]))
        np.testing.assert_allclose(np.array(found), np.array(exact), rtol=0.005, atol=between)


def test_nothing_has_no_percentile() -> None:
    assert grouped_quantiles(np.zeros(3, np.int64), np.arange(4.0), [0.5]) is None
    assert grouped_pace(np.zeros(3, np.int64), np.arange(4.0), 1) is None


def test_empty_classes_around_change_nothing() -> None:
    counts = np.array([0, 0, 4, 0, 4, 0])
    edges = np.arange(7.0)
    assert grouped_quantiles(counts, edges, [0, 0.25, 0.75, 1]) == pytest.approx([2, 2.5, 4.5, 5])


@given(st.lists(st.integers(0, 30), min_size=1, max_size=20), st.integers(1, 8))
def test_grouped_pace_is_the_best_of_all_runs(n: list[int], width: int) -> None:
    counts, edges = np.array(n), np.arange(len(n) + 1.0)
    found = grouped_pace(counts, edges, width)
    best = max(sum(n[i : i + width]) for i in range(len(n)))
    assert (found.n if found else 0) == best
