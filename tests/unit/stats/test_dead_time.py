"""Dead time: both models of Knoll (from memory), recomputed, and against simulation."""

from __future__ import annotations

import numpy as np
import pytest

from ginnel.stats.dead_time import counted_rate, true_rate

# true rate a minute, dead time in s, counted a minute: not extending, extending
TABLE = [
    (3, 2.0, 2.7273, 2.7145),
    (10, 1.5, 8.0, 7.7880),
    (20, 3.0, 10.0, 7.3576),
    (30, 1.5, 17.1429, 14.1710),
]


@pytest.mark.parametrize(("per_min", "dead_s", "fixed", "extending"), TABLE)
def test_counted_rates(per_min: float, dead_s: float, fixed: float, extending: float) -> None:
    rate = np.array([per_min / 60])
    assert counted_rate(rate, dead_s, extending=False)[0] * 60 == pytest.approx(fixed, abs=5e-5)
    assert counted_rate(rate, dead_s, extending=True)[0] * 60 == pytest.approx(extending, abs=5e-5)


def test_the_most_that_an_extending_counter_counts() -> None:
    # by calculus: 1 / (e tau), at a true rate of 1 / tau
    rates = np.linspace(0.01, 3, 3000)
    counted = counted_rate(rates, 2.0, extending=True)
    assert rates[np.argmax(counted)] == pytest.approx(0.5, abs=0.002)
    assert counted.max() == pytest.approx(1 / (np.e * 2), rel=1e-5)


def test_a_simulated_stream_is_counted_as_the_models_say() -> None:
    rng = np.random.default_rng(8)
    gaps = rng.exponential(2.0, 200_000)  # 30 a minute
    extending = np.mean(gaps > 1.5) / 2.0  # only after a gap longer than the dead time
    assert extending == pytest.approx(counted_rate(np.array([0.5]), 1.5, extending=True)[0], rel=0.01)
    times, last, n = np.cumsum(gaps), -np.inf, 0
    for at in times:
        if at - last >= 1.5:
            last, n = at, n + 1
    assert n / times[-1] == pytest.approx(counted_rate(np.array([0.5]), 1.5, extending=False)[0], rel=0.01)


def test_the_true_rate_is_found_again() -> None:
    assert true_rate(np.array([0.2]), 2.0)[0] == pytest.approx(1 / 3)
    rates = np.array([0.0, 0.1, 5.0])
    np.testing.assert_allclose(true_rate(counted_rate(rates, 1.5, extending=False), 1.5), rates)
    with pytest.raises(ValueError, match=r"no more than 0\.5"):
        true_rate(np.array([0.5]), 2.0)
