"""What a WAV file says of itself: how many bytes it promises, and when it was recorded.

libsndfile quietly shortens a truncated file and does not hand on the broadcast extension, so the few
chunks that tell are read here. RIFF, RF64 and BW64 (64-bit sizes in ``ds64``: EBU Tech 3306), ``bext``
(EBU Tech 3285).
"""

from __future__ import annotations

import os
import struct
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import BinaryIO

from ginnel.errors import CaptureFormatError
from ginnel.times import to_us

_IN_DS64 = 0xFFFFFFFF
_BEXT_TIMES_AT = 256 + 32 + 32  # after description, originator and its reference


@dataclass(frozen=True, slots=True, kw_only=True)
class WavHeader:
    """The chunks that matter.

    ``bext_us`` is when the file begins by its broadcast extension: the origination date with the time
    reference (samples since midnight), or with the origination time where the reference is 0.
    """

    frame_bytes: int
    data_bytes: int
    bext_us: int | None


def is_wav(head: bytes) -> bool:
    """Tell whether a file that begins with these bytes is of the WAV family."""
    return head[:4] in (b"RIFF", b"RF64", b"BW64") and head[8:12] == b"WAVE"


def read_wav_header(path: Path) -> WavHeader:
    """Read a WAV file's chunks and check that all promised samples are there.

    Raises
    ------
    CaptureFormatError
        The file is truncated, or its chunks are not in order.
    """
    with path.open("rb") as file:
        size = os.fstat(file.fileno()).st_size
        file.seek(12)
        try:
            return _read_chunks(path, file, size)
        except struct.error as exc:
            raise CaptureFormatError(f"{path}: truncated within its header; copy it again") from exc


def _read_chunks(path: Path, file: BinaryIO, size: int) -> WavHeader:
    frame_bytes = rate_hz = 0
    data_bytes: int | None = None
    ds64_data = None
    bext = b""
    while file.tell() + 8 <= size:
        name, length = struct.unpack("<4sI", file.read(8))
        begin = file.tell()
        if name == b"ds64":
            _, ds64_data = struct.unpack("<QQ", file.read(16))
        elif name == b"fmt ":
            _, _, rate_hz, _, frame_bytes = struct.unpack("<HHIIH", file.read(14))
        elif name == b"bext":
            bext = file.read(min(length, 602))
        elif name == b"data":
            if length == _IN_DS64 and ds64_data is not None:
                length = ds64_data
            data_bytes = length
            _check_data(path, begin, length, size, frame_bytes)
        file.seek(begin + length + length % 2)
    if data_bytes is None or not frame_bytes:
        raise CaptureFormatError(f"{path}: no samples in it: the header ends before them; copy it again")
    return WavHeader(frame_bytes=frame_bytes, data_bytes=data_bytes, bext_us=_bext_us(bext, rate_hz))


def _check_data(path: Path, begin: int, length: int, size: int, frame_bytes: int) -> None:
    if not frame_bytes:
        raise CaptureFormatError(f"{path}: its samples come before their description; it is not a WAV file")
    present = size - begin
    if length > present:
        raise CaptureFormatError(
            f"{path}: truncated: the header promises {length // frame_bytes} samples, "
            f"{present // frame_bytes} are there; copy it again"
        )
    if length == 0 and present > 1:
        raise CaptureFormatError(
            f"{path}: the header promises no samples, yet {present} bytes follow: the recorder did not "
            "finish it; have a sound editor rewrite the header"
        )
    if length % frame_bytes:
        raise CaptureFormatError(f"{path}: ends in the middle of a sample: truncated; copy it again")


def _bext_us(bext: bytes, rate_hz: int) -> int | None:
    """When the broadcast extension says that the file begins (it knows no zone: UTC); None if it does not."""
    if len(bext) < _BEXT_TIMES_AT + 26 or not rate_hz:
        return None
    fields: tuple[bytes, bytes, int, int] = struct.unpack_from("<10s8sII", bext, _BEXT_TIMES_AT)
    date, clock, low, high = fields
    try:
        # The standard allows - _ : . and a blank between the parts.
        year, month, day = (int(part) for part in (date[:4], date[5:7], date[8:10]))
        moment = datetime(year, month, day, tzinfo=UTC)
        reference_samples = high << 32 | low
        if reference_samples:
            return to_us(moment) + round(reference_samples * 1_000_000 / rate_hz)
        hours, minutes, seconds = (int(part) for part in (clock[:2], clock[3:5], clock[6:8]))
        return to_us(moment + timedelta(hours=hours, minutes=minutes, seconds=seconds))
    except ValueError:  # left blank, or filled with something else: it tells nothing
        return None
