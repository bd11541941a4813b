"""The mean speed of people whose pace changes, and the smoother behind it.

The smoother's outside reference is Gaussian process regression with the same kernel, solved densely
(Rasmussen and Williams, Gaussian Processes for Machine Learning, 2006, equations 2.25 and 2.26).
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel import sim
from ginnel.chain import Chain
from ginnel.passages.pace import Smoother
from ginnel.words import US_PER_S, Channels, Mounting, Passage, Sensor, Story

RATE_HZ = 2000.0
SLOW, QUICK = (0.1, 2.0), (0.12, 0.1)


@given(st.integers(2, 60), st.integers(0, 2**32 - 1))
def test_the_smoother_is_gaussian_process_regression(n: int, seed: int) -> None:
    rng = np.random.default_rng(seed)
    t_s = np.cumsum(rng.uniform(0.02, 0.6, n))
    information = rng.gamma(0.5, 100.0, n) + 1e-3
    seen = rng.normal(0.0, 0.2, n)
    smoother = Smoother(t_s, SLOW, QUICK)
    apart_s = np.abs(t_s[:, None] - t_s)
    kernel = sum(sd**2 * np.exp(-apart_s / tau_s) for sd, tau_s in (SLOW, QUICK))
    gain = kernel @ np.linalg.inv(kernel + np.diag(1.0 / information))
    np.testing.assert_allclose(smoother.mean(information, information * seen), gain @ seen, atol=1e-9)
    share = rng.uniform(0.0, 1.0, n)
    share /= share.sum()
    covariance = kernel - gain @ kernel
    assert smoother.se_of(share, information) == pytest.approx(np.sqrt(share @ covariance @ share), rel=1e-6)


def passage_of(channels: Channels, x_m: np.ndarray, times_s: np.ndarray, seed: int) -> Passage:
    sensor = Sensor(name="s", channels=channels, mounting=Mounting(height_m=2.4, tilt_deg=15.0))
    scene = sim.Scene(
        sensor=sensor,
        duration_s=float(times_s[-1]) + 10.0,
        sample_rate_hz=RATE_HZ,
        movers=(sim.follow(times_s, x_m, np.zeros_like(x_m), smoothing_s=0.2, seed=seed),),
        ends_at_sensor=True,
        seed=seed,
    )
    chain = Chain(sensor, RATE_HZ, 0)
    found = [one for block in scene.blocks(1 << 16) for one in chain.push(block)] + chain.finish()
    (passage,) = [one for one in found if one.story is Story.PASSAGE]
    return passage


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("seed", range(2))
@pytest.mark.parametrize("change", [-0.15, 0.15])
def test_who_walks_faster_or_slower_on_the_way_gets_the_mean_of_it(
    channels: Channels, seed: int, change: float
) -> None:
    """Someone leaves with a speed that changes by 15 % either way on 12 m, at a steady rate."""
    times_s = np.arange(12.0, 24.0, 1 / 16)
    speed_mps = 1.3 * (1.0 + change * (2 * (times_s - 16.0) / 8.0).clip(-1, 1))
    x_m = np.cumsum(speed_mps) / 16 - 1.3 * 1.0
    passage = passage_of(channels, x_m, times_s, seed)
    heard = (times_s >= passage.started_us / US_PER_S) & (times_s <= passage.ended_us / US_PER_S)
    truth_mps = float(speed_mps[heard & (x_m > 1.0)].mean())
    assert passage.speed_mps is not None
    assert passage.speed_se_mps is not None
    assert passage.speed_mps == pytest.approx(truth_mps, rel=0.04)
    assert abs(passage.speed_mps - truth_mps) < 3 * passage.speed_se_mps
