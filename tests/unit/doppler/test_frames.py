"""Frames: the window's figures of merit, power, scipy as reference transform, the choice of length.

Window figures: Harris, Proc. IEEE 66(1), 1978, Table 1, with more digits worked out apart from this code.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
import scipy.signal

from ginnel.doppler.frames import FramePlan, FrameStage, hann, plan_frames
from ginnel.words import Channels, FloatArray, Mounting, SampleArray, Sensor


def plan_of(channels: Channels, frame_len: int = 120, n_edge_bins: int = 0) -> FramePlan:
    """All bins but the outermost ``n_edge_bins``, no decimation, 1000 Hz."""
    last = frame_len // 2 - 1 - n_edge_bins
    first = -last if channels is Channels.IQ else 0
    return FramePlan(
        factor=1,
        frame_len=frame_len,
        hop_len=frame_len // 2,
        sample_rate_hz=1000.0,
        channels=channels,
        first_bin_idx=first,
        n_bins=last - first + 1,
    )


def noise(n: int, channels: Channels, seed: int = 3) -> SampleArray:
    rng = np.random.default_rng(seed)
    if channels is Channels.MONO:
        return rng.standard_normal(n).astype(np.float32)
    return (rng.standard_normal(n) + 1j * rng.standard_normal(n)).astype(np.complex64)


def spectrum_db(offset_bins: FloatArray, n: int = 1024) -> FloatArray:
    """Power of a tone so far from a bin, against one on the bin."""
    t = np.arange(n)
    found = np.abs(np.exp(2j * np.pi * np.outer(offset_bins, t) / n) @ hann(n)) / hann(n).sum()
    return np.asarray(20 * np.log10(found))


def test_the_window_is_harris_hann() -> None:
    window = hann(1024)
    assert window.mean() == pytest.approx(0.5, abs=1e-12)  # coherent gain
    assert 1024 * np.sum(window**2) / np.sum(window) ** 2 == pytest.approx(1.5, abs=1e-12)  # noise bandwidth
    assert -spectrum_db(np.array([0.5]))[0] == pytest.approx(1.4236, abs=1e-3)  # scalloping
    assert spectrum_db(np.linspace(2.05, 6, 2000)).max() == pytest.approx(-31.47, abs=0.1)  # side lobe
    width = np.linspace(0.5, 1.0, 5001)
    assert 2 * np.interp(3.0103, -spectrum_db(width), width) == pytest.approx(1.439, abs=2e-3)


def test_the_window_is_scipys_periodic_one() -> None:
    np.testing.assert_allclose(hann(120), scipy.signal.windows.hann(120, sym=False), atol=1e-15)


@pytest.mark.parametrize("channels", list(Channels))
def test_spectra_are_those_of_scipys_short_time_transform(channels: Channels) -> None:
    plan = plan_of(channels)
    samples = noise(3000, channels)
    found = FrameStage(plan).push(samples)
    transform = scipy.signal.ShortTimeFFT(
        scipy.signal.windows.hann(120, sym=False),
        hop=60,
        fs=1000.0,
        fft_mode="onesided" if channels is Channels.MONO else "centered",
        phase_shift=None,
    )
    # Slices of scipy's are centred at multiples of the hop; the first whole one is centred at 60.
    slices = transform.stft(samples.astype(np.complex128 if channels is Channels.IQ else np.float64), p0=1)
    slices = slices[:, : len(found)].T / np.sqrt(np.sum(hann(120) ** 2))
    first = 0 if channels is Channels.MONO else int(np.searchsorted(transform.f, plan.frequency_hz[0] - 1e-9))
    np.testing.assert_allclose(found, slices[:, first : first + plan.n_bins], atol=2e-5)
    np.testing.assert_allclose(plan.frequency_hz, transform.f[first : first + plan.n_bins], atol=1e-9)


@pytest.mark.parametrize("channels", list(Channels))
def test_white_noise_of_variance_s_has_power_s_in_every_bin(channels: Channels) -> None:
    power = np.abs(FrameStage(plan_of(channels, 48)).push(noise(400_000, channels))) ** 2
    variance = 1.0 if channels is Channels.MONO else 2.0
    n_looks = 0.947 * len(power)  # Hann frames at half overlap, Welch 1967
    inner = power[:, 2:] if channels is Channels.MONO else power  # near 0 Hz a real signal's sides meet
    deviation = inner.mean(axis=0) / variance - 1
    assert np.abs(deviation).max() < 4.5 / np.sqrt(n_looks)
    assert abs(deviation.mean()) < 0.01


def test_parseval_holds_for_every_frame() -> None:
    # sum |x w|^2 = mean over all bins of |X|^2: all of a real frame's bins but the Nyquist one are kept,
    # and that is made empty.
    plan = plan_of(Channels.MONO, 120)
    samples = noise(1200, Channels.MONO)
    cuts = np.lib.stride_tricks.sliding_window_view(samples.astype(np.float64), 120)[::60] * hann(120)
    alternate = np.where(np.arange(120) % 2, -1.0, 1.0)
    nyquist = (cuts @ alternate) ** 2
    power = np.abs(FrameStage(plan).push(samples).astype(np.complex128)) ** 2 * np.sum(hann(120) ** 2)
    total = power[:, 0] + 2 * power[:, 1:].sum(axis=1) + nyquist
    np.testing.assert_allclose(total / 120, np.sum(cuts**2, axis=1), rtol=2e-6)


@pytest.mark.parametrize("at_bin", [17.0, 17.37, 17.5])
def test_a_tone_of_amplitude_a_has_power_half_a_squared(at_bin: float) -> None:
    plan = plan_of(Channels.MONO, 120)
    t = np.arange(1200) / 120
    power = np.abs(FrameStage(plan).push((0.3 * np.cos(2 * np.pi * at_bin * t)).astype(np.float32))) ** 2
    # 2 sum |X|^2 / (N sum w^2) over the line is A^2 / 2 = 0.045; the stage divides by sum w^2 itself.
    assert 2 * power[:, 10:26].sum(axis=1) / 120 == pytest.approx(0.045, rel=1e-3)


def test_approaching_is_the_positive_side_of_an_iq_pair() -> None:
    plan = plan_of(Channels.IQ, 120, n_edge_bins=20)
    t = np.arange(1200) / 1000
    power = np.abs(FrameStage(plan).push(np.exp(2j * np.pi * 200 * t).astype(np.complex64))) ** 2
    assert plan.frequency_hz[power.mean(axis=0).argmax()] == pytest.approx(200, abs=0.01)
    assert len(plan.frequency_hz) == plan.n_bins == 79


@pytest.mark.parametrize("cuts", [[0, 7, 119, 120, 121, 500, 3000], [0, 60, 60, 61, 3000]])
def test_the_cuts_of_samples_change_no_bit(cuts: list[int]) -> None:
    samples = noise(3000, Channels.MONO)
    stage = FrameStage(plan_of(Channels.MONO))
    parts = np.concatenate([stage.push(samples[a:b]) for a, b in pairwise(cuts)])
    np.testing.assert_array_equal(parts, FrameStage(plan_of(Channels.MONO)).push(samples))


def test_less_than_a_frame_gives_none() -> None:
    stage = FrameStage(plan_of(Channels.MONO))
    assert stage.push(noise(119, Channels.MONO)).shape == (0, 59 + 1)
    assert stage.push(noise(1, Channels.MONO)).shape == (1, 60)


def test_feet_get_frames_of_80_to_160_ms_and_roads_about_32() -> None:
    corridor = Sensor(name="s", mounting=Mounting(tilt_deg=15.0))
    road = Sensor(
        name="s", carrier_hz=24.125e9, max_speed_mps=60.0, mounting=Mounting(height_m=1.0, offset_m=4.0)
    )
    assert (
        0.08 <= plan_frames(corridor, 8000.0).frame_len * plan_frames(corridor, 8000.0).factor / 8000 <= 0.16
    )
    assert plan_frames(road, 44100.0).frame_len / 44100 == pytest.approx(0.032, rel=0.05)


@pytest.mark.parametrize("rate_hz", [1000.0, 2000.0, 4000.0, 8000.0, 44100.0, 192_000.0])
@pytest.mark.parametrize("channels", list(Channels))
def test_the_plan_covers_the_speeds_at_any_rate(rate_hz: float, channels: Channels) -> None:
    plan = plan_frames(Sensor(name="s", channels=channels), rate_hz)
    assert plan.hop_len * 2 == plan.frame_len
    # 5 m/s at 10.525 GHz is 351.1 Hz.
    assert plan.frequency_hz[-1] > 351.1
    assert plan.frequency_hz[-1] < rate_hz / plan.factor / 2
    low = -plan.frequency_hz[-1] if channels is Channels.IQ else 0.0
    assert plan.frequency_hz[0] == pytest.approx(low)
