"""Evidence and fit: noise speaks against any mover; a planted one is found again, with its error.

Cells are drawn from nearly the model that the fit assumes: exponential with mean 1 + P (Itakura and
Saito's form of the likelihood, from memory). Only the limbs differ: here they reach over all bins, so
that the fit has some 2 % of speed and 3 dB of level to put up with.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from ginnel.doppler.frames import plan_frames
from ginnel.passages.cluster import Cluster
from ginnel.passages.coarse import find_starts
from ginnel.passages.explain import explain
from ginnel.passages.fit import gather, log_prior, refine, score_of, weigh
from ginnel.passages.mover import Mover, line_of, line_shape
from ginnel.passages.site import N_ZONES, NEPERS_PER_DB, Site
from ginnel.words import Channels, Mounting, Sensor

N_FRAMES = 500  # 22 seconds


def site_of(channels: Channels) -> Site:
    sensor = Sensor(name="s", channels=channels, mounting=Mounting(height_m=2.4, tilt_deg=15.0))
    return Site(sensor, plan_frames(sensor, 8000.0))


SITES = {channels: site_of(channels) for channels in Channels}


def mover_of(level_db: float = 25.0, sign: int = 1, speed_mps: float = 1.3, crossed_s: float = 13.0) -> Mover:
    return Mover(
        crossed_s=crossed_s,
        speed_mps=speed_mps,
        sign=sign,
        offset_m=SITES[Channels.MONO].offset_m,
        level=np.full(N_ZONES, level_db * NEPERS_PER_DB),
    )


def cluster_of(site: Site, movers: list[Mover], seed: int) -> Cluster:
    n_bins = site.plan.n_bins
    watched = np.abs(site.plan.frequency_hz) >= 1.5 * site.plan.bin_hz
    bins = np.broadcast_to(np.arange(n_bins) + site.plan.first_bin_idx, (N_FRAMES, n_bins))
    mean = np.ones((N_FRAMES, n_bins))
    times_s = np.arange(N_FRAMES) / site.frame_rate_hz
    for mover in movers:
        mean += line_shape(site, line_of(site, mover, times_s), bins)
    power = mean * np.random.default_rng(seed).standard_exponential(mean.shape)
    return Cluster(site, 0, power.astype(np.float32), np.ones(n_bins, np.float32), watched)


@pytest.mark.parametrize("channels", list(Channels))
def test_noise_is_whitened_to_mean_one(channels: Channels) -> None:
    cluster = cluster_of(SITES[channels], [], seed=1)
    # The clutter of each frame's own strongest cell lowers it by some percent.
    assert cluster.whitened.mean() == pytest.approx(0.9, abs=0.1)
    assert cluster.reference.max() <= 1.0


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("level_db", [5.0, 10.0, 25.0])
def test_noise_alone_speaks_against_any_mover(channels: Channels, level_db: float) -> None:
    # E[w P / (1 + P) - ln(1 + P)] < 0 for E[w] <= 1, since ln(1 + P) > P / (1 + P).
    for seed in range(5):
        cluster = cluster_of(SITES[channels], [], seed)
        mover = mover_of(level_db)
        cells = gather(cluster, mover)
        assert cells is not None
        assert weigh(cluster, cells).raw.sum() < 0
        assert score_of(cluster, mover) < 0


@pytest.mark.parametrize("channels", list(Channels))
def test_noise_alone_is_explained_by_nobody(channels: Channels) -> None:
    for seed in range(3):
        assert explain(cluster_of(SITES[channels], [], seed)) == []


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("sign", [1, -1])
def test_a_planted_mover_speaks_for_itself_and_against_all_unlike_it(channels: Channels, sign: int) -> None:
    truth = mover_of(sign=sign, crossed_s=11.0)
    cluster = cluster_of(SITES[channels], [truth], seed=2)
    score = score_of(cluster, truth)
    assert score > 100
    for other in (
        replace(truth, crossed_s=12.5),
        replace(truth, crossed_s=9.5),
        replace(truth, speed_mps=1.6),
        replace(truth, speed_mps=1.05),
        replace(truth, sign=-sign),
        replace(truth, level=truth.level + 9 * NEPERS_PER_DB),
    ):
        assert score_of(cluster, other) < score - 25


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("sign", [1, -1])
def test_a_planted_mover_is_recovered_with_the_error_that_the_fit_states(
    channels: Channels, sign: int
) -> None:
    site = SITES[channels]
    truth = mover_of(level_db=22.0, sign=sign, crossed_s=11.0)
    errors, stated = [], []
    for seed in range(20):
        fit = refine(
            cluster_of(site, [truth], seed),
            replace(truth, crossed_s=11.2, speed_mps=1.24, level=truth.level - 3 * NEPERS_PER_DB),
            n_outer=3,
            n_inner=8,
        )
        assert fit is not None
        mean_drift = fit.mover.drift[1:4].mean()
        errors.append([fit.mover.crossed_s - 11.0, fit.mover.speed_mps * (1 + mean_drift) - 1.3])
        stated.append(np.sqrt(np.diag(fit.covariance)[:2]))
    mean, spread = np.mean(errors, axis=0), np.std(errors, axis=0)
    assert abs(mean[0]) < 0.05
    assert abs(mean[1]) < 0.03  # of 1.3
    # Speed and drift trade off, so the speed alone is stated wider; both by less than a factor of four.
    ratio = np.mean(stated, axis=0) / spread
    assert (ratio > 0.5).all()
    assert (ratio < 5).all()


@pytest.mark.parametrize("channels", list(Channels))
def test_starts_are_found_near_every_planted_mover(channels: Channels) -> None:
    movers = [mover_of(crossed_s=8.0), mover_of(sign=-1, speed_mps=1.0, crossed_s=10.0)]
    starts = [start for _, start in find_starts(cluster_of(SITES[channels], movers, seed=3))]
    for truth in movers:
        assert any(
            start.sign == truth.sign
            and abs(start.crossed_s - truth.crossed_s) < 0.5
            and abs(start.speed_mps / truth.speed_mps - 1) < 0.1
            for start in starts
        )


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("seed", range(3))
def test_planted_movers_are_explained_one_by_one(channels: Channels, seed: int) -> None:
    movers = [
        mover_of(crossed_s=8.0),
        mover_of(sign=-1, speed_mps=1.0, crossed_s=10.0),
        mover_of(crossed_s=14.0, speed_mps=1.5),
    ]
    found = explain(cluster_of(SITES[channels], movers, seed))
    assert [one.mover.sign for one in found] == [1, -1, 1]
    for one, truth in zip(found, movers, strict=True):
        # One channel hears the second and the third at one frequency for a while: 0.6 s were measured.
        assert one.mover.crossed_s == pytest.approx(
            truth.crossed_s, abs=0.25 if channels is Channels.IQ else 0.8
        )
        assert one.mean_speed_mps == pytest.approx(truth.speed_mps, rel=0.05)
        assert one.fit.score > one.rival_score + 25


def test_what_is_set_aside_can_be_taken_back() -> None:
    cluster = cluster_of(SITES[Channels.MONO], [mover_of()], seed=4)
    before = cluster.whitened.copy()
    power = np.random.default_rng(5).standard_exponential(before.shape)
    cluster.set_aside(power)
    np.testing.assert_allclose(cluster.whitened, before / (1 + power))
    cluster.take_back(power)
    np.testing.assert_allclose(cluster.whitened, before, rtol=1e-9)


def test_the_prior_is_greatest_for_what_the_mounting_leads_to_expect() -> None:
    cluster = cluster_of(SITES[Channels.MONO], [], seed=6)
    usual = mover_of()
    assert log_prior(cluster, usual) == pytest.approx(0.0, abs=1e-9)
    odd_level = np.array([0.0, 6.0, 0.0, -6.0, 0.0]) * NEPERS_PER_DB
    for odd in (
        replace(usual, offset_m=usual.offset_m * 1.5),
        replace(usual, drift=np.full(N_ZONES, 0.1)),
        replace(usual, level=usual.level + odd_level),
    ):
        assert log_prior(cluster, odd) < -1


def test_a_mover_that_was_never_there_to_be_seen_is_not_scored() -> None:
    cluster = cluster_of(SITES[Channels.MONO], [], seed=7)
    assert gather(cluster, mover_of(crossed_s=500.0)) is None
    assert refine(cluster, mover_of(crossed_s=500.0)) is None
