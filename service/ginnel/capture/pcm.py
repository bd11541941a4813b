"""Raw PCM bytes to samples."""

from __future__ import annotations

import re
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from ginnel.errors import CaptureFormatError
from ginnel.words import Channels, SampleArray, Sensor

_TYPE = re.compile(r"([rc])(?=i8$|u8$|i16_|i24_|i32_|f32_|f64_)([iuf])(\d+)(?:_(le|be))?")


class PcmDecoder:
    """Bytes of any number in, whole samples out; full scale is 1.0, as libsndfile has it.

    Parameters
    ----------
    sample_type : spelt as in SigMF: ``ri16_le`` (one channel), ``ci16_le`` (I/Q)
    """

    def __init__(self, sample_type: str, sensor: Sensor) -> None:
        found = _TYPE.fullmatch(sample_type)
        if found is None:
            raise CaptureFormatError(f"sample type {sample_type!r} is not known: write ri16_le, for example")
        self._is_iq = found[1] == "c"
        if self._is_iq != (sensor.channels is Channels.IQ):
            raise CaptureFormatError(
                f"sample type {sample_type} is not for {sensor.name}, which is {sensor.channels.value}"
            )
        self._is_swapped = sensor.swap_iq
        self._value_bytes = int(found[3]) // 8
        #: Bytes of one sample of all channels.
        self.frame_bytes = self._value_bytes * (2 if self._is_iq else 1)
        self._values = _reader(found[2], int(found[3]), ">" if found[4] == "be" else "<")
        self._rest = b""

    def push(self, data: bytes) -> SampleArray:
        """Take the next bytes; gives float32 or complex64. What is no finite number is NaN."""
        data = self._rest + data if self._rest else data
        whole = len(data) - len(data) % self.frame_bytes
        self._rest = data[whole:]
        values = self._values(data[:whole])
        if not self._is_iq:
            return values
        pairs = values.reshape(-1, 2)
        return np.ascontiguousarray(pairs[:, ::-1] if self._is_swapped else pairs).view(np.complex64)[:, 0]

    def reset(self) -> None:
        """Forget half a sample: what follows begins with a whole one."""
        self._rest = b""


def default_sample_type(channels: Channels) -> str:
    """Sample type of most devices."""
    return "ci16_le" if channels is Channels.IQ else "ri16_le"


def _reader(kind: str, bits: int, order: str) -> Callable[[bytes], NDArray[np.float32]]:
    """Turn bytes of one kind of number into float32."""
    if kind == "f":

        def floats(data: bytes) -> NDArray[np.float32]:
            values = np.frombuffer(data, f"{order}f{bits // 8}").astype(np.float32)
            return np.where(np.isfinite(values), values, np.float32(np.nan))

        return floats
    scale = np.float32(2.0 ** (1 - bits))
    if bits == 24:

        def triples(data: bytes) -> NDArray[np.float32]:
            octets = np.frombuffer(data, np.uint8).reshape(-1, 3)
            low_first = octets if order == "<" else octets[:, ::-1]
            wide = np.zeros((len(octets), 4), np.uint8)
            wide[:, 1:] = low_first  # the sign is in the highest octet
            return wide.view("<i4")[:, 0].astype(np.float32) * np.float32(2.0**-31)

        return triples
    offset = np.float32(128.0 if kind == "u" else 0.0)

    def whole(data: bytes) -> NDArray[np.float32]:
        numbers = np.frombuffer(data, f"{order}{kind}{bits // 8}")
        return (numbers.astype(np.float32) - offset) * scale

    return whole
