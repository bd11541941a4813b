"""A listener with a real pipe, chain, outbox and store; only its clock is moved by the test."""

from __future__ import annotations

import os
import threading
import wave
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import pytest
from tests.unit.capture.ear import wait_until
from tests.unit.capture.fed_clock import START_US, FedClock
from tests.unit.capture.simulated import RATE_HZ, SENSOR, pcm, replayed, samples_of

from ginnel.capture import FolderSource
from ginnel.config import Settings, load_settings
from ginnel.daemon import outbox as outbox_module
from ginnel.daemon.listener import Listener
from ginnel.daemon.outbox import Outbox
from ginnel.daemon.places import Places
from ginnel.daemon.spool import Spool
from ginnel.store import Store, iter_passages, listened_until_us, open_store, spans
from ginnel.words import US_PER_S, Passage, Span

DAY_S = 86_400
SETTINGS = """
[[sensor]]
name = "lane"
[sensor.mounting]
height_m = 2.4
tilt_deg = 15.0
{more}
[sensor.source]
kind = "pipe"
path = "samples"
rate_hz = 2000
"""


class Bench:
    """A pipe to write to, and the store in which what is heard ends up."""

    def __init__(self, folder: Path, clock: FedClock | None = None, more: str = "") -> None:
        self.clock = clock or FedClock()
        (folder / "ginnel.toml").write_text(SETTINGS.format(more=more), "utf-8")
        self.settings: Settings = load_settings(folder / "ginnel.toml")
        self.store: Store = open_store(self.settings.store.url, create=True)
        self.outbox = Outbox(lambda: self.store, Spool(folder / "undelivered.db"), self.clock, 30.0)
        self.places = Places(lasting=folder, fleeting=folder)
        if not (folder / "samples").exists():
            os.mkfifo(folder / "samples")
        self._handle = os.open(folder / "samples", os.O_RDWR)
        self._n_sent = 0
        self.listener = Listener(
            self.settings.sensor[0],
            self.outbox,
            self.places,
            self.clock,
            lambda name: listened_until_us(self.store, name),
        )

    @contextmanager
    def listening(self) -> Iterator[None]:
        self.listener.start()
        wait_until(self.is_open)
        yield
        self.listener.stop()
        self.listener.join()
        self.outbox.deliver()

    def is_open(self) -> bool:
        return self.source is not None and bool(self.source.is_open)

    @property
    def source(self):  # type: ignore[no-untyped-def] # a stream's, and the test looks into it
        return self.listener._source

    def send(self, data: bytes) -> None:
        part_bytes = round(RATE_HZ)  # half a second
        for start in range(0, len(data), part_bytes):
            part = data[start : start + part_bytes]
            self.clock.pass_s(len(part) / 2 / RATE_HZ)
            os.write(self._handle, part)
            self._n_sent += len(part) // 2
            wait_until(lambda: self.source.n_arrived == self._n_sent and self.source.state.lag_s == 0)

    def heard_until_us(self) -> int | None:
        span = self.listener._span
        return None if span is None else span.listened_until_us

    def passages(self) -> list[Passage]:
        return [one.passage for one in iter_passages(self.store, with_uncounted=True)]

    def spans(self) -> list[Span]:
        return [one.span for one in spans(self.store)]

    def close(self) -> None:
        os.close(self._handle)
        self.store.close()


@pytest.fixture
def bench(tmp_path: Path) -> Iterator[Callable[..., Bench]]:
    made: list[Bench] = []

    def make(**options: object) -> Bench:
        made.append(Bench(tmp_path, **options))  # type: ignore[arg-type]
        return made[-1]

    yield make
    for one in made:
        one.close()


def rounded(passages: list[Passage]) -> list[tuple[int, str]]:
    return [(one.crossed_us, one.direction.value) for one in passages]


def test_what_is_stored_is_what_a_replay_finds(bench: Callable[..., Bench]) -> None:
    one = bench()
    with one.listening():
        one.send(pcm())
    (span,) = one.spans()
    assert span.started_us == START_US
    assert span.listened_s == len(pcm()) / 2 / RATE_HZ
    assert rounded(one.passages()) == rounded(replayed(samples_of(pcm()), START_US))
    assert len(one.passages()) == 2


def test_a_clock_that_is_set_later_moves_what_was_stored_to_its_time(
    bench: Callable[..., Bench],
) -> None:
    one = bench(clock=FedClock(wall_us=START_US - DAY_S * US_PER_S, is_set=False))
    data = pcm()
    cut = round(38 * RATE_HZ) * 2  # the first walker has gone, and might have stopped
    with one.listening():
        one.send(data[:cut])
        one.outbox.deliver()
        (before,) = one.spans()
        assert not before.clock_trusted
        assert before.started_us == START_US - DAY_S * US_PER_S
        assert len(one.passages()) == 1
        one.clock.step_s(DAY_S)
        one.clock.is_set = True
        one.send(data[cut:])
    (span,) = one.spans()
    assert span.clock_trusted
    assert span.started_us == START_US
    assert rounded(one.passages()) == rounded(replayed(samples_of(data), START_US))


def test_after_an_abrupt_end_what_was_heard_is_there_and_nothing_is_there_twice(
    bench: Callable[..., Bench],
) -> None:
    one = bench()
    one.listener.start()
    wait_until(one.is_open)
    data = pcm()
    cut = round(38 * RATE_HZ) * 2  # the second walker is still in the beam, the first one is stored
    one.send(data[:cut])
    one.outbox.deliver()
    stored = one.passages()
    assert len(stored) == 1
    checkpoint = one.places.checkpoint("lane", is_lasting=False)
    wait_until(checkpoint.exists)
    left = checkpoint.read_bytes()
    one.listener.stop()
    one.listener.join()
    # the process is gone: of what it did at its end nothing happened
    one.outbox = Outbox(lambda: one.store, Spool(one.places.spool), one.clock, 30.0)
    checkpoint.write_bytes(left)
    one.clock.pass_s(5.0)
    again = bench(clock=one.clock)
    with again.listening():
        again.send(data[cut:])
    found = again.passages()
    assert found[0] == stored[0]
    assert len(found) == len({p.crossed_us for p in found})
    first, second = again.spans()
    assert first.started_us == START_US
    assert (
        0 <= second.started_us - first.ended_us - 5 * US_PER_S <= 3 * US_PER_S
    )  # the checkpoint's two seconds
    assert sum(p.direction.value == "approaching" for p in found if "cut" not in p.flags) == 1


def test_where_nothing_can_be_kept_nothing_counts_as_heard(
    bench: Callable[..., Bench], monkeypatch: pytest.MonkeyPatch
) -> None:
    one = bench()
    with one.listening():
        one.send(pcm()[: round(10 * RATE_HZ) * 2])
        wait_until(lambda: one.heard_until_us() == START_US + 10 * US_PER_S)
        monkeypatch.setattr(outbox_module, "MOST_PASSAGES", -1)  # full
        one.send(pcm()[: round(10 * RATE_HZ) * 2])
        wait_until(lambda: one.listener._dropped_samples == 20_000)
        monkeypatch.undo()
        one.send(pcm()[: round(10 * RATE_HZ) * 2])
    first, second = one.spans()
    assert first.ended_us == START_US + 10 * US_PER_S
    assert second.started_us == START_US + 20 * US_PER_S
    assert second.listened_s == 10.0
    with one.store.reading() as connection:
        dropped = connection.exec_driver_sql("SELECT dropped_samples FROM span ORDER BY started_us").all()
    assert dropped == [(0,), (20_000,)]


def test_a_sensor_that_is_mounted_otherwise_begins_a_span_at_that_very_time(
    bench: Callable[..., Bench],
) -> None:
    change = "[[sensor.mounting_change]]\nsince = 2026-03-02T08:00:20Z\nheight_m = 2.6"
    one = bench(more="since = 2026-03-01T00:00:00Z\n" + change)
    with one.listening():
        one.send(pcm())
    first, second = one.spans()
    assert second.started_us == first.ended_us
    assert 0 <= second.started_us - (START_US + 20 * US_PER_S) <= US_PER_S
    assert SENSOR.mounting.height_m == 2.4
    with one.store.reading() as connection:
        assert len(connection.exec_driver_sql("SELECT DISTINCT reading_id FROM span").all()) == 2


def test_a_failure_nobody_foresaw_is_told_and_listening_begins_anew(
    bench: Callable[..., Bench], monkeypatch: pytest.MonkeyPatch, caplog: pytest.LogCaptureFixture
) -> None:
    one = bench()
    failed = threading.Event()
    real = Listener._hear

    def fail_once(self: Listener, block: object) -> None:
        if not failed.is_set():
            failed.set()
            raise RuntimeError("a bug")
        real(self, block)  # type: ignore[arg-type]

    monkeypatch.setattr(Listener, "_hear", fail_once)
    with one.listening():
        one.send(pcm()[: round(3.0 * RATE_HZ) * 2])
        source = one.source
        one.clock.pass_s(0.5)
        os.write(one._handle, pcm()[: round(RATE_HZ)])
        wait_until(failed.is_set)
        wait_until(lambda: one.source is not source and one.is_open())
        one._n_sent = 0
        one.send(pcm())
    assert "listening failed and begins anew" in caplog.text
    assert len(one.spans()) == 1


def heard_from_folder(folder: Path, text: str, n_files: int) -> list[str]:
    """Listen until so many files were heard; which passages the store holds then."""
    (folder / "ginnel.toml").write_text(text, "utf-8")
    settings = load_settings(folder / "ginnel.toml")
    with open_store(settings.store.url, create=True) as store:
        outbox = Outbox(lambda: store, Spool(folder / "undelivered.db"), FedClock(), 30.0)
        clock = FedClock()
        places = Places(lasting=folder, fleeting=folder)
        listener = Listener(settings.sensor[0], outbox, places, clock, lambda name: None)
        listener.start()

        def is_read() -> bool:
            clock.pass_s(0.5)
            outbox.deliver()
            source = listener._source
            return isinstance(source, FolderSource) and len(source.place.read_names) == n_files

        wait_until(is_read)
        listener.stop()
        listener.join()
        outbox.deliver()
        return [one.passage.direction.value for one in iter_passages(store, with_uncounted=True)]


def test_a_folder_is_heard_on_under_other_settings_from_the_next_file_on(tmp_path: Path) -> None:
    captures = tmp_path / "captures"
    captures.mkdir()
    text = SETTINGS.format(more="").split('kind = "pipe"')[0] + "settle_s = 1"
    write_capture(captures, 0)
    assert heard_from_folder(tmp_path, text, 1) == ["approaching", "receding"]
    write_capture(captures, 50)  # joins
    assert heard_from_folder(tmp_path, text.replace("2.4", "2.6"), 2) == ["approaching", "receding"] * 2
    with open_store(f"sqlite:///{tmp_path / 'ginnel.db'}") as store:
        first, second = (one.span for one in spans(store))
        assert first.ended_us == second.started_us == START_US + 50 * US_PER_S
        with store.reading() as connection:
            assert len(connection.exec_driver_sql("SELECT DISTINCT reading_id FROM span").all()) == 2


def write_capture(folder: Path, second: int) -> None:
    with wave.open(str(folder / f"lane-20260302T0800{second:02d}Z.wav"), "wb") as file:
        file.setparams((1, 2, int(RATE_HZ), 0, "NONE", ""))
        file.writeframes(pcm())
