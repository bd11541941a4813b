"""From mixer to file: noise, I/Q errors, amplifier, gain steps, clipping, quantising."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from ginnel.words import FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class IqError:
    """How far an I/Q pair is from perfect; the drifts are per hour.

    Q is heard with gain ``gain_db`` against I and its phase is ``phase_deg`` off 90 degrees.
    """

    gain_db: float = 0.0
    phase_deg: float = 0.0
    gain_drift_db: float = 0.0
    phase_drift_deg: float = 0.0

    def apply(self, field: NDArray[Any], times_s: FloatArray) -> NDArray[Any]:
        """I + jQ as the imperfect pair gives it."""
        hours = times_s / 3600.0
        gain = 10 ** ((self.gain_db + self.gain_drift_db * hours) / 20)
        phase = np.deg2rad(self.phase_deg + self.phase_drift_deg * hours)
        return np.asarray(field.real + 1j * gain * (field.imag * np.cos(phase) + field.real * np.sin(phase)))


@dataclass(frozen=True, slots=True, kw_only=True)
class Receiver:
    """The electronics behind the antenna.

    Attributes
    ----------
    flicker_corner_hz : below this, noise rises as 1/f over the white noise (0: white only)
    iq : the pair's errors
    offset, offset_drift : offset of both channels at the start, and what it gains an hour, full scale
    gain_steps : (time s, dB) pairs: the gain changes by so much from then on
    clip_level : the amplifier's rails, full scale
    bits : of the converter; None leaves the samples as they are
    dead_s : (begin, end) pairs in which nothing is plugged in and all samples are 0
    """

    flicker_corner_hz: float = 0.0
    iq: IqError = IqError()
    offset: complex = 0.0
    offset_drift: complex = 0.0
    gain_steps: tuple[tuple[float, float], ...] = ()
    clip_level: float = 1.0
    bits: int | None = 16
    dead_s: tuple[tuple[float, float], ...] = ()

    def convert(self, wave: NDArray[Any], times_s: FloatArray) -> NDArray[Any]:
        """Gain, rails and converter, for real or complex samples."""
        for step_s, step_db in self.gain_steps:
            wave = wave * np.where(times_s >= step_s, 10 ** (step_db / 20), 1.0)
        offset = self.offset + self.offset_drift * times_s / 3600.0
        wave = wave + (offset if np.iscomplexobj(wave) else offset.real)
        if not np.iscomplexobj(wave):
            return self._channel(wave, times_s)
        return self._channel(np.real(wave), times_s) + 1j * self._channel(np.imag(wave), times_s)

    def _channel(self, wave: NDArray[Any], times_s: FloatArray) -> FloatArray:
        wave = np.clip(wave, -self.clip_level, self.clip_level)
        if self.bits is not None:
            top = 2.0 ** (self.bits - 1)
            wave = np.clip(np.rint(wave * top), -top, top - 1) / top
        for begin_s, end_s in self.dead_s:
            wave = np.where((times_s >= begin_s) & (times_s < end_s), 0.0, wave)
        return np.asarray(wave)


def flicker_sections(corner_hz: float, sample_rate_hz: float) -> FloatArray:
    """Second-order sections that make white noise into white plus about 1/f below the corner.

    Poles and zeros alternate evenly over frequency on a log scale (a well-known approximation of half a
    pole, from memory), within 0.5 dB from 0.05 Hz to the corner; far above it the gain is 1.
    """
    ratio = 10 ** (1 / 1.5)
    n = max(1, round(np.log(corner_hz / 0.02) / np.log(ratio)))
    zeros_hz = corner_hz / ratio ** (0.25 + np.arange(n))
    rows = []
    for zero_hz in zeros_hz:
        zero, pole = np.exp(-2 * np.pi * np.array([zero_hz, zero_hz / np.sqrt(ratio)]) / sample_rate_hz)
        gain = (1 + pole) / (1 + zero)
        rows.append([gain, -gain * zero, 0.0, 1.0, -pole, 0.0])
    return np.array(rows)


def highpass_sections(corner_hz: float, sample_rate_hz: float) -> FloatArray:
    """Return the amplifier's coupling: a first-order high-pass."""
    from scipy.signal import butter

    return np.asarray(butter(1, corner_hz, "highpass", fs=sample_rate_hz, output="sos"))


def streaming(sections: FloatArray | None, *, is_iq: bool) -> Callable[[NDArray[Any]], NDArray[Any]]:
    """Return a filter that keeps its state between calls; None passes everything."""
    if sections is None:
        return lambda wave: wave
    from scipy.signal import sosfilt

    state = np.zeros((len(sections), 2), dtype=np.complex128 if is_iq else np.float64)

    def push(wave: NDArray[Any]) -> NDArray[Any]:
        nonlocal state
        out, state = sosfilt(sections, wave, zi=state)
        return np.asarray(out)

    return push
