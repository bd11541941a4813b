"""Short-time Fourier frames cut at absolute sample numbers."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import scipy.fft

from ginnel.doppler.decimation import decimation_factor
from ginnel.doppler.kinematics import hz_per_mps, nearest_distance_m, wavelength_m
from ginnel.words import Channels, FloatArray, SampleArray, Sensor

#: Room above the fastest speed for the skirt of its line.
_BAND_MARGIN = 1.2
#: A frame may last this long: shorter blurs slow speeds, longer smears the bend near the sensor.
_FRAME_MIN_S, _FRAME_MAX_S = 0.032, 0.128


@dataclass(frozen=True, slots=True, kw_only=True)
class FramePlan:
    """How samples of one rate become frames; frame j covers decimated samples j hop .. j hop + length."""

    factor: int
    frame_len: int
    hop_len: int
    sample_rate_hz: float
    channels: Channels
    first_bin_idx: int
    n_bins: int

    @property
    def frame_rate_hz(self) -> float:
        """Frames a second."""
        return self.sample_rate_hz / (self.factor * self.hop_len)

    @property
    def bin_hz(self) -> float:
        """Distance between bins, Hz."""
        return self.sample_rate_hz / (self.factor * self.frame_len)

    @property
    def frequency_hz(self) -> FloatArray:
        """Frequency of every kept bin, ascending, shape (n_bins,); negative ones for I/Q only."""
        return (self.first_bin_idx + np.arange(self.n_bins)) * self.bin_hz


def plan_frames(sensor: Sensor, sample_rate_hz: float) -> FramePlan:
    """Frame length from the bend that a typical mover makes beside the sensor.

    The Doppler line bends at up to 2 v^2 / (d lambda) Hz/s; a frame of T seconds resolves 1 / T,
    so both blurs are equal at T = sqrt(d lambda / 2) / v. A third of the fastest speed is typical.
    """
    typical_mps = sensor.max_speed_mps / 3
    offset_m = max(1.0, nearest_distance_m(sensor.mounting))
    frame_s = math.sqrt(offset_m * wavelength_m(sensor.carrier_hz) / 2) / typical_mps
    frame_s = min(max(frame_s, _FRAME_MIN_S), _FRAME_MAX_S)
    band_hz = _BAND_MARGIN * sensor.max_speed_mps * hz_per_mps(sensor.carrier_hz)
    factor = decimation_factor(sample_rate_hz, band_hz)
    rate_hz = sample_rate_hz / factor
    hop_len = scipy.fft.next_fast_len(max(4, round(frame_s * rate_hz / 2)), real=True)
    frame_len = 2 * hop_len
    last_bin = min(int(band_hz * frame_len / rate_hz), frame_len // 2 - 1)
    first_bin = -last_bin if sensor.channels is Channels.IQ else 0
    return FramePlan(
        factor=factor,
        frame_len=frame_len,
        hop_len=hop_len,
        sample_rate_hz=sample_rate_hz,
        channels=sensor.channels,
        first_bin_idx=first_bin,
        n_bins=last_bin - first_bin + 1,
    )


def hann(n: int) -> FloatArray:
    """Periodic Hann window, shape (n,); noise bandwidth 1.5 bins."""
    return 0.5 - 0.5 * np.cos(2 * np.pi * np.arange(n) / n)


class FrameStage:
    """Windowed spectra of the kept bins, scaled so that white noise of variance s gives power s."""

    def __init__(self, plan: FramePlan) -> None:
        self._plan = plan
        window = hann(plan.frame_len)
        self._window = (window / np.sqrt(np.sum(window**2))).astype(np.float32)
        dtype = np.complex64 if plan.channels is Channels.IQ else np.float32
        self._memory: SampleArray = np.zeros((0,), dtype=dtype)

    def push(self, samples: SampleArray) -> np.ndarray[tuple[int, int], np.dtype[np.complex64]]:
        """Spectra of all frames that are now whole, shape (n_frames, n_bins), complex64."""
        plan = self._plan
        samples = np.concatenate([self._memory, samples])
        n_frames = max(0, (len(samples) - plan.frame_len) // plan.hop_len + 1)
        self._memory = samples[n_frames * plan.hop_len :]
        if n_frames == 0:
            return np.zeros((0, plan.n_bins), dtype=np.complex64)
        cuts = np.lib.stride_tricks.sliding_window_view(samples, plan.frame_len)
        frames = cuts[:: plan.hop_len][:n_frames] * self._window
        if plan.channels is Channels.MONO:
            spectra = scipy.fft.rfft(frames, axis=-1, overwrite_x=True)
            return np.asarray(spectra[:, : plan.n_bins])
        spectra = scipy.fft.fft(frames, axis=-1, overwrite_x=True)
        last_bin = plan.n_bins // 2
        return np.concatenate([spectra[:, -last_bin:], spectra[:, : last_bin + 1]], axis=1)
