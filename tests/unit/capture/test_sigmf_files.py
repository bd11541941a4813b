"""SigMF: types, times and dropped samples by the standard (SigMF 1.2.5), written with the sigmf package."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest
import sigmf
from numpy.typing import NDArray

from ginnel.capture import StartSource, open_recording
from ginnel.errors import CaptureError
from ginnel.words import Block, Channels, Gap, Sensor

MONO = Sensor(name="north")
PAIR = Sensor(name="north", channels=Channels.IQ)
AT = "2026-03-02T08:15:00.250000Z"
AT_US = 1_772_439_300_250_000


def write(
    folder: Path,
    data: NDArray[Any],
    datatype: str,
    captures: list[dict[str, Any]] | None = None,
    **global_info: Any,
) -> Path:
    """Write a recording and give the path of its metadata."""
    data.tofile(folder / "x.sigmf-data")
    described = sigmf.SigMFFile(
        data_file=str(folder / "x.sigmf-data"),
        global_info={
            "core:datatype": datatype,
            "core:sample_rate": 4000.0,
            "core:version": "1.2.5",
            **{key.replace("__", ":"): value for key, value in global_info.items()},
        },
    )
    for capture in captures or [{"core:sample_start": 0, "core:datetime": AT}]:
        described.add_capture(capture["core:sample_start"], metadata=capture)
    described.tofile(str(folder / "x.sigmf-meta"), overwrite=True)
    return folder / "x.sigmf-meta"


def change(meta: Path, **changes: Any) -> None:
    told = json.loads(meta.read_text(encoding="utf-8"))
    for key, value in changes.items():
        told["global"][key.replace("__", ":")] = value
    meta.write_text(json.dumps(told), encoding="utf-8")


@pytest.mark.parametrize("order", ["_le", "_be"])
@pytest.mark.parametrize("kind", ["f32", "f64", "i32", "i16", "u32", "u16", "i8", "u8"])
@pytest.mark.parametrize("sensor", [MONO, PAIR], ids=["mono", "iq"])
def test_every_type_of_the_standard_is_read_at_full_scale_1(
    tmp_path: Path, kind: str, order: str, sensor: Sensor
) -> None:
    bits = int(kind[1:])
    wave = np.random.default_rng(5).uniform(-0.9, 0.9, size=4000)
    numbers = wave.copy()
    if kind[0] != "f":
        numbers = np.rint(wave * 2.0 ** (bits - 1)) + (2.0 ** (bits - 1) if kind[0] == "u" else 0)
    dtype = ("<" if order == "_le" else ">") + kind[0] + str(bits // 8)
    suffix = order if bits > 8 else ""
    meta = write(tmp_path, numbers.astype(dtype), ("c" if sensor is PAIR else "r") + kind + suffix)
    recording = open_recording(meta, sensor)
    (block,) = recording.iter_blocks()
    assert isinstance(block, Block)
    expected = wave[::2] + 1j * wave[1::2] if sensor is PAIR else wave
    np.testing.assert_allclose(block.samples, expected, atol=2 * 2.0 ** -min(bits - 1, 23))
    assert block.samples.dtype == (np.complex64 if sensor is PAIR else np.float32)
    assert recording.started_us == AT_US
    assert recording.start_source is StartSource.HEADER


def test_either_file_of_a_recording_may_be_named(tmp_path: Path) -> None:
    meta = write(tmp_path, np.zeros(100, "<i2"), "ri16_le")
    assert open_recording(meta.with_suffix(".sigmf-data"), MONO).path == meta


def test_two_real_channels_are_i_and_q_and_crossed_wires_are_swapped(tmp_path: Path) -> None:
    meta = write(tmp_path, np.arange(8, dtype="<i2"), "ri16_le", core__num_channels=2)
    (block,) = open_recording(meta, PAIR).iter_blocks()
    assert isinstance(block, Block)
    np.testing.assert_allclose(block.samples * 32768, [0 + 1j, 2 + 3j, 4 + 5j, 6 + 7j])
    crossed = Sensor(name="north", channels=Channels.IQ, swap_iq=True)
    (block,) = open_recording(meta, crossed).iter_blocks()
    assert isinstance(block, Block)
    np.testing.assert_allclose(block.samples * 32768, [1 + 0j, 3 + 2j, 5 + 4j, 7 + 6j])


def test_dropped_samples_are_a_gap_by_the_global_index(tmp_path: Path) -> None:
    # The standard's own example: sample_start 500, global_index 1000 means 500 samples lost.
    captures: list[dict[str, Any]] = [
        {"core:sample_start": 0, "core:global_index": 0, "core:datetime": AT},
        {"core:sample_start": 500, "core:global_index": 1000},
    ]
    meta = write(tmp_path, np.arange(800, dtype="<i2"), "ri16_le", captures)
    recording = open_recording(meta, MONO)
    got = list(recording.iter_blocks(300))
    gap = got[2]
    assert isinstance(gap, Gap)
    assert (gap.started_us, gap.ended_us) == (AT_US + 125_000, AT_US + 250_000)
    assert gap.reason == "dropped samples"
    blocks = [block for block in got if isinstance(block, Block)]
    assert [len(block.samples) for block in blocks] == [300, 200, 300]
    assert [block.started_us for block in blocks] == [AT_US, AT_US + 75_000, AT_US + 250_000]
    np.testing.assert_array_equal(np.concatenate([b.samples for b in blocks]) * 32768, np.arange(800))
    assert recording.ended_us == AT_US + 325_000


def test_captures_that_follow_on_are_one_stretch_and_dates_tell_holes_too(tmp_path: Path) -> None:
    captures: list[dict[str, Any]] = [
        {"core:sample_start": 0, "core:datetime": "2026-03-02T08:15:00Z"},
        {"core:sample_start": 400, "core:datetime": "2026-03-02T08:15:00.1Z"},
        {"core:sample_start": 800, "core:datetime": "2026-03-02T08:15:02Z"},
    ]
    meta = write(tmp_path, np.zeros(1000, "<i2"), "ri16_le", captures)
    segments = open_recording(meta, MONO).segments
    assert [(s.first_sample, s.n_samples) for s in segments] == [(0, 800), (800, 200)]
    assert segments[1].started_us - segments[0].started_us == 2_000_000


def test_without_a_date_the_name_tells_or_the_recording_is_refused(tmp_path: Path) -> None:
    meta = write(tmp_path, np.zeros(100, "<i2"), "ri16_le", [{"core:sample_start": 0}])
    with pytest.raises(CaptureError, match="--started-at"):
        open_recording(meta, MONO)
    for path in (meta, meta.with_suffix(".sigmf-data")):
        path.rename(path.with_stem("north-20260302T081500Z"))
    assert (
        open_recording(tmp_path / "north-20260302T081500Z.sigmf-meta", MONO).start_source is StartSource.NAME
    )


def one_line(path: Path, sensor: Sensor = MONO) -> str:
    handed_on: list[Block | Gap] = []
    with pytest.raises(CaptureError) as caught:
        handed_on.extend(open_recording(path, sensor, started_us=0).iter_blocks(50))
    assert not handed_on
    assert "\n" not in str(caught.value)
    return str(caught.value)


def test_faults_of_the_data_are_named(tmp_path: Path) -> None:
    meta = write(tmp_path, np.zeros(1000, "<i2"), "ri16_le")
    data = meta.with_suffix(".sigmf-data")
    data.write_bytes(bytes(1500))
    assert "checksum differs" in one_line(meta)
    data.write_bytes(bytes(1501))
    assert "no whole number of samples" in one_line(meta)
    data.write_bytes(b"")
    assert "holds no samples" in one_line(meta)
    data.unlink()
    assert "is not there; copy both" in one_line(meta)


def test_metadata_that_speaks_of_more_samples_than_there_are_means_truncated(tmp_path: Path) -> None:
    captures: list[dict[str, Any]] = [
        {"core:sample_start": 0, "core:datetime": AT},
        {"core:sample_start": 900},
    ]
    meta = write(tmp_path, np.zeros(1000, "<i2"), "ri16_le", captures)
    meta.with_suffix(".sigmf-data").write_bytes(bytes(1600))
    assert "truncated" in one_line(meta)


def test_floats_that_are_no_numbers_are_found_first(tmp_path: Path) -> None:
    wave = np.zeros(1000, "<f4")
    wave[777] = np.inf
    assert "sample 777 is no finite number" in one_line(write(tmp_path, wave, "rf32_le"))
    assert "sample 388 is no finite number" in one_line(write(tmp_path, wave, "cf32_le"), PAIR)


def test_faults_of_the_metadata_are_named(tmp_path: Path) -> None:
    meta = write(tmp_path, np.zeros(1000, "<i2"), "ri16_le")
    assert "needs 2" in one_line(meta, PAIR)
    change(meta, core__datatype="ri17_le")
    assert "no valid SigMF metadata" in one_line(meta)
    change(meta, core__datatype="ri16_le", core__sample_rate=100.0)
    assert "sampled at 100 Hz" in one_line(meta)
    told = json.loads(meta.read_text(encoding="utf-8"))
    del told["global"]["core:sample_rate"]
    meta.write_text(json.dumps(told), encoding="utf-8")
    assert "core:sample_rate" in one_line(meta)
    meta.write_text("{", encoding="utf-8")
    assert "is no SigMF metadata" in one_line(meta)
    meta.write_bytes(b"\xff\xfe\x00")
    assert "is no SigMF metadata" in one_line(meta)
    meta.write_text("[]", encoding="utf-8")
    one_line(meta)
    meta.unlink()
    assert "copy both" in one_line(meta)


def test_captures_out_of_order_and_archives_are_refused(tmp_path: Path) -> None:
    captures: list[dict[str, Any]] = [
        {"core:sample_start": 0, "core:global_index": 1000},
        {"core:sample_start": 500, "core:global_index": 1200},
    ]
    meta = write(tmp_path, np.zeros(1000, "<i2"), "ri16_le", captures)
    assert "before the one before it has ended" in one_line(meta)
    archive = tmp_path / "x.sigmf"
    archive.write_bytes(bytes(100))
    assert "archive" in one_line(archive)
