"""How well an input hears: levels, noise and lines against arithmetic by hand, and scipy's periodogram."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray
from scipy import signal, stats

from ginnel.doppler.health import (
    HUM_MULTIPLES,
    LAMP_MULTIPLES,
    decibels,
    noise_density,
    power_density,
    strongest_line,
)
from ginnel.doppler.input_meter import InputHealth, InputMeter
from ginnel.words import Channels, SampleArray, Sensor

RATE = 8000
MONO = Sensor(name="north")
IQ = Sensor(name="south", channels=Channels.IQ)


def seconds(duration_s: float) -> NDArray[np.float64]:
    return np.arange(round(duration_s * RATE)) / RATE


def noise(duration_s: float, rms: float, seed: int = 1) -> NDArray[np.float64]:
    return np.random.default_rng(seed).normal(0, rms, round(duration_s * RATE))


def tone(frequency_hz: float, amplitude: float, duration_s: float) -> NDArray[np.float64]:
    return amplitude * np.sin(2 * np.pi * frequency_hz * seconds(duration_s))


def measured(
    samples: NDArray[np.floating] | NDArray[np.complexfloating], sensor: Sensor = MONO
) -> InputHealth:
    meter = InputMeter(sensor, RATE)
    kind = np.complex64 if sensor.channels is Channels.IQ else np.float32
    meter.push(np.asarray(samples, kind))
    health = meter.take()
    assert health is not None
    return health


def test_a_sine_that_just_fits_is_0_dbfs() -> None:
    """AES17: the reference is the level of a full-scale sine, here half of it: -6.02 dB."""
    assert measured(tone(440, 0.5, 3) + 0.1).level_dbfs == pytest.approx(20 * math.log10(0.5), abs=1e-3)
    pair = 0.5 * np.exp(2j * np.pi * 440 * seconds(3)) + (0.1 - 0.2j)
    assert measured(pair, IQ).level_dbfs == pytest.approx(20 * math.log10(0.5), abs=1e-3)


def test_density_of_a_stretch_is_scipys_periodogram() -> None:
    """scipy's has a sine's power as A^2/2 where ours has A^2, hence the 2; its window is the same Hann."""
    samples = np.asarray(noise(1, 0.1) + tone(123, 0.2, 1), np.float32)
    _, expected = signal.periodogram(samples, RATE, window="hann", detrend=False)
    ours = power_density(samples, RATE, 1000)
    np.testing.assert_allclose(ours[1:], 2 * expected[1:1000], rtol=2e-4, atol=1e-12)


def test_both_signs_of_a_pair_are_added_up() -> None:
    pair = (noise(1, 0.1, 2) + 1j * noise(1, 0.1, 3)).astype(np.complex64)
    frequency_hz, expected = signal.periodogram(
        pair, RATE, window="hann", detrend=False, return_onesided=False
    )
    ours = power_density(pair, RATE, 1000)
    for k in (1, 7, 500, 999):
        both = expected[frequency_hz == k][0] + expected[frequency_hz == -k][0]
        assert ours[k] == pytest.approx(both, rel=1e-3)


def test_white_noise_has_its_own_density() -> None:
    """An rms of 0.01 is 2e-4 of a full-scale sine's power, over 4000 Hz: 5e-8 per Hz, -73.01 dB."""
    health = measured(noise(60, 0.01))
    assert health.noise_dbfs_hz == pytest.approx(-73.01, abs=0.4)
    pair = measured(noise(60, 0.01, 4) + 1j * noise(60, 0.01, 5), IQ)
    assert pair.noise_dbfs_hz == pytest.approx(-73.01, abs=0.4)


def test_the_median_of_exponential_noise_is_put_right() -> None:
    density = np.random.default_rng(6).exponential(3.0, 20_000)
    assert noise_density(density, 1.0, 0.0) == pytest.approx(3.0, rel=0.03)
    both = np.random.default_rng(7).exponential(1.5, (2, 20_000)).sum(axis=0)
    assert noise_density(both, 1.0, 0.0, 2) == pytest.approx(3.0, rel=0.03)
    assert stats.gamma.median(2) / 2 == pytest.approx(0.83917, abs=1e-5)


@pytest.mark.parametrize("mains_hz", [50.0, 60.0])
def test_lamp_and_hum_stand_above_the_noise_as_high_as_they_are(mains_hz: float) -> None:
    """A line of amplitude A has A^2 over 1.5 bins of 1 Hz: 1e-4 / 1.5 over 5e-8 is 31.2 dB."""
    sensor = Sensor(name="north", mains_hz=mains_hz)
    lamp = measured(noise(60, 0.01) + tone(2 * mains_hz, 0.01, 60), sensor)
    assert lamp.lamp is not None
    assert lamp.hum is not None
    assert lamp.lamp.frequency_hz == 2 * mains_hz
    assert lamp.lamp.over_noise_db == pytest.approx(31.2, abs=1.0)
    assert lamp.hum.over_noise_db < 4
    hum = measured(noise(60, 0.01) + tone(mains_hz, 0.01, 60), sensor)
    assert hum.hum is not None
    assert hum.lamp is not None
    assert (hum.hum.frequency_hz, hum.lamp.over_noise_db < 4) == (mains_hz, True)
    assert hum.hum.over_noise_db == pytest.approx(31.2, abs=1.0)


def test_mains_that_are_a_little_off_are_found() -> None:
    """EN 50160: 50 Hz to 1 % for 99.5 % of a year."""
    health = measured(noise(30, 0.01) + tone(2 * 50.45, 0.02, 30))
    assert health.lamp is not None
    assert health.lamp.frequency_hz == pytest.approx(101)
    assert health.lamp.over_noise_db > 30


def test_a_walker_who_crosses_the_line_is_no_lamp() -> None:
    sweep = signal.chirp(seconds(4), 60, 4, 140) * 0.1
    samples = noise(60, 0.01)
    samples[20 * RATE : 24 * RATE] += sweep
    health = measured(samples)
    assert health.lamp is not None
    assert health.lamp.over_noise_db < 6


def test_lines_beyond_the_band_are_not_looked_for() -> None:
    assert strongest_line(np.ones(60), 1.0, 50.0, LAMP_MULTIPLES) is None
    assert strongest_line(np.ones(200), 1.0, 16.0, HUM_MULTIPLES) is not None


def test_clipping_is_the_share_of_samples_at_full_scale() -> None:
    """A sine of twice full scale, cut off, spends two thirds of its time there: 2 acos(1/2) / pi."""
    health = measured(np.clip(tone(441.7, 2.0, 5), -1, 1))
    assert health.clipped_share == pytest.approx(2 / 3, abs=0.003)
    assert measured(tone(440, 0.99, 5)).clipped_share == 0


def test_a_constant_is_told_from_silence_and_so_is_one_dead_channel() -> None:
    assert measured(np.full(RATE, 0.25)).is_constant
    assert measured(np.zeros(RATE)).level_dbfs == -200
    assert not measured(noise(1, 1e-5)).is_constant
    assert measured(noise(1, 0.1) + 0j, IQ).is_constant


def test_nothing_heard_is_nothing_measured() -> None:
    meter = InputMeter(MONO, RATE)
    assert meter.take() is None
    meter.push(np.zeros(RATE - 1, np.float32))
    assert meter.take() is None
    meter.push(np.zeros(1, np.float32))
    health = meter.take()
    assert health is not None
    assert health.measured_s == 1.0
    assert meter.take() is None


@settings(max_examples=20, deadline=None)
@given(cuts=st.lists(st.integers(0, 7 * 300), max_size=12), is_iq=st.booleans())
def test_the_size_of_blocks_changes_nothing(cuts: list[int], is_iq: bool) -> None:
    sensor = Sensor(name="x", channels=Channels.IQ if is_iq else Channels.MONO, max_speed_mps=1.0)
    samples: SampleArray = np.random.default_rng(8).normal(0, 0.3, 7 * 300).astype(np.float32)
    if is_iq:
        samples = (samples + 1j * samples[::-1]).astype(np.complex64)
    whole, parts = InputMeter(sensor, 300.0), InputMeter(sensor, 300.0)
    whole.push(samples)
    for part in np.split(samples, sorted(cuts)):
        parts.push(part)
    assert whole.take() == parts.take()


def test_decibels_of_nothing_are_finite() -> None:
    assert (decibels(1.0), decibels(0.1), decibels(0.0)) == (0.0, -10.0, -200.0)
