"""Samples and times from SigMF recordings, through the sigmf package.

A recording's captures are its stretches: ``core:global_index`` counts samples that were dropped, and so
tells the holes; where it is absent, each capture's own ``core:datetime`` does.
"""

from __future__ import annotations

import hashlib
import json
import warnings
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np

from ginnel.capture.sound_files import check_channels
from ginnel.capture.starts import text_us
from ginnel.errors import CaptureFormatError
from ginnel.words import US_PER_S, Channels, SampleArray, Sensor

_UNREAD = ("core:header_bytes", "core:trailing_bytes", "core:metadata_only")
_SCAN_SAMPLES = 1 << 18


@dataclass(frozen=True, slots=True, kw_only=True)
class Stretch:
    """Samples without a hole: where they lie in the file, and when they begin after the first."""

    first_sample: int
    n_samples: int
    after_us: int


@dataclass(frozen=True, slots=True, kw_only=True)
class SigmfFile:
    """A SigMF recording, looked at but not kept open; ``path`` is its metadata file."""

    path: Path
    data_path: Path
    metadata: str
    channels: Channels
    swap_iq: bool
    sample_rate_hz: float
    n_samples: int
    stretches: tuple[Stretch, ...]
    header_us: int | None

    def check(self) -> None:
        """Read what the metadata cannot vouch for: the checksum, and floats that may not be finite."""
        global_info = json.loads(self.metadata)["global"]
        expected = global_info.get("core:sha512")
        if expected:
            with self.data_path.open("rb") as file:
                found = hashlib.file_digest(file, "sha512").hexdigest()
            if found != expected.lower():
                raise CaptureFormatError(
                    f"{self.data_path}: is not the data that {self.path.name} describes (checksum differs): "
                    "truncated or changed; copy it again"
                )
        if "f" in global_info["core:datatype"]:
            for _ in self.iter_samples(0, self.n_samples, _SCAN_SAMPLES):
                pass

    def iter_samples(self, first: int, n: int, block_samples: int) -> Iterator[SampleArray]:
        """Read samples first to first + n, in blocks."""
        import sigmf

        described = sigmf.SigMFFile(
            metadata=json.loads(self.metadata), data_file=str(self.data_path), skip_checksum=True
        )
        for begin in range(first, first + n, block_samples):
            count = min(block_samples, first + n - begin)
            try:
                values = described.read_samples(begin, count)
            except (OSError, ValueError) as exc:
                raise CaptureFormatError(
                    f"{self.data_path}: cannot be read on from sample {begin}: {exc}"
                ) from exc
            if not np.isfinite(values).all():
                bad = begin + int(np.argmin(np.isfinite(values.reshape(count, -1)).all(axis=1)))
                raise CaptureFormatError(
                    f"{self.data_path}: sample {bad} is no finite number; record it anew or cut it out"
                )
            yield self._as_samples(np.asarray(values))

    def _as_samples(self, values: Any) -> SampleArray:
        if self.channels is Channels.MONO:
            return np.asarray(values.reshape(-1), dtype=np.float32)
        if not np.iscomplexobj(values):  # two real channels, I and Q
            values = values[:, 0] + 1j * values[:, 1]
        if self.swap_iq:
            values = values.imag + 1j * values.real
        return np.asarray(values.reshape(-1), dtype=np.complex64)


def sigmf_paths(path: Path) -> tuple[Path, Path]:
    """Give metadata and data path of a recording from either."""
    return path.with_suffix(".sigmf-meta"), path.with_suffix(".sigmf-data")


def look_at_sigmf_file(path: Path, sensor: Sensor) -> SigmfFile:
    """Read a recording's metadata and check it against the sensor and against the data file's size.

    Raises
    ------
    CaptureFormatError
        The recording is not what it claims to be, or not what this sensor records.
    """
    from sigmf.error import SigMFError
    from sigmf.sigmffile import dtype_info

    meta_path, data_path = sigmf_paths(path)
    metadata = _read_metadata(meta_path)
    global_info, captures = metadata["global"], metadata["captures"]
    if "core:dataset" in global_info:
        data_path = meta_path.with_name(Path(str(global_info["core:dataset"])).name)
    for key in _UNREAD:
        if global_info.get(key) or any(capture.get(key) for capture in captures):
            raise CaptureFormatError(
                f"{meta_path}: {key} is not supported; convert it to a plain SigMF recording"
            )
    rate_hz = global_info.get("core:sample_rate")
    if not rate_hz:
        raise CaptureFormatError(f"{meta_path}: no core:sample_rate; add it")
    if not data_path.is_file():
        raise CaptureFormatError(f"{meta_path}: its data file {data_path.name} is not there; copy both")
    try:
        kind = dtype_info(global_info["core:datatype"])
    except SigMFError as exc:
        raise CaptureFormatError(f"{meta_path}: {exc}") from exc
    n_channels = int(global_info.get("core:num_channels", 1))
    if kind["is_complex"] and n_channels > 1:
        raise CaptureFormatError(f"{meta_path}: has {n_channels} I/Q channels; a sensor has one, split them")
    check_channels(meta_path, sensor, 2 if kind["is_complex"] else n_channels)
    size, frame_bytes = data_path.stat().st_size, kind["sample_size"] * n_channels
    if size % frame_bytes:
        raise CaptureFormatError(
            f"{data_path}: {size} bytes are no whole number of samples of {frame_bytes} bytes: truncated; "
            "copy it again"
        )
    n_samples = size // frame_bytes
    _check_promises(data_path, metadata, n_samples)
    return SigmfFile(
        path=meta_path,
        data_path=data_path,
        metadata=json.dumps(metadata),
        channels=sensor.channels,
        swap_iq=sensor.swap_iq,
        sample_rate_hz=float(rate_hz),
        n_samples=n_samples,
        stretches=_stretches(meta_path, captures, n_samples, float(rate_hz)),
        header_us=_capture_us(meta_path, captures[0]) if captures else None,
    )


def _read_metadata(path: Path) -> dict[str, Any]:
    import sigmf
    from jsonschema.exceptions import ValidationError
    from sigmf.error import SigMFError

    try:
        metadata = json.loads(path.read_text(encoding="utf-8"))
        described = sigmf.SigMFFile(metadata=metadata)
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # extensions of others are no concern here
            described.validate()
    except FileNotFoundError as exc:
        raise CaptureFormatError(f"{path}: is not there; a SigMF recording is two files, copy both") from exc
    except (ValueError, SigMFError, AttributeError, KeyError, TypeError) as exc:
        raise CaptureFormatError(f"{path}: is no SigMF metadata ({_first_line(exc)})") from exc
    except ValidationError as exc:
        raise CaptureFormatError(f"{path}: is no valid SigMF metadata ({exc.message})") from exc
    # As the package understood it, which is what was found valid: it fills in what is missing.
    return {
        "global": dict(described.get_global_info()),
        "captures": list(described.get_captures()),
        "annotations": list(described.get_annotations()),
    }


def _first_line(exc: Exception) -> str:
    return (str(exc).splitlines() or [type(exc).__name__])[0]


def _check_promises(data_path: Path, metadata: dict[str, Any], n_samples: int) -> None:
    """See whether captures and annotations point at samples that are not there."""
    promised = max(
        [int(capture["core:sample_start"]) + 1 for capture in metadata["captures"]]
        + [
            int(note["core:sample_start"]) + int(note.get("core:sample_count", 0))
            for note in metadata["annotations"]
        ],
        default=0,
    )
    if 0 < n_samples < promised:
        raise CaptureFormatError(
            f"{data_path}: truncated: the metadata speaks of {promised} samples, "
            f"{n_samples} are there; copy it again"
        )


def _capture_us(path: Path, capture: dict[str, Any]) -> int | None:
    text = capture.get("core:datetime")
    if text is None:
        return None
    moment_us = text_us(str(text))
    if moment_us is None:
        raise CaptureFormatError(f"{path}: core:datetime {text!r} is no RFC 3339 time")
    return moment_us


def _stretches(
    path: Path, captures: list[dict[str, Any]], n_samples: int, rate_hz: float
) -> tuple[Stretch, ...]:
    """Cut at the captures; those that follow on without a hole are one stretch."""
    if not captures:
        return (Stretch(first_sample=0, n_samples=n_samples, after_us=0),)
    starts = [int(capture["core:sample_start"]) for capture in captures]
    if any(b <= a for a, b in pairwise(starts)):
        raise CaptureFormatError(f"{path}: captures are not in the order of their samples")
    tolerance_us = 2 * US_PER_S / rate_hz
    ends = [*starts[1:], n_samples]
    found = [Stretch(first_sample=starts[0], n_samples=ends[0] - starts[0], after_us=0)]
    for number in range(1, len(captures)):
        last = found[-1]
        follows_us = last.after_us + round(last.n_samples * US_PER_S / rate_hz)
        after_us = _after_us(path, captures, number, rate_hz)
        if after_us is None:
            after_us = follows_us
        n = ends[number] - starts[number]
        if after_us < follows_us - tolerance_us:
            raise CaptureFormatError(f"{path}: capture {number} begins before the one before it has ended")
        if after_us <= follows_us + tolerance_us:
            found[-1] = Stretch(
                first_sample=last.first_sample, n_samples=last.n_samples + n, after_us=last.after_us
            )
        else:
            found.append(Stretch(first_sample=starts[number], n_samples=n, after_us=after_us))
    return tuple(found)


def _after_us(path: Path, captures: list[dict[str, Any]], number: int, rate_hz: float) -> int | None:
    """When a capture begins after the first one; None where nothing tells."""
    first, this = captures[0], captures[number]
    if "core:global_index" in this:
        origin = int(first.get("core:global_index", first["core:sample_start"]))
        return round((int(this["core:global_index"]) - origin) * US_PER_S / rate_hz)
    first_us, this_us = _capture_us(path, first), _capture_us(path, this)
    return None if first_us is None or this_us is None else this_us - first_us
