"""Raw samples: what libsndfile reads from the same bytes in a file is the truth."""

from __future__ import annotations

import itertools
from pathlib import Path

import numpy as np
import pytest
import soundfile
from hypothesis import given
from hypothesis import strategies as st

from ginnel.capture import RawFormat
from ginnel.capture.pcm import PcmDecoder
from ginnel.config.source import SourceKind, SourceSettings
from ginnel.errors import CaptureFormatError
from ginnel.words import Channels, Sensor

MONO, IQ = Sensor(name="m"), Sensor(name="q", channels=Channels.IQ)
KINDS = [
    "i8",
    "u8",
    *(f"{kind}_{order}" for kind in ("i16", "i24", "i32", "f32", "f64") for order in ("le", "be")),
]


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("letter", ["r", "c"])
def test_every_sample_type_reads_as_libsndfile_reads_it(tmp_path: Path, letter: str, kind: str) -> None:
    sample_type = letter + kind
    raw = RawFormat(sample_type=sample_type, sample_rate_hz=8000)
    rng = np.random.default_rng(5)
    if "f" in kind:
        order = ">" if kind.endswith("be") else "<"
        data = rng.normal(0, 0.3, 2 * 1000).astype(f"{order}f{int(kind[1:3]) // 8}").tobytes()
    else:
        data = rng.integers(0, 256, 1000 * raw.frame_bytes, np.uint8).tobytes()
    path = tmp_path / "raw"
    path.write_bytes(data)
    with soundfile.SoundFile(path, "r", **raw.options()) as file:
        columns = file.read(dtype="float32", always_2d=True)
    expected = columns[:, 0] if letter == "r" else columns[:, 0] + 1j * columns[:, 1]
    decoder = PcmDecoder(sample_type, MONO if letter == "r" else IQ)
    assert decoder.frame_bytes == raw.frame_bytes
    found = decoder.push(data)
    assert found.dtype == (np.float32 if letter == "r" else np.complex64)
    np.testing.assert_array_equal(found, expected)
    SourceSettings(
        kind=SourceKind.PIPE, path="-", rate_hz=8000, sample_type=sample_type
    )  # the settings know it too


@given(cuts=st.lists(st.integers(0, 600), max_size=12))
def test_where_the_bytes_are_cut_does_not_matter(cuts: list[int]) -> None:
    data = np.random.default_rng(1).integers(0, 256, 600, np.uint8).tobytes()
    whole = PcmDecoder("ci24_le", IQ).push(data)
    decoder = PcmDecoder("ci24_le", IQ)
    parts = [decoder.push(data[a:b]) for a, b in itertools.pairwise([0, *sorted(cuts), 600])]
    np.testing.assert_array_equal(np.concatenate(parts), whole)


def test_crossed_wires_are_put_right() -> None:
    crossed = Sensor(name="q", channels=Channels.IQ, swap_iq=True)
    data = np.array([16384, -8192], "<i2").tobytes()
    assert PcmDecoder("ci16_le", IQ).push(data)[0] == 0.5 - 0.25j
    assert PcmDecoder("ci16_le", crossed).push(data)[0] == -0.25 + 0.5j


def test_what_is_no_number_is_nan_and_half_a_sample_can_be_forgotten() -> None:
    decoder = PcmDecoder("rf32_le", MONO)
    found = decoder.push(np.array([0.5, np.inf, np.nan], "<f4").tobytes())
    assert np.isfinite(found).tolist() == [True, False, False]
    decoder.push(b"\x00\x01")
    decoder.reset()
    assert decoder.push(np.array([0.25], "<f4").tobytes()).tolist() == [0.25]


@pytest.mark.parametrize("sample_type", ["ri12_le", "ru16_le", "rf16_le", "i16", "ci16_le", "ri16"])
def test_a_sample_type_that_does_not_fit_is_refused(sample_type: str) -> None:
    if sample_type == "ri16":
        with pytest.raises(ValueError, match="sample_type"):
            SourceSettings(kind=SourceKind.PIPE, path="-", rate_hz=8000, sample_type=sample_type)
        return
    with pytest.raises(CaptureFormatError):
        PcmDecoder(sample_type, MONO)
