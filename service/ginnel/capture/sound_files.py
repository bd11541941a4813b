"""Samples from WAV, RF64, FLAC and raw PCM files, through libsndfile."""

from __future__ import annotations

import os
import re
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from ginnel.capture.starts import text_us
from ginnel.capture.wav_header import is_wav, read_wav_header
from ginnel.errors import CaptureFormatError
from ginnel.words import Channels, SampleArray, Sensor

_FLOATS = ("FLOAT", "DOUBLE")
_SUBTYPES = ("PCM_S8", "PCM_U8", "PCM_16", "PCM_24", "PCM_32", *_FLOATS)
_RAW_SUBTYPES = {
    "i8": "PCM_S8",
    "u8": "PCM_U8",
    "i16": "PCM_16",
    "i24": "PCM_24",
    "i32": "PCM_32",
    "f32": "FLOAT",
    "f64": "DOUBLE",
}
_SCAN_SAMPLES = 1 << 18
_MOST_SAMPLES = 1 << 48  # libsndfile answers 2^63 - 1 where a FLAC header leaves the length open


@dataclass(frozen=True, slots=True, kw_only=True)
class RawFormat:
    """What a raw PCM file cannot say of itself.

    ``sample_type`` is spelt as in SigMF: ``ri16_le`` (one channel), ``ci16_le`` (I/Q), with i8, u8, i16, i24,
    i32, f32 or f64 in the middle, and ``_le`` or ``_be`` for more than one byte.
    """

    sample_type: str
    sample_rate_hz: float

    def options(self) -> dict[str, Any]:
        """Give the type as libsndfile wants it.

        Raises
        ------
        CaptureFormatError
            The type is none of those above.
        """
        found = re.fullmatch(r"([rc])?([iuf]\d+)(?:_(le|be))?", self.sample_type.lower())
        if found is None or found[2] not in _RAW_SUBTYPES:
            known = ", ".join(_RAW_SUBTYPES)
            raise CaptureFormatError(
                f"raw sample type {self.sample_type!r} is not known: r or c, one of {known}, "
                "then _le or _be, as in ri16_le"
            )
        return {
            "format": "RAW",
            "subtype": _RAW_SUBTYPES[found[2]],
            "endian": "BIG" if found[3] == "be" else "LITTLE",
            "channels": 2 if found[1] == "c" else 1,
            "samplerate": round(self.sample_rate_hz),
        }

    @property
    def frame_bytes(self) -> int:
        """Bytes of one sample of all channels."""
        channels = int(self.options()["channels"])
        return int("".join(filter(str.isdigit, self.sample_type))) // 8 * channels


@dataclass(frozen=True, slots=True, kw_only=True)
class SoundFile:
    """A file that libsndfile reads, looked at but not kept open."""

    path: Path
    channels: Channels
    swap_iq: bool
    raw: RawFormat | None
    sample_rate_hz: float
    n_samples: int
    subtype: str
    container: str
    header_us: int | None

    def check(self) -> None:
        """Read what the header cannot vouch for: compressed samples, and floats that may not be finite."""
        if self.container == "FLAC" or self.subtype in _FLOATS:
            for _ in self.iter_samples(0, self.n_samples, _SCAN_SAMPLES):
                pass

    def iter_samples(self, first: int, n: int, block_samples: int) -> Iterator[SampleArray]:
        """Read samples first to first + n, in blocks."""
        import soundfile

        done = 0
        try:
            with _open(self.path, self.raw) as file:
                file.seek(first)
                while done < n:
                    frames = file.read(min(block_samples, n - done), dtype="float32", always_2d=True)
                    if not len(frames):
                        raise CaptureFormatError(
                            f"{self.path}: truncated: {self.n_samples} samples promised, it ends after "
                            f"{first + done}; copy it again"
                        )
                    if self.subtype in _FLOATS and not np.isfinite(frames).all():
                        bad = first + done + int(np.argmin(np.isfinite(frames).all(axis=1)))
                        raise CaptureFormatError(
                            f"{self.path}: sample {bad} is no finite number; record it anew or cut it out"
                        )
                    done += len(frames)
                    yield _as_samples(frames, self.channels, self.swap_iq)
        except soundfile.LibsndfileError as exc:
            raise CaptureFormatError(
                f"{self.path}: damaged or truncated after sample {first + done} ({_reason(exc)}); "
                "copy it again"
            ) from exc


def look_at_sound_file(path: Path, sensor: Sensor, raw: RawFormat | None) -> SoundFile:
    """Read a file's header and check it against the sensor and against the file's size.

    Raises
    ------
    CaptureFormatError
        The file is not what it claims to be, or not what this sensor records.
    """
    import soundfile

    header_us = None
    if raw is not None:
        if path.stat().st_size % raw.frame_bytes:
            raise CaptureFormatError(
                f"{path}: {path.stat().st_size} bytes are no whole number of {raw.sample_type} samples "
                f"({raw.frame_bytes} bytes each): truncated, or of another type"
            )
    else:
        with path.open("rb") as opened:
            head = opened.read(12)
        if is_wav(head):
            header_us = read_wav_header(path).bext_us
        elif head[:4] != b"fLaC":
            raise CaptureFormatError(
                f"{path}: is no WAV or FLAC file (it begins with {head[:8]!r}); raw PCM needs "
                "--raw-format and --rate"
            )
    try:
        with _open(path, raw) as file:
            found = SoundFile(
                path=path,
                channels=sensor.channels,
                swap_iq=sensor.swap_iq,
                raw=raw,
                sample_rate_hz=raw.sample_rate_hz if raw else float(file.samplerate),
                n_samples=int(file.frames),
                subtype=str(file.subtype),
                container=str(file.format),
                header_us=text_us(file.date) if header_us is None and len(file.date) > 10 else header_us,
            )
            n_channels = int(file.channels)
            if found.n_samples > _MOST_SAMPLES:
                raise CaptureFormatError(
                    f"{path}: does not say how many samples it holds, as if written into a pipe; "
                    "encode it anew"
                )
            if found.container == "FLAC" and found.n_samples > 0:
                _check_last_sample(path, file, found.n_samples)
    except soundfile.LibsndfileError as exc:
        raise CaptureFormatError(f"{path}: cannot be read ({_reason(exc)}); record or copy it again") from exc
    if found.subtype not in _SUBTYPES:
        raise CaptureFormatError(
            f"{path}: samples are {found.subtype}; convert it to 8 to 32 bit integers or float"
        )
    check_channels(path, sensor, n_channels)
    return found


def check_channels(path: Path, sensor: Sensor, n_channels: int) -> None:
    """Refuse a file whose channels are not the sensor's."""
    wanted = 2 if sensor.channels is Channels.IQ else 1
    if n_channels != wanted:
        raise CaptureFormatError(
            f"{path}: has {n_channels} channel{'' if n_channels == 1 else 's'}, but sensor {sensor.name} is "
            f"{sensor.channels.value} and needs {wanted}; mend channels in the settings, or pick another file"
        )


def _check_last_sample(path: Path, file: Any, n_samples: int) -> None:
    """Compressed files promise samples, not bytes: see whether the last one is there."""
    import soundfile

    try:
        file.seek(n_samples - 1)
        is_there = len(file.read(1)) == 1
    except soundfile.LibsndfileError:
        is_there = False
    if not is_there:
        raise CaptureFormatError(
            f"{path}: truncated: the header promises {n_samples} samples, the last is not "
            "there; copy it again"
        )


def _open(path: Path, raw: RawFormat | None) -> Any:
    import soundfile

    # as bytes, since a name on disk need not be UTF-8
    return soundfile.SoundFile(os.fsencode(path), "r", **(raw.options() if raw else {}))


def _reason(exc: Exception) -> str:
    return str(getattr(exc, "error_string", exc)).strip().rstrip(".")


def _as_samples(frames: SampleArray, channels: Channels, swap_iq: bool) -> SampleArray:
    """Turn columns into float32, or I + jQ as complex64."""
    if channels is Channels.MONO:
        return frames[:, 0]
    pair = np.ascontiguousarray(frames[:, ::-1] if swap_iq else frames)
    return pair.view(np.complex64)[:, 0]
