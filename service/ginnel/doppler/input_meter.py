"""A meter on an input that is always on: a few sums a second, one short spectrum every five.

Samples are cut into segments of one second at absolute sample numbers, so the size of the blocks
pushed in changes nothing.
"""

from __future__ import annotations

from collections import deque
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ginnel.doppler.health import (
    CLIP_LEVEL,
    HUM_MULTIPLES,
    LAMP_MULTIPLES,
    Line,
    decibels,
    noise_density,
    power_density,
    strongest_line,
)
from ginnel.doppler.kinematics import hz_per_mps
from ginnel.words import Channels, FloatArray, SampleArray, Sensor

_SPECTRUM_EVERY = 5  # segments of a second
#: Spectra kept between two looks; older ones give way.
_SPECTRA = 24


@dataclass(frozen=True, slots=True, kw_only=True)
class InputHealth:
    """What an input was like over some whole seconds; see `HealthSample` for the measures."""

    measured_s: float
    level_dbfs: float
    clipped_share: float
    is_constant: bool  # a channel never changed
    noise_dbfs_hz: float | None  # None where no spectrum was taken
    hum: Line | None
    lamp: Line | None


@dataclass(frozen=True, slots=True)
class _Segment:
    power: float
    n_clipped: int
    least: NDArray[np.float32]  # of each channel, shape (n_channels,)
    most: NDArray[np.float32]


class InputMeter:
    """Measures the samples of one span; ``take`` tells what they were like since the last time."""

    def __init__(self, sensor: Sensor, sample_rate_hz: float) -> None:
        self._mains_hz = sensor.mains_hz
        self._slowest_hz = sensor.min_speed_mps * hz_per_mps(sensor.carrier_hz)
        self._sample_rate_hz = sample_rate_hz
        self._dtype = np.dtype(np.complex64 if sensor.channels is Channels.IQ else np.float32)
        self._segment_len = max(2, round(sample_rate_hz))
        self._bin_hz = sample_rate_hz / self._segment_len
        highest_hz = max(
            sensor.max_speed_mps * hz_per_mps(sensor.carrier_hz), (LAMP_MULTIPLES[-1] + 1) * sensor.mains_hz
        )
        self._n_bins = min(self._segment_len // 2, round(highest_hz / self._bin_hz))
        self._pending: SampleArray = np.empty(0, self._dtype)
        self._n_segments = 0
        self._taken: list[_Segment] = []
        self._spectra: deque[FloatArray] = deque(maxlen=_SPECTRA)

    def push(self, samples: SampleArray) -> None:
        """Take the next samples, any number of them."""
        joined = np.concatenate([self._pending, np.asarray(samples, self._dtype)])
        n_whole = len(joined) // self._segment_len
        for i in range(n_whole):
            self._measure(joined[i * self._segment_len : (i + 1) * self._segment_len])
        self._pending = joined[n_whole * self._segment_len :].copy()

    def take(self) -> InputHealth | None:
        """What whole seconds since the last time were like; None where there was none."""
        segments, self._taken = self._taken, []
        spectra, self._spectra = list(self._spectra), deque(maxlen=_SPECTRA)
        if not segments:
            return None
        least = np.min([one.least for one in segments], axis=0)
        most = np.max([one.most for one in segments], axis=0)
        n_values = len(segments) * self._segment_len * len(least)
        noise_dbfs_hz = hum = lamp = None
        if spectra:
            density, n_signs = np.median(spectra, axis=0), len(least)
            noise_dbfs_hz = decibels(noise_density(density, self._bin_hz, self._slowest_hz, n_signs))
            hum = strongest_line(density, self._bin_hz, self._mains_hz, HUM_MULTIPLES, n_signs)
            lamp = strongest_line(density, self._bin_hz, self._mains_hz, LAMP_MULTIPLES, n_signs)
        return InputHealth(
            measured_s=len(segments) * self._segment_len / self._sample_rate_hz,
            level_dbfs=decibels(float(np.mean([one.power for one in segments]))),
            clipped_share=sum(one.n_clipped for one in segments) / n_values,
            is_constant=bool(np.any(least == most)),
            noise_dbfs_hz=noise_dbfs_hz,
            hum=hum,
            lamp=lamp,
        )

    def _measure(self, segment: SampleArray) -> None:
        values = segment.view(np.float32).reshape(self._segment_len, -1)
        least, most = values.min(axis=0), values.max(axis=0)
        is_clipped = max(most.max(), -least.min()) >= CLIP_LEVEL
        n_clipped = int(np.count_nonzero(np.abs(values) >= CLIP_LEVEL)) if is_clipped else 0
        moving = segment - segment.mean()
        power = float(np.vdot(moving, moving).real) / self._segment_len
        if values.shape[1] == 1:
            power *= 2  # a full-scale sine's 1/2 counts as 1
        if self._n_segments % _SPECTRUM_EVERY == 0:
            self._spectra.append(power_density(moving, self._sample_rate_hz, self._n_bins))
        self._taken.append(_Segment(power, n_clipped, least, most))
        self._n_segments += 1
