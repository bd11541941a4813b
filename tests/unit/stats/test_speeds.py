"""Speeds, against published spot-speed studies, the NIST percentile example and numpy."""

from __future__ import annotations

import statistics
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.stats import SpeedSummary, band_counts, quantiles, space_mean, summarise_speeds

# Iowa Handbook of Simplified Practice for Traffic Studies (CTRE, TR-455), Table 2: mph and vehicles.
IOWA = np.repeat(np.arange(15.0, 49.0, 3.0), [1, 2, 6, 12, 13, 20, 18, 14, 6, 6, 1, 1])

# NIST/SEMATECH e-Handbook 7.2.6.2: twelve resistivities, as in the tests of Apache Commons Math.
NIST = np.array(
    [
        95.1772,
        95.1567,
        95.1937,
        95.1959,
        95.1442,
        95.0610,
        95.1591,
        95.1195,
        95.1772,
        95.0925,
        95.1990,
        95.1682,
    ]
)

speeds = st.lists(st.floats(0.05, 60.0), min_size=1, max_size=40).map(np.array)


def test_iowa_spot_speed_study() -> None:
    summary = summarise_speeds(IOWA)
    assert summary.n == 100
    assert summary.mean_mps == pytest.approx(30.93, abs=0.005)
    assert summary.sd_mps == pytest.approx(6.3774, abs=5e-5)
    # of the raw speeds, the same by every definition of a percentile (recomputed with numpy)
    assert (summary.p15_mps, summary.p50_mps, summary.p85_mps) == (24, 30, 36)


def test_a_published_spot_speed_study_of_130_vehicles() -> None:
    # A published spot-speed table of 130 vehicles in classes of 5 km/h, here at their middles; sums by hand
    middles = np.repeat(np.arange(42.0, 113.0, 5.0), [5, 8, 12, 10, 15, 21, 16, 11, 10, 4, 5, 4, 5, 1, 3])
    summary = summarise_speeds(middles)
    assert summary.n == 130
    assert summary.mean_mps == pytest.approx(69.8846, abs=5e-5)  # published 69.9
    assert summary.sd_mps == pytest.approx(16.5171, abs=5e-5)
    assert summary.space_mean_mps == pytest.approx(66.1719, abs=5e-5)
    assert band_counts(middles, [60.0]).tolist() == [35, 95]  # published: 95 over 60 km/h


def test_nist_percentiles_by_type_7() -> None:
    # recomputed with numpy for Hyndman and Fan's type 7
    expected = [95.11005, 95.16365, 95.19447, 95.197295]
    assert quantiles(NIST, [0.15, 0.5, 0.85, 0.95]) == pytest.approx(expected, abs=1e-6)
    # the handbook's own answer, 95.1981 by p (N + 1), is type 6 and not what we give
    assert quantiles(NIST, [0.9])[0] == pytest.approx(95.19568, abs=1e-6)
    assert np.quantile(NIST, 0.9, method="weibull") == pytest.approx(95.1981, abs=5e-5)


@given(speeds, st.floats(0, 1))
def test_quantiles_agree_with_the_definition(
    values: np.ndarray[tuple[int], np.dtype[np.float64]], p: float
) -> None:
    """Hyndman and Fan (1996), definition 7, by hand."""
    ordered = sorted(values.tolist())
    position = p * (len(ordered) - 1)
    below = min(int(position), len(ordered) - 1)
    above = min(below + 1, len(ordered) - 1)
    by_hand = ordered[below] + (position - below) * (ordered[above] - ordered[below])
    assert quantiles(values, [p])[0] == pytest.approx(by_hand, rel=1e-12)


def test_wardrops_two_speeds() -> None:
    # Wardrop's two streams: 12 vehicles a minute at 10 m/s and 12 at 20 m/s; harmonic mean by hand
    speed_mps = np.repeat([10.0, 20.0], 12)
    summary = summarise_speeds(speed_mps)
    assert summary.mean_mps == pytest.approx(15.0)
    assert summary.space_mean_mps == pytest.approx(13.3333, abs=5e-5)
    # Wardrop (1952): time mean = space mean + spatial variance / space mean; 20 slow, 10 fast a km
    spatial = np.repeat([10.0, 20.0], [20, 10])
    assert summary.space_mean_mps is not None
    assert summary.space_mean_mps + np.var(spatial) / summary.space_mean_mps == pytest.approx(15.0, abs=1e-9)


@given(speeds)
def test_space_mean_is_the_harmonic_mean_and_never_above_the_time_mean(
    values: np.ndarray[tuple[int], np.dtype[np.float64]],
) -> None:
    assert space_mean(values) == pytest.approx(statistics.harmonic_mean(values.tolist()), rel=1e-9)
    assert space_mean(values) <= np.mean(values) * (1 + 1e-12)


@given(speeds)
def test_summary_agrees_with_the_standard_library(
    values: np.ndarray[tuple[int], np.dtype[np.float64]],
) -> None:
    summary = summarise_speeds(values)
    assert summary.mean_mps == pytest.approx(statistics.fmean(values.tolist()), rel=1e-9)
    assert summary.p50_mps == pytest.approx(statistics.median(values.tolist()), rel=1e-12)
    if len(values) > 1:
        assert summary.sd_mps == pytest.approx(statistics.stdev(values.tolist()), rel=1e-6, abs=1e-9)


def test_few_speeds_give_what_they_can() -> None:
    assert summarise_speeds(np.empty(0)) == SpeedSummary(n=0)
    assert summarise_speeds(np.array([np.nan])) == SpeedSummary(n=0)
    one = summarise_speeds(np.array([np.nan, 1.5]))
    assert (one.n, one.mean_mps, one.sd_mps, one.p15_mps, one.p95_mps) == (1, 1.5, None, 1.5, 1.5)


def test_a_standing_mover_makes_the_space_mean_zero() -> None:
    assert space_mean(np.array([0.0, 2.0])) == 0.0


@pytest.mark.parametrize("values", [[], [-1.0, 2.0], [np.nan, 1.0]])
def test_space_mean_refuses_nonsense(values: list[float]) -> None:
    with pytest.raises(ValueError, match="space_mean needs speeds"):
        space_mean(np.array(values, float))


def test_quantiles_of_nothing_are_refused() -> None:
    with pytest.raises(ValueError, match="at least one"):
        quantiles(np.empty(0), [0.5])


def test_bands_are_closed_below_and_open_above() -> None:
    assert band_counts(np.array([0.5, 0.4999, 1.0, 7.0, np.nan]), [0.5, 1.0]).tolist() == [1, 1, 2]
    assert band_counts(np.array([1.0, 2.0]), []).tolist() == [2]


@given(speeds, st.lists(st.floats(0.1, 50.0), max_size=6, unique=True).map(sorted))
def test_bands_hold_every_speed_once(
    values: np.ndarray[tuple[int], np.dtype[np.float64]], edges: list[float]
) -> None:
    bounds = [-np.inf, *edges, np.inf]
    by_hand = [int(np.sum((values >= low) & (values < high))) for low, high in pairwise(bounds)]
    assert band_counts(values, edges).tolist() == by_hand
