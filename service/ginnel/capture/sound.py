"""Samples from a sound card, through PortAudio."""

from __future__ import annotations

import threading
from typing import Any, ClassVar

from ginnel.capture.links import Chunk
from ginnel.errors import CaptureError, SourceLostError
from ginnel.words import Channels, Sensor

_POLL_S = 0.02


class SoundLink:
    """An input of a sound card, 16 bit, found by a part of its name.

    PortAudio looks at the cards once; to see one that was plugged in again it must begin anew, which it
    only may while no input is open in this process.
    """

    _lock = threading.Lock()
    _n_open: ClassVar[int] = 0

    def __init__(self, device: str | None, sensor: Sensor, rate_hz: float) -> None:
        self._portaudio = _portaudio()
        self._device = device
        self._n_channels = 2 if sensor.channels is Channels.IQ else 1
        self._rate_hz = rate_hz
        self._stream: Any = None
        self._waiter = threading.Event()

    def open(self) -> None:
        """Open the input, with as much room for delay as the card gives."""
        sd = self._portaudio
        with SoundLink._lock:
            if SoundLink._n_open == 0:
                sd._terminate()
                sd._initialize()
            try:
                stream = sd.RawInputStream(
                    samplerate=self._rate_hz,
                    device=self._device,
                    channels=self._n_channels,
                    dtype="int16",
                    latency="high",
                )
                stream.start()
            except (sd.PortAudioError, ValueError) as exc:
                raise SourceLostError(f"sound input {self._device or '(any)'}: {_reason(exc)}") from exc
            self._stream = stream
            SoundLink._n_open += 1

    def read(self, timeout_s: float) -> Chunk:
        """Wait for samples; the card's own overruns are told."""
        waited_s = 0.0
        try:
            while (n_ready := self._stream.read_available) <= 0:
                if waited_s >= timeout_s or not self._stream.active:
                    break
                self._waiter.wait(_POLL_S)
                waited_s += _POLL_S
            if not self._stream.active:
                raise SourceLostError(f"sound input {self._device or '(any)'}: it has stopped")
            if n_ready <= 0:
                return Chunk()
            data, is_overrun = self._stream.read(n_ready)
        except self._portaudio.PortAudioError as exc:
            raise SourceLostError(f"sound input {self._device or '(any)'}: {_reason(exc)}") from exc
        return Chunk(bytes(data), is_overrun=bool(is_overrun))

    def close(self) -> None:
        """Close the input."""
        with SoundLink._lock:
            if self._stream is not None:
                self._stream.close(ignore_errors=True)
                self._stream = None
                SoundLink._n_open -= 1


def _portaudio() -> Any:
    try:
        import sounddevice
    except ModuleNotFoundError as exc:
        raise CaptureError('kind = "sound" needs sounddevice: pip install sounddevice') from exc
    except OSError as exc:  # the library that it wraps
        raise CaptureError(
            'kind = "sound" needs PortAudio: on Debian or Ubuntu, sudo apt install libportaudio2'
        ) from exc
    return sounddevice


def _reason(exc: Exception) -> str:
    return str(exc.args[0] if exc.args else exc).split("[PaErrorCode")[0].strip().rstrip(".")
