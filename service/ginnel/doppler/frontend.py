"""Samples to spectrogram, background and detections: the part of the chain that always runs.

Samples are re-cut once, here, into batches at absolute sample numbers; whatever follows sees whole
batches only, so the size of the blocks pushed in cannot change a bit of what comes out.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ginnel.doppler.background import Background
from ginnel.doppler.cfar import ca_multiplier
from ginnel.doppler.decimation import Decimator
from ginnel.doppler.frames import FramePlan, FrameStage, plan_frames
from ginnel.doppler.iq_balance import IqBalance
from ginnel.doppler.kinematics import hz_per_mps
from ginnel.words import Channels, FloatArray, SampleArray, Sensor

FRAMES_PER_BATCH = 32
#: The background is learnt for so long before the first frame is judged.
_PRIMING_S = 8.0
#: Noise alone detects one cell in so many: about one a minute for feet, sorted out by clustering.
CELL_FALSE_ALARM_RATE = 1e-4
#: Cells this far above the background serve the I/Q balance.
_BALANCE_RATIO = 30.0
#: A sample within this of full scale was clipped.
_CLIP_LEVEL = 0.999
#: A background below this power (full scale 1) is no module's noise: the input is dead.
DEAF_POWER = 1e-13
#: Rise of one frame, and of the median of a batch, that chance alone does not bring.
_FRAME_RISE, _BATCH_RISE = 1.5, 1.4
#: A gain step lifts all bins alike: the quartiles of their rise lie closer than this (chance alone: 1.4).
_EVEN_RATIO = 2.0
#: A rise like this over so many frames is a gain step or an input plugged in: strong movers splash
#: over all bins too, but less.
_STEP_RISE, _STEP_FRAMES = 4.0, 33


@dataclass(frozen=True, slots=True)
class SpectrumBatch:
    """Consecutive frames of one span.

    power : float32, shape (n_frames, n_bins); background : float32, shape (n_bins,), as known when
    they were judged; n_detected : cells of each frame that stand out, shape (n_frames,);
    is_clipped : shape (n_frames,).
    """

    first_frame_idx: int
    power: NDArray[np.float32]
    background: NDArray[np.float32]
    n_detected: NDArray[np.int64]
    is_clipped: NDArray[np.bool_]


class FrontEnd:
    """One span's samples in, batches of judged frames out."""

    def __init__(self, sensor: Sensor, sample_rate_hz: float) -> None:
        self.plan: FramePlan = plan_frames(sensor, sample_rate_hz)
        plan = self.plan
        self._is_iq = sensor.channels is Channels.IQ
        self._dtype = np.dtype(np.complex64 if self._is_iq else np.float32)
        self._hop_samples = plan.hop_len * plan.factor
        self._batch_samples = FRAMES_PER_BATCH * self._hop_samples
        self._pending: list[SampleArray] = []
        self._n_pending = 0
        self._n_samples = 0
        self._decimator = Decimator(plan.factor, self._dtype) if plan.factor > 1 else None
        self._frames = FrameStage(plan)
        self._balance = IqBalance()
        step_s = FRAMES_PER_BATCH / plan.frame_rate_hz
        self._background = Background(plan.n_bins, FRAMES_PER_BATCH, step_s)
        self._n_priming = round(_PRIMING_S / step_s)
        self._held: list[tuple[int, NDArray[np.float32], NDArray[np.bool_]]] | None = []
        self._n_frames = 0
        slowest_hz = 0.8 * sensor.min_speed_mps * hz_per_mps(sensor.carrier_hz)
        frequency_hz = np.abs(plan.frequency_hz)
        #: Bins that may hold a mover: away from the offset at 0 Hz and from what is too slow.
        self.watched: NDArray[np.bool_] = frequency_hz >= max(slowest_hz, 1.5 * plan.bin_hz)
        n_looks = max(1, round(_PRIMING_S * plan.frame_rate_hz))
        self._gate_ratio = ca_multiplier(n_looks, CELL_FALSE_ALARM_RATE)

    @property
    def background_power(self) -> NDArray[np.float32]:
        """Latest background, shape (n_bins,)."""
        return self._background.power

    def frame_centre_samples(self, frame_idx: float | FloatArray) -> float | FloatArray:
        """Input sample number at a frame's centre."""
        plan = self.plan
        delay = self._decimator.delay_samples if self._decimator else 0.0
        return (frame_idx * plan.hop_len + (plan.frame_len - 1) / 2) * plan.factor + delay

    def push(self, samples: SampleArray) -> list[SpectrumBatch]:
        """Take the next samples of the span, any number of them."""
        self._pending.append(np.asarray(samples, dtype=self._dtype))
        self._n_pending += len(samples)
        self._n_samples += len(samples)
        if self._n_pending < self._batch_samples:
            return []
        joined = np.concatenate(self._pending)
        out: list[SpectrumBatch] = []
        start = 0
        while start + self._batch_samples <= len(joined):
            out += self._take(joined[start : start + self._batch_samples])
            start += self._batch_samples
        self._pending, self._n_pending = [joined[start:]], len(joined) - start
        return out

    def finish(self) -> list[SpectrumBatch]:
        """End the span: frames wholly inside it are judged, the rest of the samples dropped."""
        rest = np.concatenate([*self._pending, np.zeros(2 * self._batch_samples, dtype=self._dtype)])
        n_whole = self._n_whole_frames()
        out: list[SpectrumBatch] = []
        start = 0
        while self._n_frames < n_whole:
            out += self._take(rest[start : start + self._batch_samples], n_whole)
            start += self._batch_samples
        self._pending, self._n_pending = [], 0
        return out + self._release()

    def _n_whole_frames(self) -> int:
        plan = self.plan
        n_decimated = self._n_samples // plan.factor
        if self._decimator:
            n_decimated -= round(2 * self._decimator.delay_samples + 1) // plan.factor - 1
        return max(0, (n_decimated - plan.frame_len) // plan.hop_len + 1)

    def _take(self, samples: SampleArray, n_whole: int | None = None) -> list[SpectrumBatch]:
        """One batch of samples to the frames that it completes."""
        clipped = self._clipped_frames(samples)
        if self._decimator:
            samples = self._decimator.push(samples)
        spectra = self._frames.push(samples)
        if n_whole is not None:
            spectra = spectra[: n_whole - self._n_frames]
        if len(spectra) == 0:
            return []
        first, self._n_frames = self._n_frames, self._n_frames + len(spectra)
        power = self._power(spectra)
        self._background.push(power, is_risen=self._is_risen(power))
        clipped = clipped[: len(spectra)]
        if self._held is None:
            return [self._judge(first, power, clipped)]
        self._held.append((first, power, clipped))
        return self._release() if len(self._held) >= self._n_priming else []

    def _release(self) -> list[SpectrumBatch]:
        """Judge the frames that were held until a background was known."""
        if self._held is None:
            return []
        self._background.renew()
        held, self._held = self._held, None
        return [self._judge(first, power, clipped) for first, power, clipped in held]

    def _power(self, spectra: NDArray[np.complex64]) -> NDArray[np.float32]:
        if self._is_iq:
            corrected = self._balance.correct(spectra)
            power = corrected.real**2 + corrected.imag**2
            noise = self._floored_background()
            moving = (power > _BALANCE_RATIO * noise * broadband_rise(power, noise)) & self.watched
            self._balance.learn(spectra, noise, moving)
            return power
        return spectra.real**2 + spectra.imag**2

    def _floored_background(self) -> NDArray[np.float32]:
        return np.maximum(self._background.power, np.float32(DEAF_POWER))

    def _is_risen(self, power: NDArray[np.float32]) -> bool:
        """Whether all bins at once, and all alike, stand above the background for most of a batch."""
        background = self._floored_background()
        rise = _quartile_rise(power, background)
        low, high = np.quantile(power.mean(axis=0) / background, (0.25, 0.75))
        return bool(np.median(rise) > _BATCH_RISE and high < _EVEN_RATIO * low)

    def _judge(self, first: int, power: NDArray[np.float32], clipped: NDArray[np.bool_]) -> SpectrumBatch:
        background = self._floored_background()
        stands_out = power > np.float32(self._gate_ratio) * background * broadband_rise(power, background)
        n_detected = np.count_nonzero(stands_out & self.watched, axis=1)
        return SpectrumBatch(first, power, background, n_detected, clipped)

    def _clipped_frames(self, samples: SampleArray) -> NDArray[np.bool_]:
        """Which of the frames that begin in this batch hold a clipped sample, nearly enough."""
        values = samples.view(np.float32).reshape(FRAMES_PER_BATCH, -1)
        peak = np.maximum(values.max(axis=1), -values.min(axis=1))
        return np.asarray(peak >= _CLIP_LEVEL)


def broadband_rise(power: FloatArray, background: FloatArray) -> FloatArray:
    """How far a frame's noise rises in all bins at once, as clicks and gain steps make it; >= 1.

    A frame's own rise counts from where chance alone would not bring it (1.5 for some forty bins);
    a large one that lasts is known better, and counts in full. Shape (n_frames, 1).
    """
    rise = _quartile_rise(power, background)
    padded = np.pad(rise, _STEP_FRAMES // 2, mode="edge") if len(rise) else np.zeros(_STEP_FRAMES)
    around = np.lib.stride_tricks.sliding_window_view(padded, _STEP_FRAMES)[: len(rise)]
    lasting = np.median(around, axis=1)
    rise = np.maximum(rise / _FRAME_RISE, np.where(lasting > _STEP_RISE, lasting, 1.0))
    return np.asarray(np.maximum(1.0, rise)[:, None], dtype=np.float32)


def _quartile_rise(power: FloatArray, background: FloatArray) -> FloatArray:
    """Noise of each frame over the background, from the first quartile over bins, shape (n_frames,).

    That of exponential noise is ln(4/3) of its mean; movers fill fewer than three bins in four.
    """
    ratio = power / background
    rank = ratio.shape[1] // 4
    return np.asarray(np.partition(ratio, rank, axis=1)[:, rank] / np.log(4 / 3))
