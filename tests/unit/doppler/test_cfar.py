"""CFAR multipliers: tables first, then Monte Carlo, then errors.

Formulas from memory (cell averaging: any radar text; ordered statistics: Rohling, IEEE Trans. AES-19,
1983); the tables were computed from them apart from this code and confirmed by Monte Carlo there.
N = 20, k = 15, multiplier 6.857 is printed by Richards, Fundamentals of Radar Signal Processing, 6.5.6.
"""

from __future__ import annotations

import numpy as np
import pytest

from ginnel.doppler.cfar import ca_multiplier, os_false_alarm_rate, os_multiplier

CA_N = (8, 16, 20, 24, 32, 50, 64)
CA = {
    1e-2: (6.2262, 5.3363, 5.1785, 5.0767, 4.9530, 4.8239, 4.7749),
    1e-3: (10.9710, 8.6388, 8.2508, 8.0045, 7.7100, 7.4077, 7.2943),
    1e-4: (17.2982, 12.4525, 11.6979, 11.2272, 10.6727, 10.1132, 9.9060),
    1e-6: (36.9873, 21.9420, 19.9052, 18.6787, 17.2776, 15.9128, 15.4200),
}
OS_N_K = ((8, 6), (16, 8), (16, 12), (20, 15), (24, 18), (32, 24), (50, 37))
OS = {
    1e-2: (5.8696, None, 4.4251, 4.1810, 4.0254, 3.8383, 3.7508),
    1e-3: (11.0859, 16.7233, 7.4214, 6.8554, 6.5024, 6.0863, 5.8317),
    1e-4: (18.7751, None, 11.0802, 9.9993, 9.3408, 8.5801, 8.0598),
    1e-6: (46.6973, None, 20.9542, 18.0043, 16.2933, 14.3985, 12.9926),
}


@pytest.mark.parametrize(
    ("rate", "n", "value"),
    [(rate, n, v) for rate, row in CA.items() for n, v in zip(CA_N, row, strict=True)],
)
def test_cell_averaging_multipliers_are_those_of_the_table(rate: float, n: int, value: float) -> None:
    assert ca_multiplier(n, rate) == pytest.approx(value, abs=6e-5)


@pytest.mark.parametrize("rate", list(CA))
def test_with_many_cells_the_multiplier_is_that_of_known_noise(rate: float) -> None:
    assert ca_multiplier(10**7, rate) == pytest.approx(-np.log(rate), rel=1e-5)


@pytest.mark.parametrize(
    ("rate", "n", "rank", "value"),
    [
        (rate, n, k, v)
        for rate, row in OS.items()
        for (n, k), v in zip(OS_N_K, row, strict=True)
        if v is not None
    ],
)
def test_ordered_statistic_multipliers_are_those_of_the_table(
    rate: float, n: int, rank: int, value: float
) -> None:
    assert os_multiplier(n, rank, rate) == pytest.approx(value, abs=6e-5)


def test_the_textbook_multiplier_has_a_false_alarm_rate_of_one_in_a_thousand() -> None:
    assert os_false_alarm_rate(20, 15, 6.857) == pytest.approx(9.9872e-4, rel=1e-4)


@pytest.mark.parametrize(("n", "rate"), [(16, 1e-2), (16, 1e-3), (32, 1e-3)])
def test_cell_averaging_keeps_its_rate_on_exponential_noise(n: int, rate: float) -> None:
    rng = np.random.default_rng(71)
    n_trials = 400_000
    reference = rng.standard_gamma(n, n_trials) / n  # the mean of n exponential cells
    hits = np.mean(rng.standard_exponential(n_trials) > ca_multiplier(n, rate) * reference)
    assert abs(hits - rate) < 4 * np.sqrt(rate * (1 - rate) / n_trials)


@pytest.mark.parametrize(("n", "rank", "rate"), [(16, 12, 1e-2), (24, 18, 1e-3)])
def test_ordered_statistics_keep_their_rate_on_exponential_noise(n: int, rank: int, rate: float) -> None:
    rng = np.random.default_rng(72)
    n_trials = 200_000
    cells = rng.standard_exponential((n_trials, n), dtype=np.float32)
    reference = np.partition(cells, rank - 1, axis=1)[:, rank - 1]
    hits = np.mean(rng.standard_exponential(n_trials) > os_multiplier(n, rank, rate) * reference)
    assert abs(hits - rate) < 4 * np.sqrt(rate * (1 - rate) / n_trials)


@pytest.mark.parametrize("rate", [0.0, 1.0, -0.1, 2.0])
def test_rates_that_are_no_probability_are_refused(rate: float) -> None:
    with pytest.raises(ValueError, match="false_alarm_rate"):
        ca_multiplier(16, rate)
    with pytest.raises(ValueError, match="false_alarm_rate"):
        os_multiplier(16, 12, rate)


def test_no_reference_cells_are_refused() -> None:
    with pytest.raises(ValueError, match="n_reference"):
        ca_multiplier(0, 1e-3)


@pytest.mark.parametrize("rank", [0, 17])
def test_ranks_outside_the_cells_are_refused(rank: int) -> None:
    with pytest.raises(ValueError, match="rank"):
        os_multiplier(16, rank, 1e-3)
