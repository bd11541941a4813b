"""Background: its statistics against scipy, what it takes in, what it leaves out, what it forgets."""

from __future__ import annotations

import numpy as np
import pytest
import scipy.stats

from ginnel.doppler.background import Background, quantile_of_mean
from ginnel.words import FloatArray

N_FRAMES = 32
STEP_S = 1.44  # 32 frames at 22.2 a second, as for feet
N_BINS = 40


def noise_steps(n_steps: int, seed: int = 1) -> FloatArray:
    """Exponential noise of mean 1, shape (n_steps, N_FRAMES, N_BINS)."""
    return np.random.default_rng(seed).standard_exponential((n_steps, N_FRAMES, N_BINS))


def learnt(steps: FloatArray) -> Background:
    background = Background(N_BINS, N_FRAMES, STEP_S)
    for step in steps:
        background.push(step)
    background.renew()
    return background


@pytest.mark.parametrize("n_looks", [8, 20, 32, 100])
@pytest.mark.parametrize("quantile", [0.05, 0.1, 0.25, 0.5])
def test_the_quantile_is_that_of_a_gamma_variable(quantile: float, n_looks: float) -> None:
    exact = scipy.stats.gamma.ppf(quantile, n_looks, scale=1 / n_looks)
    assert quantile_of_mean(quantile, n_looks) == pytest.approx(exact, rel=2e-3)


def test_nothing_is_known_at_first() -> None:
    background = Background(N_BINS, N_FRAMES, STEP_S)
    background.renew()
    assert np.isinf(background.power).all()


@pytest.mark.parametrize("n_steps", [3, 6, 20, 83, 200])
def test_noise_that_stays_is_learnt_without_bias(n_steps: int) -> None:
    power = np.concatenate([learnt(noise_steps(n_steps, seed)).power for seed in range(20)])
    assert power.mean() == pytest.approx(1.0, abs=0.03)
    if n_steps > 20:
        assert power.std() < 0.06


def test_the_background_is_renewed_every_four_seconds() -> None:
    background = Background(N_BINS, N_FRAMES, STEP_S)
    steps = noise_steps(3)
    background.push(steps[0])
    background.push(steps[1])
    assert np.isinf(background.power).all()
    background.push(steps[2])  # 3 * 1.44 s
    assert np.isfinite(background.power).all()


def test_the_spans_last_frames_are_too_few_to_learn_from() -> None:
    # One frame's power is exponential: as the least of some steps it would make the background a
    # tenth of what it is, and noise would stand out.
    background = learnt(noise_steps(2))
    before = background.power.copy()
    background.push(np.full((1, N_BINS), 1e-3))
    background.renew()
    np.testing.assert_array_equal(background.power, before)


@pytest.mark.parametrize("seed", range(3))
def test_somebody_walking_about_four_fifths_of_the_time_is_not_learnt(seed: int) -> None:
    rng = np.random.default_rng(seed)
    steps = noise_steps(250, seed)
    for step in range(250):
        if rng.random() < 0.8:
            # The line of a walker 20 dB over the noise, seven bins wide, wherever the speed puts it.
            first = rng.integers(0, N_BINS - 7)
            steps[step, :, first : first + 7] *= 100.0 * rng.lognormal(0, 1, (N_FRAMES, 1))
    # 1 dB is a factor of 1.26.
    assert learnt(steps).power.max() < 1.26


def test_a_bin_that_is_free_for_only_a_tenth_of_the_time_is_still_heard_through() -> None:
    steps = noise_steps(83)
    busy = np.arange(83) % 7 != 0  # free one step in seven
    steps[busy, :, 5] *= np.random.default_rng(3).lognormal(4, 1, (busy.sum(), 1))
    assert learnt(steps).power[5] < 1.6  # 2 dB


@pytest.mark.parametrize("level", [4.0, 10.0, 100.0])
def test_a_lamp_that_is_switched_on_is_taken_in_within_fifteen_seconds(level: float) -> None:
    steps = noise_steps(83 + 11)  # 11 steps are 15.8 s
    phases = np.random.default_rng(2).uniform(0, 2 * np.pi, (11, N_FRAMES))
    # A steady line and noise add as complex numbers.
    noise = np.sqrt(steps[83:, :, 9] / 2) * (1 + 1j)
    steps[83:, :, 9] = np.abs(noise + np.sqrt(level) * np.exp(1j * phases)) ** 2
    power = learnt(steps).power
    assert power[9] == pytest.approx(1 + level, rel=0.25)
    assert np.delete(power, 9).mean() == pytest.approx(1.0, abs=0.03)


def test_a_lamp_that_is_switched_off_is_forgotten_within_fifteen_seconds() -> None:
    steps = noise_steps(83 + 11)
    steps[:83, :, 9] += 100.0
    assert learnt(steps).power[9] < 1.6


def test_a_walker_who_nears_for_fifteen_seconds_is_not_taken_for_a_lamp() -> None:
    # 0.5 m/s from 12 m on to 4.5 m; level R^-4; the line stays in one bin.
    steps = noise_steps(83 + 11)
    range_m = 12.0 - 0.5 * STEP_S * np.arange(11)
    steps[83:, :, 9] *= (1 + 20.0 * (12.0 / range_m) ** 4)[:, None]
    assert learnt(steps).power[9] < 1.6


@pytest.mark.parametrize("seed", range(5))
def test_people_one_behind_the_other_keep_a_level_but_flicker_and_are_not_taken_in(seed: int) -> None:
    steps = noise_steps(83 + 11, seed=seed)
    steps[83:, :, 9] *= 30.0  # exponential still, as the echo of many parts is
    assert learnt(steps).power[9] < 1.6


def test_a_rise_of_all_bins_is_learnt_within_seven_seconds() -> None:
    background = learnt(noise_steps(83))
    for step in 100.0 * noise_steps(5, seed=9):  # 7.2 s
        background.push(step, is_risen=True)
    assert background.power.mean() == pytest.approx(100.0, rel=0.1)


def test_a_rise_that_does_not_last_is_not_learnt() -> None:
    background = learnt(noise_steps(83))
    for step, is_risen in zip(
        100.0 * noise_steps(6, seed=9), [True, True, False, True, True, False], strict=True
    ):
        background.push(step, is_risen=is_risen)
    background.renew()
    assert background.power.mean() == pytest.approx(1.0, abs=0.05)
