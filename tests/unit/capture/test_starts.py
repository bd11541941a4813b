"""Start times: stamps in file names, by ISO 8601 and what file names make of it; texts of headers."""

from __future__ import annotations

from pathlib import Path

import pytest

from ginnel.capture import StartSource
from ginnel.capture.starts import find_start, stamp_us, text_us
from ginnel.errors import CaptureTimeError

AT_US = 1_772_439_300_000_000  # 2026-03-02T08:15:00Z, by `date -u -d ... +%s`


@pytest.mark.parametrize(
    ("name", "after_us"),
    [
        ("20260302T081500Z.wav", 0),
        ("north-corridor-20260302T081500Z.wav", 0),
        ("2026-03-02T08-15-00Z.flac", 0),
        ("2026-03-02T08:15:00Z.wav", 0),
        ("2026-03-02T08_15_00Z_north.wav", 0),
        ("2026-03-02_08-15-00.wav", 0),
        ("20260302_081500.wav", 0),
        ("2026-03-02 08.15.00.wav", 0),
        ("2026-03-02T08-15.wav", 0),
        ("20260302T0815Z.wav", 0),
        ("20260302T081500.250Z.wav", 250_000),
        ("2026-03-02T08-15-00.000125Z.wav", 125),
        ("20260302T091500+0100.wav", 0),
        ("2026-03-02T09-15-00+01-00.wav", 0),
        ("20260302T031500-0500.wav", 0),
        ("20260302T134500+0530.wav", 0),
        ("20260302T081500Z_20260302T091500Z.wav", 0),
        ("20260302T081500Z-0042.wav", 0),
        ("unit7_20260302T081500_part03.wav", 0),
        ("20260302t081500z.wav", 0),
    ],
)
def test_stamps_in_names_are_read_zoneless_ones_as_utc(name: str, after_us: int) -> None:
    assert stamp_us(Path("captures") / name) == AT_US + after_us


@pytest.mark.parametrize(
    "name", ["north.wav", "2026-03-02.wav", "0815.wav", "120260302T0815001.wav", "v1.2.3.wav"]
)
def test_names_without_a_stamp_tell_nothing(name: str) -> None:
    assert stamp_us(Path(name)) is None


def test_a_stamp_that_is_no_time_is_called_so() -> None:
    with pytest.raises(CaptureTimeError, match=r"20261302T081500Z in the name is no time.*--started-at"):
        stamp_us(Path("20261302T081500Z.wav"))


def test_what_was_given_goes_before_the_header_and_that_before_the_name() -> None:
    path = Path("20260302T081500Z.wav")
    assert find_start(path, given_us=1, header_us=2).source is StartSource.GIVEN
    assert find_start(path, given_us=None, header_us=0).started_us == 0
    assert find_start(path, given_us=None, header_us=None).started_us == AT_US
    with pytest.raises(CaptureTimeError, match=r"x\.wav.*--started-at 2026-03-02T08:15:00Z"):
        find_start(Path("x.wav"), given_us=None, header_us=None)


@pytest.mark.parametrize(
    ("text", "expected"),
    [
        ("2026-03-02T08:15:00Z", AT_US),
        ("2026-03-02t08:15:00z", AT_US),
        ("2026-03-02T08:15:00.123456789Z", AT_US + 123_456),
        ("2026-03-02T09:15:00+01:00", AT_US),
        ("2026-03-02T08:15:00", AT_US),
        ("this morning", None),
    ],
)
def test_header_texts_are_rfc_3339(text: str, expected: int | None) -> None:
    assert text_us(text) == expected
