"""A folder that is written to while it is watched; what is heard must be what a replay of it hears."""

from __future__ import annotations

import threading
import wave
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest
from tests.unit.capture.ear import wait_until
from tests.unit.capture.fed_clock import START_US, FedClock
from tests.unit.capture.simulated import RATE_HZ, SENSOR

from ginnel.capture import FolderPlace, FolderSource, arrange, find_captures, open_recording
from ginnel.capture.live import Break, FileRead, Heard, Idle
from ginnel.times import from_us
from ginnel.words import US_PER_S, Block

SECONDS = 4


def name(second: float) -> str:
    return f"lane-{from_us(START_US + round(second * US_PER_S)):%Y%m%dT%H%M%S.%fZ}.wav"


def samples(second: int, seconds: int = SECONDS) -> np.ndarray:
    rng = np.random.default_rng(second)
    return rng.integers(-1000, 1000, round(seconds * RATE_HZ)).astype("<i2")


def write(folder: Path, second: int, seconds: int = SECONDS, rate_hz: int = int(RATE_HZ)) -> Path:
    path = folder / name(second)
    with wave.open(str(path), "wb") as file:
        file.setparams((1, 2, rate_hz, 0, "NONE", ""))
        file.writeframes(samples(second, seconds).tobytes())
    return path


class Watch:
    """A source, its clock, and what it has given so far."""

    def __init__(self, folder: Path, place: FolderPlace | None = None, **options: object) -> None:
        self.clock = FedClock()
        self.source = FolderSource(
            folder,
            SENSOR,
            self.clock,
            place=place,
            settle_s=5.0,
            **options,  # type: ignore[arg-type]
        )
        self.stop = threading.Event()
        self.heard: list[Heard] = []
        self._iterator: Iterator[Heard] = self.source.iter_heard(self.stop)

    def look(self) -> list[Heard]:
        """Take what is there until the source says that nothing is new."""
        new = list(iter(lambda: next(self._iterator), Idle()))
        self.heard += new
        return new

    def settle(self) -> list[Heard]:
        """Look, let time go by, look again."""
        new = self.look()
        self.clock.pass_s(6.0)
        return [*new, *self.look()]

    def samples(self) -> np.ndarray:
        blocks = [one.samples for one in self.heard if isinstance(one, Block)]
        return np.concatenate(blocks) if blocks else np.empty(0, np.float32)


def reasons(heard: list[Heard]) -> list[str]:
    return [one.reason for one in heard if isinstance(one, Break)]


def replayed(folder: Path) -> list[tuple[int, np.ndarray]]:
    """What a replay reads: each span's start and samples."""
    recordings = [open_recording(path, SENSOR) for path in find_captures([folder])]
    return [
        (span.started_us, np.concatenate([block.samples for block in span.iter_blocks()]))
        for span in arrange(recordings).spans
    ]


def test_files_that_come_one_by_one_are_one_span_as_in_a_replay(tmp_path: Path) -> None:
    watch = Watch(tmp_path)
    for second in (0, 4, 8):
        write(tmp_path, second)
        new = watch.settle()
        assert [one.path.name for one in new if isinstance(one, FileRead)] == [name(second)]
    ((started_us, expected),) = replayed(tmp_path)
    first = next(one for one in watch.heard if isinstance(one, Block))
    assert first.started_us == started_us
    np.testing.assert_array_equal(watch.samples(), expected)
    assert reasons(watch.heard) == []


def test_a_file_that_is_still_growing_is_left_until_it_is_complete(tmp_path: Path) -> None:
    watch = Watch(tmp_path)
    whole = write(tmp_path, 0).read_bytes()
    path = tmp_path / name(0)
    for length in (100, 5000, len(whole) - 1):
        path.write_bytes(whole[:length])
        watch.look()
        watch.clock.pass_s(4.0)
        assert watch.look() == []
    path.write_bytes(whole)
    watch.settle()
    assert len(watch.samples()) == SECONDS * RATE_HZ


def test_a_later_file_waits_for_an_earlier_one_that_is_still_growing(tmp_path: Path) -> None:
    watch = Watch(tmp_path)
    whole = write(tmp_path, 0).read_bytes()
    (tmp_path / name(0)).write_bytes(whole[:3000])
    write(tmp_path, 4)
    watch.look()
    watch.clock.pass_s(4.0)
    (tmp_path / name(0)).write_bytes(whole)
    watch.look()
    watch.clock.pass_s(2.0)  # the later one is complete now
    assert watch.look() == []
    watch.settle()
    np.testing.assert_array_equal(watch.samples(), replayed(tmp_path)[0][1])


def test_a_hole_between_files_ends_the_span(tmp_path: Path) -> None:
    write(tmp_path, 0)
    write(tmp_path, 10)
    watch = Watch(tmp_path)
    heard = watch.settle()
    kinds = [type(one).__name__ for one in heard]
    assert kinds == ["Block", "FileRead", "Break", "Block", "FileRead"]
    assert reasons(heard) == ["not recorded"]
    assert [one.started_us for one in heard if isinstance(one, Block)] == [us for us, _ in replayed(tmp_path)]


def test_the_next_run_goes_on_after_the_last_file_that_was_let_go(tmp_path: Path) -> None:
    for second in (0, 4):
        write(tmp_path, second)
    first = Watch(tmp_path)
    first.settle()
    place = first.source.place
    assert place.read_names == {name(0), name(4)}
    write(tmp_path, 8)
    second_run = Watch(tmp_path, place)
    (block, end) = second_run.settle()
    assert isinstance(block, Block)
    assert isinstance(end, FileRead)
    assert block.started_us == START_US + 8 * US_PER_S  # the same span: nothing broke off
    assert second_run.source.place.n_samples == 12 * RATE_HZ
    np.testing.assert_array_equal(
        np.concatenate([first.samples(), second_run.samples()]), replayed(tmp_path)[0][1]
    )


def test_a_span_that_nothing_follows_ends_after_a_while(tmp_path: Path) -> None:
    write(tmp_path, 0)
    watch = Watch(tmp_path)
    watch.settle()
    watch.clock.pass_s(60.0)
    assert reasons(watch.look()) == []
    watch.clock.pass_s(10.0)
    assert reasons(watch.look()) == ["no more files came"]
    watch.clock.pass_s(1000.0)
    assert reasons(watch.look()) == []


def test_a_file_that_comes_late_is_left_and_told(tmp_path: Path, caplog: pytest.LogCaptureFixture) -> None:
    write(tmp_path, 100)
    watch = Watch(tmp_path, after="delete")
    watch.settle()
    late = write(tmp_path, 0)
    assert [one for one in watch.settle() if not isinstance(one, Break)] == []
    assert "`ginnel replay` can still read it" in caplog.text
    assert late.exists()


def test_a_damaged_file_is_told_once_left_out_and_taken_once_it_is_mended(
    tmp_path: Path, caplog: pytest.LogCaptureFixture
) -> None:
    whole = write(tmp_path, 0).read_bytes()
    (tmp_path / name(0)).write_bytes(whole[: len(whole) // 2])
    write(tmp_path, 4)
    watch = Watch(tmp_path)
    watch.settle()
    assert caplog.text.count("left out until it changes") == 1
    assert len(watch.samples()) == SECONDS * RATE_HZ  # the sound one was heard
    watch.settle()
    assert caplog.text.count("left out until it changes") == 1


@pytest.mark.parametrize("after", ["keep", "delete", "archive"])
def test_what_becomes_of_a_file_that_was_let_go(tmp_path: Path, after: str) -> None:
    folder, archive = tmp_path / "in", tmp_path / "heard"
    folder.mkdir()
    path = write(folder, 0)
    content = path.read_bytes()
    watch = Watch(folder, after=after, archive=archive)
    read = [one for one in watch.settle() if isinstance(one, FileRead)]
    assert path.read_bytes() == content  # not before it was let go
    watch.source.let_go(read[0].path)
    assert path.exists() == (after == "keep")
    assert (archive / path.name).exists() == (after == "archive")


def test_a_folder_that_cannot_be_changed_is_told_once_and_heard_all_the_same(
    tmp_path: Path, caplog: pytest.LogCaptureFixture
) -> None:
    blocked = tmp_path / "blocked"
    blocked.write_text("a file where the archive should be")
    folder = tmp_path / "in"
    folder.mkdir()
    watch = Watch(folder, after="archive", archive=blocked)
    for second in (0, 4):
        write(folder, second)
        for one in watch.settle():
            if isinstance(one, FileRead):
                watch.source.let_go(one.path)
    assert len(watch.samples()) == 2 * SECONDS * RATE_HZ
    assert caplog.text.count("cannot be taken away: ") == 1


def test_a_folder_that_is_not_there_is_waited_for(tmp_path: Path, caplog: pytest.LogCaptureFixture) -> None:
    folder = tmp_path / "later"
    watch = Watch(folder)
    watch.settle()
    assert "is no folder, or not there" in str(watch.source.state.fault)
    assert caplog.text.count("waiting for it") == 1
    folder.mkdir()
    write(folder, 0)
    watch.settle()
    assert watch.source.state.fault is None
    assert len(watch.samples()) == SECONDS * RATE_HZ


def test_a_span_ends_before_the_file_that_begins_under_another_mounting(tmp_path: Path) -> None:
    for second in (0, 4, 8):
        write(tmp_path, second)
    watch = Watch(tmp_path, mounted_us=(START_US - 1, START_US + 3 * US_PER_S))
    heard = watch.settle()
    assert reasons(heard) == ["mounted otherwise"]
    assert watch.source.place.started_us == START_US + 4 * US_PER_S


def test_it_can_be_stopped_in_the_middle_of_a_file(tmp_path: Path) -> None:
    write(tmp_path, 0, seconds=100)
    watch = Watch(tmp_path)
    watch.look()
    watch.clock.pass_s(6.0)
    iterator = watch.source.iter_heard(watch.stop)
    assert isinstance(next(iterator), Block)
    watch.stop.set()
    assert not any(isinstance(one, FileRead) for one in iterator)
    wait_until(lambda: watch.source.place.read_names == frozenset())
