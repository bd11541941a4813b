"""Deliveries: what joins, and what they look like on disk."""

from __future__ import annotations

import os
import pickle
import socket
from contextlib import suppress
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from tests.unit.daemon.given import LANE, T0, S, delivery, passage

from ginnel.capture import FolderPlace
from ginnel.daemon import checkpoint as checkpoints
from ginnel.daemon.checkpoint import Checkpoint, load, save
from ginnel.daemon.deliveries import from_json, merged, to_json
from ginnel.daemon.notify import notify, watchdog_s
from ginnel.daemon.open_span import OpenSpan
from ginnel.daemon.spool import Spool
from ginnel.errors import StoreError
from ginnel.words import Block, Sensor


def test_deliveries_of_one_span_become_one_and_others_stay_in_order() -> None:
    other = Sensor(name="other")
    (lane, theirs) = merged([delivery(0), delivery(0, other), delivery(1), delivery(2), delivery(1, other)])
    assert lane == replace(delivery(2), passages=(passage(0), passage(1), passage(2)))
    assert theirs.sensor == other
    assert len(theirs.passages) == 2


def test_a_span_that_was_moved_is_delivered_in_two_steps() -> None:
    moved = replace(
        delivery(1),
        span=replace(delivery(1).span, started_us=T0 + 5 * S, ended_us=T0 + 30 * S),
        moved_from_us=T0,
    )
    later = replace(moved, moved_from_us=None, passages=(passage(2),))
    first, second = merged([delivery(0), moved, later])
    assert first == delivery(0)
    assert second == replace(later, moved_from_us=T0, passages=(passage(1), passage(2)))


def test_deliveries_come_back_from_disk_exactly() -> None:
    odd = replace(
        delivery(3), passages=(replace(passage(3), speed_mps=0.1 + 0.2, snr_db=None),), drift_ppm=-31.25
    )
    assert from_json(to_json([delivery(0), odd])) == (delivery(0), odd)
    with pytest.raises(ValueError, match="json"):
        from_json(b"{")


def test_the_queue_on_disk_keeps_order_and_vanishes_when_empty(tmp_path: Path) -> None:
    path = tmp_path / "undelivered.db"
    spool = Spool(path)
    assert not path.exists()
    spool.append([delivery(0), delivery(1)])
    spool.append([delivery(2)])
    again = Spool(path)  # as after a kill
    assert again.n_waiting == 3
    assert [one for _, one in again.first(10)] == [delivery(0), delivery(1), delivery(2)]
    for number, _ in again.first(10):
        again.remove(number)
    assert again.n_waiting == 0
    assert not path.exists()


def test_the_queue_on_disk_is_bounded_and_takes_all_or_nothing(tmp_path: Path) -> None:
    spool = Spool(tmp_path / "undelivered.db", most_bytes=100_000)
    n_taken = 0
    with suppress(StoreError):
        while n_taken < 2000:
            spool.append([delivery(0), delivery(1)])
            n_taken += 2
    assert 20 < n_taken == spool.n_waiting == len(spool.first(1000))
    with pytest.raises(StoreError, match="full"):
        spool.append([delivery(0), delivery(1)])
    assert (tmp_path / "undelivered.db").stat().st_size <= 100_000


def test_a_damaged_queue_is_set_aside(tmp_path: Path, caplog: pytest.LogCaptureFixture) -> None:
    path = tmp_path / "undelivered.db"
    path.write_bytes(b"no database at all " * 500)
    spool = Spool(path)
    spool.append([delivery(0)])
    assert spool.n_waiting == 1
    assert "it is kept as" in caplog.text
    assert path.with_suffix(".broken").exists()


def noise(n: int, started_us: int = T0) -> Block:
    samples = np.random.default_rng(1).normal(0, 0.01, n).astype(np.float32)
    return Block(started_us=started_us, sample_rate_hz=2000.0, samples=samples)


def test_a_checkpoint_brings_the_span_back_to_the_bit(tmp_path: Path) -> None:
    span = OpenSpan(LANE, noise(1))
    span.push(noise(60_001))
    path = tmp_path / "lane.checkpoint"
    place = FolderPlace(
        started_us=T0, sample_rate_hz=2000.0, n_samples=60_001, read_names=frozenset({"a.wav"})
    )
    save(path, Checkpoint(deliveries=[delivery(0)], span=span, place=place), is_lasting=True)
    found = load(path)
    assert found is not None
    assert found.deliveries == (delivery(0),)
    assert found.place == place
    assert found.span is not None
    assert found.span.finish() == span.finish()
    assert path.stat().st_mode & 0o077 == 0
    assert os.listdir(tmp_path) == ["lane.checkpoint"]


def test_a_checkpoint_of_another_version_still_delivers(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "lane.checkpoint"
    save(path, Checkpoint(deliveries=[delivery(0)], span=OpenSpan(LANE, noise(1))), is_lasting=False)
    monkeypatch.setattr(checkpoints, "_VERSIONS", b"another")
    assert load(path) == Checkpoint(deliveries=(delivery(0),))


def test_what_is_no_checkpoint_of_ours_is_not_read(tmp_path: Path, caplog: pytest.LogCaptureFixture) -> None:
    path = tmp_path / "lane.checkpoint"
    assert load(path) is None
    for content in (b"", b"nonsense", pickle.dumps("a pickle"), b"\n--ginnel--\n\n--ginnel--\n"):
        path.write_bytes(content)
        assert load(path) is None
    assert caplog.text.count("listening begins anew") == 4
    if os.geteuid() == 0:
        save(path, Checkpoint(), is_lasting=False)
        os.chown(path, 65534, 65534)
        assert load(path) is None
        assert "belongs to somebody else" in caplog.text


def test_a_span_hands_on_only_what_is_known_for_certain() -> None:
    span = OpenSpan(LANE, noise(0))
    before_us = T0
    for second in range(1, 30):
        span.push(noise(2000))
        told = span.take()
        assert told.span.started_us == T0
        assert before_us <= told.span.ended_us <= T0 + second * S
        before_us = told.span.ended_us
    assert before_us > T0 + 20 * S  # quiet: known soon
    assert span.finish().span.ended_us == T0 + 29 * S


def test_a_span_that_is_moved_says_so_once_and_counts_from_there() -> None:
    span = OpenSpan(LANE, noise(0), is_clock_trusted=False)
    span.push(noise(40_000))
    assert not span.take().span.clock_trusted
    span.move(100 * S)
    told = span.take()
    assert (told.moved_from_us, told.span.started_us, told.span.clock_trusted) == (T0, T0 + 100 * S, True)
    assert span.take().moved_from_us is None
    assert span.listened_until_us == T0 + 120 * S
    assert span.finish().span.ended_us == T0 + 120 * S


def test_systemd_hears_what_is_sent_to_its_socket(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("NOTIFY_SOCKET", raising=False)
    notify("READY=1")  # nobody is there: nothing happens
    for address in (str(tmp_path / "notify"), f"@ginnel-test-{os.getpid()}"):
        with socket.socket(socket.AF_UNIX, socket.SOCK_DGRAM) as ear:
            ear.bind("\0" + address[1:] if address.startswith("@") else address)
            monkeypatch.setenv("NOTIFY_SOCKET", address)
            notify("READY=1", "STATUS=listening")
            assert ear.recv(100) == b"READY=1\nSTATUS=listening"
    notify("READY=1")  # it is gone: nothing happens


@pytest.mark.parametrize(
    ("usec", "pid", "expected"),
    [("30000000", None, 30.0), ("30000000", "1", None), (None, None, None), ("x", None, None)],
)
def test_the_watchdog_is_for_the_process_that_it_names(
    monkeypatch: pytest.MonkeyPatch, usec: str | None, pid: str | None, expected: float | None
) -> None:
    for name, value in (("WATCHDOG_USEC", usec), ("WATCHDOG_PID", pid)):
        monkeypatch.delenv(name, raising=False)
        if value is not None:
            monkeypatch.setenv(name, value)
    assert watchdog_s() == expected
