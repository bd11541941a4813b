"""WAV, RF64, FLAC and raw PCM: what libsndfile writes is what is read; each fault is one clear line."""

from __future__ import annotations

import os
import struct
import tracemalloc
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import soundfile
from numpy.typing import NDArray

from ginnel.capture import RawFormat, Recording, StartSource, open_recording
from ginnel.errors import CaptureError, CaptureFormatError
from ginnel.words import Block, Channels, Gap, Sensor

MONO = Sensor(name="north")
PAIR = Sensor(name="north", channels=Channels.IQ)
AT_US = 1_772_439_300_000_000  # 2026-03-02T08:15:00Z


def wave(n: int = 5000, channels: int = 1) -> NDArray[Any]:
    columns = np.random.default_rng(3).uniform(-0.9, 0.9, size=(n, channels))
    return columns[:, 0] if channels == 1 else columns


def read(recording: Recording, block_samples: int = 777) -> NDArray[Any]:
    blocks = [block for block in recording.iter_blocks(block_samples) if isinstance(block, Block)]
    return np.concatenate([block.samples for block in blocks])


# Half a step of each type's grid: what rounding may cost.
STEPS = {
    "PCM_S8": 2**-7,
    "PCM_U8": 2**-7,
    "PCM_16": 2**-15,
    "PCM_24": 2**-23,
    "PCM_32": 2**-23,
    "FLOAT": 2**-23,
    "DOUBLE": 2**-23,
}


@pytest.mark.parametrize(
    ("container", "subtype"),
    [
        ("WAV", "PCM_U8"),
        ("WAV", "PCM_16"),
        ("WAV", "PCM_24"),
        ("WAV", "PCM_32"),
        ("WAV", "FLOAT"),
        ("WAV", "DOUBLE"),
        ("WAVEX", "PCM_24"),
        ("RF64", "PCM_16"),
        ("RF64", "FLOAT"),
        ("FLAC", "PCM_S8"),
        ("FLAC", "PCM_16"),
        ("FLAC", "PCM_24"),
    ],
)
@pytest.mark.parametrize("sensor", [MONO, PAIR], ids=["mono", "iq"])
def test_every_kind_gives_its_samples_at_full_scale_1(
    tmp_path: Path, container: str, subtype: str, sensor: Sensor
) -> None:
    path = tmp_path / f"x.{'flac' if container == 'FLAC' else 'wav'}"
    columns = wave(channels=2 if sensor is PAIR else 1)
    soundfile.write(path, columns, 8000, subtype=subtype, format=container)
    recording = open_recording(path, sensor, started_us=AT_US)
    samples = read(recording)
    expected = columns[:, 0] + 1j * columns[:, 1] if sensor is PAIR else columns
    assert samples.dtype == (np.complex64 if sensor is PAIR else np.float32)
    np.testing.assert_allclose(samples, expected, atol=2 * STEPS[subtype])
    assert (recording.n_samples, recording.sample_rate_hz) == (5000, 8000.0)
    assert recording.ended_us == AT_US + 625_000


@pytest.mark.parametrize("rate_hz", [1000, 11_025, 44_100, 96_000, 192_000])
def test_any_rate_from_1_to_192_khz_dates_its_blocks_by_the_sample_clock(
    tmp_path: Path, rate_hz: int
) -> None:
    path = tmp_path / "x.wav"
    soundfile.write(path, wave(3001), rate_hz)
    blocks = list(open_recording(path, MONO, started_us=AT_US).iter_blocks(1000))
    expected = [AT_US + round(k * 1e9 / rate_hz) for k in range(4)]
    assert [block.started_us for block in blocks] == expected


def test_swapped_wires_are_swapped_back(tmp_path: Path) -> None:
    path = tmp_path / "x.wav"
    columns = wave(channels=2)
    soundfile.write(path, columns, 8000, subtype="FLOAT")
    crossed = Sensor(name="north", channels=Channels.IQ, swap_iq=True)
    samples = read(open_recording(path, crossed, started_us=0))
    np.testing.assert_allclose(samples, columns[:, 1] + 1j * columns[:, 0], atol=1e-7)


@pytest.mark.parametrize(
    ("sample_type", "dtype", "scale"),
    [
        ("ri8", "i1", 2**7),
        ("ri16_le", "<i2", 2**15),
        ("ri16_be", ">i2", 2**15),
        ("i32_le", "<i4", 2**31),
        ("rf32_le", "<f4", 1.0),
        ("rf64_be", ">f8", 1.0),
    ],
)
def test_raw_pcm_is_read_by_its_stated_type(
    tmp_path: Path, sample_type: str, dtype: str, scale: float
) -> None:
    path = tmp_path / "x.raw"
    (wave() * scale).astype(dtype).tofile(path)
    recording = open_recording(
        path, MONO, started_us=AT_US, raw=RawFormat(sample_type=sample_type, sample_rate_hz=4000)
    )
    np.testing.assert_allclose(read(recording), wave(), atol=1.1 / min(scale, 2**23) if scale > 1 else 1e-6)
    assert recording.sample_rate_hz == 4000.0


def test_raw_pairs_of_24_bit_are_read(tmp_path: Path) -> None:
    path = tmp_path / "x.pcm"
    whole = np.array([[1, -2], [8_388_607, -8_388_608]])
    path.write_bytes(b"".join(int(v).to_bytes(3, "little", signed=True) for v in whole.ravel()))
    raw = RawFormat(sample_type="ci24_le", sample_rate_hz=2000.5)
    recording = open_recording(path, PAIR, started_us=AT_US, raw=raw)
    np.testing.assert_array_equal(read(recording), (whole[:, 0] + 1j * whole[:, 1]) / 2**23)
    assert recording.sample_rate_hz == 2000.5


def bext_chunk(date: str, time: str, reference_samples: int) -> bytes:
    """Broadcast extension by EBU Tech 3285 v1: 602 fixed bytes."""
    body = struct.pack(
        "<256s32s32s10s8sIIH64s190s",
        b"", b"recorder", b"", date.encode(), time.encode(),
        reference_samples & 0xFFFFFFFF, reference_samples >> 32, 1, b"", b"",
    )  # fmt: skip
    assert len(body) == 602
    return b"bext" + struct.pack("<I", len(body)) + body


def with_chunk(path: Path, chunk: bytes, *, last: bool = False) -> None:
    """Put a chunk into a plain WAV file, before its first chunk or after its last."""
    whole = path.read_bytes()
    whole = whole + chunk if last else whole[:12] + chunk + whole[12:]
    path.write_bytes(whole[:4] + struct.pack("<I", len(whole) - 8) + whole[8:])


@pytest.mark.parametrize("last", [False, True])
@pytest.mark.parametrize(("rate_hz", "reference"), [(8000, 376_856_000), (48_000, 2_261_136_000)])
def test_a_broadcast_wav_starts_at_its_time_reference(
    tmp_path: Path, rate_hz: int, reference: int, last: bool
) -> None:
    # Check value: 13:05:07 is 376 856 000 samples after midnight at 8 kHz, 2 261 136 000 at 48 kHz.
    path = tmp_path / "2001-01-01T00-00-00Z.wav"
    soundfile.write(path, wave(100), rate_hz)
    with_chunk(path, bext_chunk("2026-03-02", "12:00:00", reference), last=last)
    recording = open_recording(path, MONO)
    # 2026-03-02T13:05:07Z, by `date -u +%s`.
    assert recording.started_us == 1_772_456_707_000_000
    assert recording.start_source is StartSource.HEADER
    assert open_recording(path, MONO, started_us=7).started_us == 7


def test_a_time_reference_beyond_32_bits_and_one_of_zero(tmp_path: Path) -> None:
    path = tmp_path / "x.wav"
    soundfile.write(path, wave(100), 192_000)
    with_chunk(path, bext_chunk("2026:03:02", "00:00:00", 192_000 * 86_399))
    assert open_recording(path, MONO).started_us == 1_772_409_600_000_000 + 86_399_000_000
    soundfile.write(path, wave(100), 192_000)
    with_chunk(path, bext_chunk("2026-03-02", "08:15:00", 0))
    assert open_recording(path, MONO).started_us == AT_US


def test_a_blank_broadcast_extension_tells_nothing(tmp_path: Path) -> None:
    path = tmp_path / "2026-03-02T08-15-00Z.wav"
    soundfile.write(path, wave(100), 8000)
    with_chunk(path, bext_chunk("", "", 0))
    assert open_recording(path, MONO).start_source is StartSource.NAME


def test_flac_starts_at_its_date_tag(tmp_path: Path) -> None:
    path = tmp_path / "x.flac"
    with soundfile.SoundFile(path, "w", 8000, 1, subtype="PCM_16") as file:
        file.date = "2026-03-02T09:15:00+01:00"
        file.write(wave())
    assert open_recording(path, MONO).started_us == AT_US


def test_an_rf64_file_beyond_4_gb_is_opened_by_its_64_bit_sizes(tmp_path: Path) -> None:
    # RF64 by EBU Tech 3306: sizes -1, the real ones in ds64. The file is sparse.
    n = 2_200_000_000
    path = tmp_path / "2026-03-02T08-15-00Z.wav"
    head = b"RF64\xff\xff\xff\xffWAVE" + b"ds64" + struct.pack("<IQQQI", 28, 2 * n + 72, 2 * n, n, 0)
    head += b"fmt " + struct.pack("<IHHIIHH", 16, 1, 1, 8000, 16_000, 2, 16) + b"data\xff\xff\xff\xff"
    with path.open("wb") as file:
        file.write(head)
        file.truncate(len(head) + 2 * n)
    recording = open_recording(path, MONO)
    assert recording.n_samples == n
    first = next(recording.iter_blocks(10))
    assert isinstance(first, Block)
    assert not first.samples.any()
    with path.open("r+b") as file:
        file.truncate(len(head) + 2 * n - 500)
    with pytest.raises(
        CaptureFormatError, match=r"truncated: the header promises 2200000000 samples, 2199999750"
    ):
        open_recording(path, MONO)


def one_line(sensor: Sensor, path: Path, raw: RawFormat | None = None) -> str:
    """Open and read to the end; give the error, which must come before any sample."""
    handed_on: list[Block | Gap] = []
    with pytest.raises(CaptureError) as caught:
        handed_on.extend(open_recording(path, sensor, started_us=0, raw=raw).iter_blocks(500))
    assert not handed_on
    text = str(caught.value)
    assert "\n" not in text
    assert str(path) in text
    return text


@pytest.mark.parametrize("subtype", ["PCM_16", "PCM_24", "FLOAT"])
@pytest.mark.parametrize("lost_bytes", [1, 2, 3000])
def test_a_truncated_wav_is_found_before_anything_is_handed_on(
    tmp_path: Path, subtype: str, lost_bytes: int
) -> None:
    path = tmp_path / "x.wav"
    soundfile.write(path, wave(), 8000, subtype=subtype)
    path.write_bytes(path.read_bytes()[:-lost_bytes])
    assert "truncated" in one_line(MONO, path)


@pytest.mark.parametrize("keep", [10, 30, 44])
def test_a_wav_cut_in_its_header_is_found(tmp_path: Path, keep: int) -> None:
    path = tmp_path / "x.wav"
    soundfile.write(path, wave(), 8000)
    path.write_bytes(path.read_bytes()[:keep])
    one_line(MONO, path)


@pytest.mark.parametrize("keep_share", [0.3, 0.9, 0.999])
def test_a_truncated_flac_is_found_before_anything_is_handed_on(tmp_path: Path, keep_share: float) -> None:
    path = tmp_path / "x.flac"
    soundfile.write(path, wave(60_000), 8000)
    whole = path.read_bytes()
    path.write_bytes(whole[: int(len(whole) * keep_share)])
    with pytest.raises(CaptureFormatError, match=r"x\.flac: truncated: the header promises 60000 samples"):
        open_recording(path, MONO, started_us=0)


def test_a_flac_damaged_in_the_middle_is_found_before_anything_is_handed_on(tmp_path: Path) -> None:
    path = tmp_path / "x.flac"
    soundfile.write(path, wave(60_000), 8000)
    whole = bytearray(path.read_bytes())
    whole[len(whole) // 2 : len(whole) // 2 + 4000] = bytes(4000)
    path.write_bytes(bytes(whole))
    one_line(MONO, path)


def test_a_wav_that_its_recorder_did_not_finish_is_told_apart(tmp_path: Path) -> None:
    path = tmp_path / "x.wav"
    soundfile.write(path, wave(), 8000)
    whole = path.read_bytes()
    path.write_bytes(whole.replace(b"data" + struct.pack("<I", 10_000), b"data" + struct.pack("<I", 0)))
    assert "did not finish" in one_line(MONO, path)


def test_empty_files_and_files_without_samples(tmp_path: Path) -> None:
    path = tmp_path / "x.wav"
    path.touch()
    assert "is empty" in one_line(MONO, path)
    soundfile.write(path, np.zeros(0), 8000)
    assert "holds no samples" in one_line(MONO, path)
    soundfile.write(tmp_path / "x.flac", np.zeros(0), 8000)
    assert "is empty" in one_line(MONO, tmp_path / "x.flac")  # libsndfile writes nothing at all


@pytest.mark.parametrize(
    "content", [b"started,speed\n1,2\n", b"RIFF", b"RIFF1234WAVEhello, this is text", b"\0" * 500]
)
def test_a_text_named_wav_is_called_so(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "x.wav"
    path.write_bytes(content)
    one_line(MONO, path)


@pytest.mark.parametrize(("sensor", "channels"), [(MONO, 2), (PAIR, 1), (PAIR, 3)])
def test_channels_must_be_the_sensors(tmp_path: Path, sensor: Sensor, channels: int) -> None:
    path = tmp_path / "x.wav"
    soundfile.write(path, wave(channels=channels), 8000)
    text = one_line(sensor, path)
    assert f"has {channels} channel" in text
    assert "sensor north" in text


@pytest.mark.parametrize("rate_hz", [500, 384_000])
def test_rates_beyond_the_limits_are_refused(tmp_path: Path, rate_hz: int) -> None:
    path = tmp_path / "x.wav"
    soundfile.write(path, wave(), rate_hz)
    assert "1000 to 192000 Hz" in one_line(MONO, path)


def test_a_flac_of_unknown_length_is_refused(tmp_path: Path) -> None:
    # An encoder that writes into a pipe leaves the 36 bits for the number of samples at 0.
    path = tmp_path / "x.flac"
    soundfile.write(path, wave(), 8000)
    whole = bytearray(path.read_bytes())
    whole[21] &= 0xF0
    whole[22:26] = bytes(4)
    path.write_bytes(bytes(whole))
    assert "does not say how many samples" in one_line(MONO, path)


@pytest.mark.parametrize("bad", [np.nan, np.inf, -np.inf])
@pytest.mark.parametrize("container", ["WAV", "RF64"])
def test_floats_that_are_no_numbers_are_found_before_anything_is_handed_on(
    tmp_path: Path, bad: float, container: str
) -> None:
    path = tmp_path / "x.wav"
    columns = wave()
    columns[4321] = bad
    soundfile.write(path, columns, 8000, subtype="FLOAT", format=container)
    assert "sample 4321 is no finite number" in one_line(MONO, path)


def test_other_encodings_are_refused(tmp_path: Path) -> None:
    path = tmp_path / "x.wav"
    soundfile.write(path, wave(), 8000, subtype="ULAW")
    assert "ULAW" in one_line(MONO, path)
    soundfile.write(tmp_path / "x.ogg", wave(), 8000)
    assert "no WAV or FLAC" in one_line(MONO, tmp_path / "x.ogg")


def test_raw_faults_are_named(tmp_path: Path) -> None:
    path = tmp_path / "x.raw"
    path.write_bytes(bytes(1001))
    raw = RawFormat(sample_type="ri16_le", sample_rate_hz=8000)
    assert "truncated, or of another type" in one_line(MONO, path, raw)
    for unknown in ("ri17_le", "text", "", "cu32_le", "ri16_xe"):
        with pytest.raises(CaptureFormatError, match=f"'{unknown}' is not known"):
            open_recording(path, MONO, started_us=0, raw=RawFormat(sample_type=unknown, sample_rate_hz=8000))
    path.write_bytes(bytes(1000))
    assert "has 1 channel" in one_line(PAIR, path, raw)
    bad = np.ones(100, dtype="<f4")
    bad[50] = np.nan
    bad.tofile(path)
    assert "sample 50" in one_line(MONO, path, RawFormat(sample_type="rf32_le", sample_rate_hz=8000))


def test_a_file_that_is_not_there_and_a_folder(tmp_path: Path) -> None:
    assert "No such file" in one_line(MONO, tmp_path / "x.wav")
    assert "is a folder" in one_line(MONO, tmp_path)


def test_memory_does_not_grow_with_the_length_of_a_file(tmp_path: Path) -> None:
    path = tmp_path / "x.wav"
    peaks = []
    for n in (1_000_000, 8_000_000):
        with soundfile.SoundFile(path, "w", 8000, 1, subtype="FLOAT") as file:
            for _ in range(n // 100_000):
                file.write(np.zeros(100_000, dtype=np.float32))
        recording = open_recording(path, MONO, started_us=0)
        tracemalloc.start()
        for _ in recording.iter_blocks():
            pass
        peaks.append(tracemalloc.get_traced_memory()[1])
        tracemalloc.stop()
    assert peaks[1] < 1.2 * peaks[0]


def test_a_name_that_is_not_utf_8_is_read_like_any_other(tmp_path: Path) -> None:
    plain = tmp_path / "plain.wav"
    soundfile.write(plain, wave(), 8000)
    odd = Path(os.fsdecode(os.fsencode(tmp_path) + b"/caf\xe9-20260302T081500Z.wav"))  # Latin-1
    plain.rename(odd)
    assert len(read(open_recording(odd, MONO))) == 5000
