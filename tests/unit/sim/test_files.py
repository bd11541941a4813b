"""Files: what other libraries read from captures and truth files."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import numpy as np
import pytest
import sigmf
import soundfile

from ginnel.sim import Scene, capture_name, walker, write_sigmf, write_truth, write_wav
from ginnel.words import Channels, Sensor

STARTED_US = 1_772_439_300_000_000  # 2026-03-02T08:15:00Z


def scene(channels: Channels, *, swap_iq: bool = False) -> Scene:
    sensor = Sensor(name="north", channels=channels, swap_iq=swap_iq)
    return Scene(sensor=sensor, duration_s=5, sample_rate_hz=4000, movers=(walker(crossed_s=4.0, far_m=5.0),))


def test_a_mono_wav_holds_the_samples_to_the_last_bit(tmp_path: Path) -> None:
    made = scene(Channels.MONO)
    path = write_wav(made, tmp_path / f"{capture_name('north', STARTED_US)}.wav")
    assert path.name == "north-20260302T081500Z.wav"
    samples, rate_hz = soundfile.read(path, dtype="float32")
    assert rate_hz == 4000
    np.testing.assert_array_equal(samples, made.samples())


@pytest.mark.parametrize("swap_iq", [False, True])
def test_an_iq_wav_has_i_left_unless_wired_crossed(tmp_path: Path, swap_iq: bool) -> None:
    made = scene(Channels.IQ, swap_iq=swap_iq)
    samples, _ = soundfile.read(write_wav(made, tmp_path / "x.wav"), dtype="float32")
    i, q = (1, 0) if swap_iq else (0, 1)
    np.testing.assert_array_equal(samples[:, i] + 1j * samples[:, q], made.samples())


@pytest.mark.parametrize(("channels", "datatype"), [(Channels.MONO, "ri16_le"), (Channels.IQ, "ci16_le")])
def test_sigmf_is_valid_and_holds_samples_and_time(tmp_path: Path, channels: Channels, datatype: str) -> None:
    made = scene(channels)
    meta = write_sigmf(made, tmp_path / "north", STARTED_US)
    read = sigmf.fromfile(str(meta))
    read.validate()
    assert read.get_global_field("core:datatype") == datatype
    assert read.get_captures()[0]["core:datetime"] == "2026-03-02T08:15:00.000000Z"
    np.testing.assert_allclose(read.read_samples(), made.samples(), atol=1e-7)


def test_truth_is_told_in_csv_and_json(tmp_path: Path) -> None:
    made = scene(Channels.MONO)
    table = write_truth(made, tmp_path / "truth.csv", STARTED_US)
    with table.open(newline="", encoding="utf-8") as file:
        (row,) = csv.DictReader(file)
    assert row["crossed_at"] == "2026-03-02T08:15:04.000000Z"
    assert row["direction"] == "approaching"
    assert row["story"] == "passage"
    assert float(row["mean_speed_mps"]) == pytest.approx(1.34)
    told = json.loads(write_truth(made, tmp_path / "truth.json", STARTED_US).read_text(encoding="utf-8"))
    assert told["sensor"] == "north"
    assert told["movers"][0]["crossed_at"] == row["crossed_at"]


def test_writers_tell_how_much_of_the_scene_is_done(tmp_path: Path) -> None:
    made = scene(Channels.MONO)
    told: list[float] = []
    write_wav(made, tmp_path / "x.wav", on_progress=told.append)
    assert sum(told) == pytest.approx(5.0)
