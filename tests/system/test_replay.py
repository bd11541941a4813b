"""Recorded captures through the whole program, as a person would do it."""

from __future__ import annotations

import csv
import io
import shutil
from pathlib import Path

import numpy as np
import pytest
from tests.system.conftest import Ginnel, write_minute

from ginnel.store import open_store, spans


def passages(ginnel: Ginnel, *options: str) -> list[dict[str, str]]:
    return list(csv.DictReader(io.StringIO(ginnel("export", "passages", *options).stdout)))


def test_a_folder_of_captures_becomes_passages_counts_and_coverage(ginnel: Ginnel, tmp_path: Path) -> None:
    for minute in (0, 1, 5):
        write_minute(tmp_path / "captures", minute, seed=minute)
    done = ginnel("replay", "captures")
    assert done.exit_code == 0, done.stderr
    assert done.stdout.splitlines()[0] == "lane: 2 spans, 3.0 min listened"
    found = passages(ginnel)
    assert [row["direction"] for row in found] == ["approaching", "receding"] * 3
    assert [row["crossed_at"][:16] for row in found] == [f"2026-03-02T08:0{m}" for m in (0, 0, 1, 1, 5, 5)]
    counts = list(csv.DictReader(io.StringIO(ginnel("export", "counts").stdout)))
    assert [(row["direction"], row["count"]) for row in counts] == [("approaching", "3"), ("receding", "3")]
    assert {float(row["coverage"]) for row in counts} == {0.05}  # 3 of 60 minutes


def test_replaying_again_changes_nothing_and_says_so(ginnel: Ginnel, tmp_path: Path) -> None:
    write_minute(tmp_path / "captures", 0)
    first = ginnel("replay", "captures")
    before = passages(ginnel, "--uncounted")
    again = ginnel("replay", "captures")
    assert before == passages(ginnel, "--uncounted")
    assert f"in the log: {len(before)} added, 0 removed, 0 kept" in first.stdout
    assert f"in the log: 0 added, 0 removed, {len(before)} kept" in again.stdout


def test_a_raw_file_gives_what_the_wav_file_gave(ginnel: Ginnel, tmp_path: Path) -> None:
    import soundfile

    wav = write_minute(tmp_path / "captures", 0)
    ginnel("replay", str(wav))
    from_wav = passages(ginnel)
    samples, _ = soundfile.read(wav, dtype="int16")
    (tmp_path / "raw.pcm").write_bytes(np.asarray(samples, "<i2").tobytes())
    arguments = ("replay", "raw.pcm", "--raw-format", "ri16_le", "--rate", "2k")
    assert "--started-at" in ginnel(*arguments).stderr
    (tmp_path / "ginnel.db").unlink()
    done = ginnel(*arguments, "--started-at", "2026-03-02T08:00:00", "--quiet")
    assert (done.exit_code, done.stdout, done.stderr) == (0, "", "")
    assert passages(ginnel) == from_wav
    assert from_wav


def test_bad_files_get_a_line_each_and_the_good_ones_are_stored(ginnel: Ginnel, tmp_path: Path) -> None:
    good = write_minute(tmp_path / "captures", 0)
    folder = good.parent
    data = good.read_bytes()
    (folder / "empty-20260302T090000Z.wav").write_bytes(b"")
    (folder / "text-20260302T091000Z.wav").write_text("this is no sound\n" * 50, "utf-8")
    (folder / "short-20260302T092000Z.wav").write_bytes(data[: len(data) // 2])
    shutil.copy(good, folder / "undated.wav")
    shutil.copy(good, folder / "overlap-20260302T080030Z.wav")
    done = ginnel("replay", "captures", "nowhere.wav")
    assert done.exit_code == 1
    lines = done.stderr.splitlines()
    names = ("nowhere", "empty", "text", "short", "undated", "overlap")
    assert len(lines) == len(names), done.stderr
    for name in names:
        (line,) = [line for line in lines if name in line.split(": ")[1]]
        assert line.startswith("ginnel: ")
    assert done.stdout.startswith("lane: 1 span, 1.0 min listened\n")
    assert len(passages(ginnel)) == 2


def test_a_bad_file_alone_stores_nothing(ginnel: Ginnel, tmp_path: Path) -> None:
    (tmp_path / "bad-20260302T090000Z.wav").write_bytes(b"RIFF" + bytes(60))
    done = ginnel("replay", "bad-20260302T090000Z.wav")
    assert done.exit_code == 1
    assert not (tmp_path / "ginnel.db").exists()


def test_a_part_of_what_is_stored_is_refused_in_a_line(ginnel: Ginnel, tmp_path: Path) -> None:
    first, second = (write_minute(tmp_path / "captures", minute) for minute in (0, 1))
    assert ginnel("replay", str(first)).exit_code == 0
    whole = ginnel("replay", str(first), str(second))
    assert whole.exit_code == 0, "the span grew: both are read together"
    assert len(passages(ginnel)) == 4
    late = tmp_path / "late-20260302T080130Z.wav"
    shutil.copy(second, late)
    done = ginnel("replay", str(late))
    assert done.exit_code == 1
    assert len(done.stderr.splitlines()) == 1
    assert len(passages(ginnel)) == 4


@pytest.mark.parametrize("arguments", [("captures",), ("captures/a.wav", "captures/b.wav")])
def test_one_start_for_several_captures_is_wrong_usage(
    ginnel: Ginnel, tmp_path: Path, arguments: tuple[str, ...]
) -> None:
    one = write_minute(tmp_path / "captures", 0)
    for name in ("a.wav", "b.wav"):
        shutil.copy(one, one.with_name(name))
    done = ginnel("replay", *arguments, "--started-at", "2026-03-02T08:00:00Z")
    assert done.exit_code == 2
    assert "goes with one capture" in done.stderr


def test_a_new_mounting_in_the_settings_replaces_what_was_found(ginnel: Ginnel, tmp_path: Path) -> None:
    write_minute(tmp_path / "captures", 0)
    ginnel("replay", "captures")
    before = passages(ginnel, "--uncounted")
    settings = tmp_path / "ginnel.toml"
    settings.write_text(settings.read_text("utf-8").replace("2.4", "2.6"), "utf-8")
    done = ginnel("replay", "captures")
    after = passages(ginnel, "--uncounted")
    assert f"in the log: {len(after)} added, {len(before)} removed, 0 kept" in done.stdout
    assert before


def test_each_span_is_read_under_the_mounting_of_its_time(ginnel: Ginnel, tmp_path: Path) -> None:
    settings = tmp_path / "ginnel.toml"
    change = "[[sensor.mounting_change]]\nsince = 2026-03-02T08:01:00Z\nheight_m = 3.1\n"
    settings.write_text(settings.read_text("utf-8") + change, "utf-8")
    for minute in (0, 2):
        write_minute(tmp_path / "captures", minute, duration_s=10.0)
    assert ginnel("replay", "captures").exit_code == 0
    with open_store(f"sqlite:///{tmp_path}/ginnel.db", read_only=True) as store:
        heights = [logged.mounting.height_m for logged in spans(store, "lane")]
    assert heights == [2.4, 3.1]
