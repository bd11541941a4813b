"""The front end as a whole: false alarms, levels, timing, odd inputs, gain steps."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.signal import butter, sosfilt

from ginnel.doppler.frontend import (
    CELL_FALSE_ALARM_RATE,
    DEAF_POWER,
    FRAMES_PER_BATCH,
    FrontEnd,
    SpectrumBatch,
    broadband_rise,
)
from ginnel.words import Channels, Mounting, SampleArray, Sensor

CORRIDOR = Mounting(tilt_deg=15.0)
FEET = {channels: Sensor(name="s", channels=channels, mounting=CORRIDOR) for channels in Channels}
ROAD = Sensor(
    name="r",
    carrier_hz=24.125e9,
    min_speed_mps=2.0,
    max_speed_mps=60.0,
    mounting=Mounting(height_m=1.0, offset_m=4.0),
)


def noise(n: int, channels: Channels, rms: float = 0.01, seed: int = 1) -> SampleArray:
    rng = np.random.default_rng(seed)
    if channels is Channels.MONO:
        return (rms * rng.standard_normal(n)).astype(np.float32)
    return (rms * (rng.standard_normal(n) + 1j * rng.standard_normal(n))).astype(np.complex64)


def heard(sensor: Sensor, samples: SampleArray, rate_hz: float) -> tuple[FrontEnd, list[SpectrumBatch]]:
    front = FrontEnd(sensor, rate_hz)
    return front, front.push(samples) + front.finish()


def detections(front: FrontEnd, batches: list[SpectrumBatch]) -> tuple[int, int]:
    """How many watched cells stood out, of how many."""
    counts = np.concatenate([batch.n_detected for batch in batches])
    return int(counts.sum()), len(counts) * int(front.watched.sum())


@pytest.mark.parametrize("channels", list(Channels))
def test_feet_keep_the_false_alarm_rate_on_white_noise(channels: Channels) -> None:
    # Half an hour in three spans. Exponential cells at the stated rate; 1.6 allows for what the
    # background's own spread (3 %) does to a rate that falls by e^-9.2, and 4 standard errors for chance.
    found = total = 0
    for seed in range(3):
        front, batches = heard(FEET[channels], noise(600 * 2000, channels, seed=seed), 2000.0)
        some, of = detections(front, batches)
        found, total = found + some, total + of
    expected = CELL_FALSE_ALARM_RATE * total
    assert expected / 1.6 - 4 * np.sqrt(expected) < found < 1.6 * expected + 4 * np.sqrt(expected)


def test_roads_keep_the_false_alarm_rate_on_white_noise() -> None:
    front, batches = heard(ROAD, noise(120 * 44100, Channels.MONO), 44100.0)
    found, total = detections(front, batches)
    assert 1 / 1.6 < found / (CELL_FALSE_ALARM_RATE * total) < 1.6


@pytest.mark.parametrize("duration_s", [2.9, 3.0, 3.1, 5.8, 8.8, 14.5, 20.3])
def test_short_spans_keep_the_false_alarm_rate_too(duration_s: float) -> None:
    found = total = 0
    for seed in range(12):
        samples = noise(round(duration_s * 2000), Channels.MONO, seed=seed)
        some, of = detections(*heard(FEET[Channels.MONO], samples, 2000.0))
        found, total = found + some, total + of
    # The background of few steps is itself uncertain: allow ten times the rate.
    assert found <= 10 * CELL_FALSE_ALARM_RATE * total + 6


@pytest.mark.parametrize("channels", list(Channels))
def test_the_background_of_white_noise_is_its_variance(channels: Channels) -> None:
    front, batches = heard(FEET[channels], noise(300 * 2000, channels, rms=0.02), 2000.0)
    variance = 0.02**2 * (2 if channels is Channels.IQ else 1)
    # The decimator passes the share of the band that its output keeps: white noise keeps its density.
    factor = front.plan.factor
    assert batches[-1].background[front.watched].mean() * factor == pytest.approx(variance, rel=0.05)
    power = np.concatenate([batch.power for batch in batches])
    assert power[:, front.watched].mean() * factor == pytest.approx(variance, rel=0.02)


@pytest.mark.parametrize("rate_hz", [2000.0, 8000.0, 44100.0])
@pytest.mark.parametrize("channels", list(Channels))
def test_a_tone_burst_is_heard_when_and_where_it_sounds(channels: Channels, rate_hz: float) -> None:
    front = FrontEnd(FEET[channels], rate_hz)
    t = np.arange(round(14 * rate_hz)) / rate_hz
    tone = np.exp(2j * np.pi * 140.43 * t) * (np.abs(t - 11.237) < 0.5)  # 2 m/s at 10.525 GHz
    clean = noise(len(t), channels, rms=1e-4) + (tone if channels is Channels.IQ else tone.real)
    batches = front.push(clean.astype(np.complex64 if channels is Channels.IQ else np.float32))
    power = np.concatenate([batch.power for batch in batches + front.finish()])
    assert front.plan.frequency_hz[power.sum(axis=0).argmax()] == pytest.approx(140.43, abs=front.plan.bin_hz)
    total = power.sum(axis=1)
    centre_frame = float(total @ np.arange(len(total)) / total.sum())
    # A hop is 45 ms; the burst's middle must be met far better.
    assert float(front.frame_centre_samples(centre_frame)) / rate_hz == pytest.approx(11.237, abs=0.002)


@pytest.mark.parametrize("n", [0, 1, 100, 119, 120, 121, 1000, 3841, 19_999])
def test_every_frame_wholly_inside_the_span_is_judged_and_no_other(n: int) -> None:
    front, batches = heard(FEET[Channels.MONO], noise(n, Channels.MONO), 2000.0)
    plan = front.plan
    n_frames = sum(len(batch.power) for batch in batches)
    first_sample, last_sample = np.array(
        [front.frame_centre_samples(0), front.frame_centre_samples(n_frames - 1)]
    )
    reach = plan.frame_len * plan.factor / 2 + (12 * plan.factor if plan.factor > 1 else 0) / 2
    if n_frames:
        assert first_sample - reach >= -plan.factor
        assert last_sample + reach <= n + plan.factor
    else:
        assert n < 2 * reach + plan.factor
    assert last_sample + reach + plan.hop_len * plan.factor > n - plan.factor or not n_frames
    assert [batch.first_frame_idx for batch in batches] == np.cumsum(
        [0] + [len(batch.power) for batch in batches]
    )[:-1].tolist()


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize("value", [0.0, 0.25, -1.0])
def test_a_dead_input_detects_nothing(channels: Channels, value: float) -> None:
    dtype = np.complex64 if channels is Channels.IQ else np.float32
    front, batches = heard(FEET[channels], np.full(60 * 2000, value, dtype), 2000.0)
    assert detections(front, batches)[0] == 0
    assert all(np.isfinite(batch.power).all() and (batch.background >= DEAF_POWER).all() for batch in batches)


@pytest.mark.parametrize("channels", list(Channels))
@pytest.mark.parametrize(
    ("before", "after"), [(0.0, 0.01), (0.01, 0.1), (0.01, 0.03), (0.1, 0.01), (0.01, 0.0)]
)
def test_a_gain_step_is_settled_within_ten_seconds(channels: Channels, before: float, after: float) -> None:
    rms = np.where(np.arange(180 * 2000) < 100 * 2000, before, after)
    samples = (noise(180 * 2000, channels, rms=1.0) * rms).astype(
        np.complex64 if channels is Channels.IQ else np.float32
    )
    front, batches = heard(FEET[channels], samples, 2000.0)
    counts = np.concatenate([batch.n_detected for batch in batches])
    rate = front.plan.frame_rate_hz
    settled = counts[round(110 * rate) :]
    assert settled.sum() <= 4 * CELL_FALSE_ALARM_RATE * len(settled) * front.watched.sum() + 3
    assert np.isfinite(np.concatenate([batch.power for batch in batches])).all()


@pytest.mark.parametrize("channels", list(Channels))
def test_strong_movers_with_broad_limbs_are_no_gain_step(channels: Channels) -> None:
    """White noise below 2.2 m/s stands for several people's limbs: half the bins, for ten seconds."""
    rate_hz = 2000.0
    samples = noise(round(40 * rate_hz), channels)
    crowd = 10.0 * noise(len(samples), channels, seed=5)
    band = butter(6, [20.0, 150.0], "bandpass", fs=rate_hz, output="sos")
    talk = slice(round(20 * rate_hz), round(30 * rate_hz))
    samples[talk] = samples[talk] + sosfilt(band, crowd)[talk]
    front, batches = heard(FEET[channels], samples, rate_hz)
    quiet = np.median(batches[0].background)
    assert max(float(np.median(batch.background)) for batch in batches) < 2 * quiet
    assert max(float(batch.background[front.watched].max()) for batch in batches) < 4 * quiet


def test_a_click_raises_its_own_frames_only() -> None:
    samples = noise(40 * 2000, Channels.MONO)
    samples[30 * 2000] = 0.9
    front, batches = heard(FEET[Channels.MONO], samples, 2000.0)
    batch = next(
        b
        for b in batches
        if b.first_frame_idx <= 30 * front.plan.frame_rate_hz < b.first_frame_idx + FRAMES_PER_BATCH
    )
    rise = broadband_rise(batch.power, batch.background)[:, 0]
    assert rise.max() > 10
    assert np.count_nonzero(rise > 3) <= 3


def test_a_rise_that_lasts_counts_in_full() -> None:
    power = np.random.default_rng(2).standard_exponential((200, 40)).astype(np.float32)
    power[100:] *= 100
    rise = broadband_rise(power, np.ones(40, np.float32))[:, 0]
    assert np.median(rise[120:]) == pytest.approx(100, rel=0.15)
    assert np.median(rise[:80]) < 1.05


def test_a_line_is_no_rise() -> None:
    power = np.random.default_rng(1).standard_exponential((200, 40)).astype(np.float32)
    power[:, 10:20] *= 1000
    # A quarter of the bins full of line: the first quartile then lies a third up the noise's own, at
    # ln(3/2) of its mean, just below where a rise begins. It costs others less than 1 dB.
    rise = broadband_rise(power, np.ones(40, np.float32))
    assert np.median(rise) < 1.05
    assert rise.mean() < 1.26


def test_samples_at_full_scale_are_marked_clipped_and_others_are_not() -> None:
    samples = noise(40 * 2000, Channels.MONO)
    samples[30 * 2000 : 30 * 2000 + 5] = 1.0
    front, batches = heard(FEET[Channels.MONO], samples, 2000.0)
    is_clipped = np.concatenate([batch.is_clipped for batch in batches])
    at = np.nonzero(is_clipped)[0]
    assert 1 <= len(at) <= 3
    # Nearly enough: within two frames.
    assert (
        np.abs(np.asarray(front.frame_centre_samples(at.astype(np.float64))) - 30 * 2000).max()
        < 2.5 * front.plan.hop_len * front.plan.factor
    )
