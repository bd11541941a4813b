"""Spans: files that join, holes between, overlaps, rates, order."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
import soundfile

from ginnel.capture import Recording, arrange, find_captures, open_recording
from ginnel.errors import CaptureError, CaptureFormatError, CaptureTimeError
from ginnel.words import Sensor

NORTH = Sensor(name="north")
AT_US = 1_772_439_300_000_000  # 2026-03-02T08:15:00Z


def recording(
    folder: Path, name: str, started_us: int, n: int = 8000, rate_hz: int = 8000, first: int = 0
) -> Recording:
    path = folder / name
    soundfile.write(path, ((first + np.arange(n)) % 32000).astype(np.int16), rate_hz)
    return open_recording(path, NORTH, started_us=started_us)


@pytest.mark.parametrize("slip_us", [0, 125, -125, 250, -250])
def test_files_that_join_to_within_two_samples_are_one_span_in_order_of_time(
    tmp_path: Path, slip_us: int
) -> None:
    later = recording(tmp_path, "a.wav", AT_US + 1_000_000 + slip_us, first=8000)
    earlier = recording(tmp_path, "b.wav", AT_US)
    arranged = arrange([later, earlier])
    (span,) = arranged.spans
    assert arranged.gaps == ()
    assert arranged.refused == ()
    assert (span.started_us, span.ended_us) == (AT_US, AT_US + 2_000_000)
    assert [path.name for path in span.paths] == ["b.wav", "a.wav"]
    blocks = list(span.iter_blocks(3000))
    samples = np.concatenate([block.samples for block in blocks])
    np.testing.assert_array_equal(samples * 32768, np.arange(16_000))
    starts_us = [block.started_us for block in blocks]
    assert starts_us == [AT_US + t for t in (0, 375_000, 750_000, 1_000_000, 1_375_000, 1_750_000)]


def test_a_hole_of_more_than_two_samples_is_a_gap(tmp_path: Path) -> None:
    one = recording(tmp_path, "a.wav", AT_US)
    other = recording(tmp_path, "b.wav", AT_US + 1_000_400)
    arranged = arrange([one, other])
    assert len(arranged.spans) == 2
    (gap,) = arranged.gaps
    assert (gap.started_us, gap.ended_us, gap.reason) == (
        AT_US + 1_000_000,
        AT_US + 1_000_400,
        "not recorded",
    )


def test_slips_do_not_add_up_unseen(tmp_path: Path) -> None:
    # Each file is 1.6 samples late against the one before: the span's own clock notices at the second.
    late_us = [0, 200, 400, 600]
    files = [recording(tmp_path, f"{k}.wav", AT_US + k * 1_000_000 + late_us[k]) for k in range(4)]
    arranged = arrange(files)
    assert [len(span.paths) for span in arranged.spans] == [2, 2]
    assert arranged.gaps[0].ended_us - arranged.gaps[0].started_us == 400


def test_overlaps_are_refused_with_one_clear_line_and_the_others_go_on(tmp_path: Path) -> None:
    files = [
        recording(tmp_path, "a.wav", AT_US),
        recording(tmp_path, "b.wav", AT_US + 500_000),
        recording(tmp_path, "c.wav", AT_US + 1_000_000),
        recording(tmp_path, "d.wav", AT_US),
    ]
    arranged = arrange(files)
    assert [path.name for path in arranged.spans[0].paths] == ["a.wav", "c.wav"]
    twice, inside = arranged.refused
    assert isinstance(inside, CaptureTimeError)
    assert "d.wav" in str(twice)
    assert str(inside) == (
        f"{tmp_path / 'b.wav'}: starts at 2026-03-02T08:15:00.500000Z, 0.5 s before a.wav ends; "
        "mend its start time (--started-at) or leave one of the two out"
    )


def test_a_file_that_follows_on_at_another_rate_is_refused(tmp_path: Path) -> None:
    files = [
        recording(tmp_path, "a.wav", AT_US),
        recording(tmp_path, "b.wav", AT_US + 1_000_000, rate_hz=16_000),
        recording(tmp_path, "c.wav", AT_US + 9_000_000, rate_hz=16_000),
    ]
    arranged = arrange(files)
    (fault,) = arranged.refused
    assert isinstance(fault, CaptureFormatError)
    assert "sampled at 16000 Hz, but a.wav, which it follows on, at 8000 Hz" in str(fault)
    assert [span.sample_rate_hz for span in arranged.spans] == [8000.0, 16_000.0]


def test_recordings_of_two_sensors_do_not_mix(tmp_path: Path) -> None:
    one = recording(tmp_path, "a.wav", AT_US)
    other = open_recording(tmp_path / "a.wav", Sensor(name="south"), started_us=0)
    with pytest.raises(ValueError, match="several sensors"):
        arrange([one, other])


def test_no_recordings_are_no_spans() -> None:
    assert arrange([]).spans == ()


def test_captures_are_found_once_each(tmp_path: Path) -> None:
    for name in ("b.wav", "a.flac", "c.sigmf-meta", "c.sigmf-data", "d.txt"):
        (tmp_path / name).touch()
    (tmp_path / "inner").mkdir()
    names = [p.name for p in find_captures([tmp_path, tmp_path / "c.sigmf-data", tmp_path / "d.txt"])]
    assert names == ["a.flac", "b.wav", "c.sigmf-meta", "d.txt"]
    with pytest.raises(CaptureError, match="is not there"):
        find_captures([tmp_path / "absent.wav"])
