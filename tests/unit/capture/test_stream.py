"""Live sources, each over the real thing: a FIFO, a socket, a pseudo-terminal, an ALSA device."""

from __future__ import annotations

import os
import pty
import socket
import threading
import tty
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

import numpy as np
import pytest
from tests.unit.capture.ear import Ear, Write, assert_heard_as_replayed, wait_until
from tests.unit.capture.fed_clock import START_US, FedClock
from tests.unit.capture.simulated import RATE_HZ, SENSOR, SENSOR_IQ, pcm, samples_of

from ginnel.capture.links import Link, PipeLink, SerialLink, TcpLink
from ginnel.capture.live import Break
from ginnel.capture.pcm import PcmDecoder
from ginnel.capture.stream import StreamSource
from ginnel.errors import CaptureError, SourceLostError
from ginnel.words import US_PER_S, Block, Sensor


@contextmanager
def fifo(tmp_path: Path) -> Iterator[tuple[Link, Write]]:
    path = tmp_path / "samples"
    os.mkfifo(path)
    handle = os.open(path, os.O_RDWR)
    try:
        yield PipeLink(str(path)), lambda data: _write_all(handle, data)
    finally:
        os.close(handle)


def _write_all(handle: int, data: bytes) -> None:
    while data:
        data = data[os.write(handle, data) :]


@contextmanager
def tcp(tmp_path: Path) -> Iterator[tuple[Link, Write]]:
    with socket.create_server(("127.0.0.1", 0)) as server:
        connected: list[socket.socket] = []

        def write(data: bytes) -> None:
            if not connected:
                connected.append(server.accept()[0])
            connected[0].sendall(data)

        yield TcpLink("127.0.0.1", server.getsockname()[1]), write
        for one in connected:
            one.close()


@contextmanager
def serial(tmp_path: Path) -> Iterator[tuple[Link, Write]]:
    ours, theirs = pty.openpty()
    tty.setraw(ours)
    tty.setraw(theirs)
    link = SerialLink(os.ttyname(theirs), 921_600)
    try:
        yield link, lambda data: _write_all(ours, data)
    finally:
        os.close(ours)
        os.close(theirs)


@pytest.mark.parametrize("way", [fifo, tcp, serial])
@pytest.mark.parametrize("sensor", [SENSOR, SENSOR_IQ], ids=["mono", "iq"])
def test_every_sample_arrives_dated_and_gives_the_passages_of_a_replay(
    tmp_path: Path, way: Callable[[Path], object], sensor: Sensor
) -> None:
    data = pcm(sensor)
    with way(tmp_path) as (link, write), Ear(link, sensor) as ear:  # type: ignore[attr-defined]
        wait_until(lambda: ear.source.is_open)
        ear.send(write, data)
        wait_until(lambda: sum(len(one.samples) for one in ear.blocks()) == len(data) // ear.frame_bytes)
    assert ear.reasons() == []
    assert_heard_as_replayed(ear, data, sensor)


def test_standard_input_ends_with_its_writer(tmp_path: Path) -> None:
    # a pipe on descriptor 0 is the real thing; here another stands for it, since pytest holds that one
    read_end, write_end = os.pipe()
    with Ear(PipeLink("-", read_end)) as ear:
        wait_until(lambda: ear.source.is_open)
        ear.send(lambda data: _write_all(write_end, data), pcm()[:40_000])
        os.close(write_end)
        wait_until(lambda: bool(ear.reasons()))
    os.close(read_end)
    assert ear.reasons() == ["the input has ended"]
    np.testing.assert_array_equal(
        np.concatenate([one.samples for one in ear.blocks()]), samples_of(pcm()[:40_000])
    )


def test_a_connection_that_breaks_is_made_again_and_what_was_missed_is_missing(tmp_path: Path) -> None:
    data = pcm()
    half = len(data) // 2
    with socket.create_server(("127.0.0.1", 0)) as server, Ear(TcpLink(*server.getsockname())) as ear:
        first = server.accept()[0]
        ear.send(first.sendall, data[:half])
        first.close()
        wait_until(lambda: ear.source.state.fault is not None)
        assert "the other side hung up" in str(ear.source.state.fault)
        ear.clock.pass_s(7.0)
        second = server.accept()[0]
        ear.send(second.sendall, data[half:])
        wait_until(lambda: sum(len(one.samples) for one in ear.blocks()) == len(data) // 2)
        assert ear.source.state.fault is None
        second.close()
    assert "hung up" in ear.reasons()[0]
    starts = [one.started_us for one in ear.blocks()]
    second_start_us = START_US + round((half / 2 / RATE_HZ + 7.0) * US_PER_S)
    assert min(abs(us - second_start_us) for us in starts) <= US_PER_S // 2


def test_a_source_that_falls_silent_is_lost_and_found_again(tmp_path: Path) -> None:
    with fifo(tmp_path) as (link, write), Ear(link) as ear:
        wait_until(lambda: ear.source.is_open)
        ear.send(write, pcm()[:40_000])
        ear.clock.pass_s(6.0)
        wait_until(lambda: bool(ear.reasons()))
        assert ear.reasons() == ["nothing came for 5 s"]
        wait_until(lambda: ear.source.is_open)
        ear.send(write, pcm()[40_000:80_000])
        wait_until(lambda: len({one.started_us for one in ear.blocks()}) > 1 and len(ear.blocks()) > 10)
    assert ear.source.state.fault is None


def test_a_device_that_is_not_there_yet_is_waited_for(tmp_path: Path) -> None:
    path = tmp_path / "later"
    with Ear(PipeLink(str(path))) as ear:
        wait_until(lambda: "No such file" in str(ear.source.state.fault))
        os.mkfifo(path)
        wait_until(lambda: ear.source.is_open)
        handle = os.open(path, os.O_RDWR)
        ear.send(lambda data: _write_all(handle, data), pcm()[:40_000])
        wait_until(lambda: bool(ear.blocks()))
        os.close(handle)


def test_a_file_is_no_pipe_and_nobody_answers_a_closed_port(tmp_path: Path) -> None:
    (tmp_path / "file").write_bytes(b"")
    with pytest.raises(CaptureError, match="is no FIFO: make one with mkfifo"):
        PipeLink(str(tmp_path / "file")).open()
    with socket.create_server(("127.0.0.1", 0)) as server:
        port = server.getsockname()[1]
    with pytest.raises(SourceLostError, match=f"port {port}: Connection refused"):
        TcpLink("127.0.0.1", port).open()
    with pytest.raises(SourceLostError, match="ttyNONE: "):
        SerialLink("/dev/ttyNONE", 115_200).open()


def test_a_queue_that_is_full_drops_counts_and_tells(tmp_path: Path) -> None:
    """The reader is faster than whoever listens: seconds are dropped, none silently."""
    with fifo(tmp_path) as (link, write):
        clock = FedClock()
        source = StreamSource(link, PcmDecoder("ri16_le", SENSOR), RATE_HZ, clock, retry_s=0.5)
        stop = threading.Event()
        listening = source.iter_heard(stop)
        heard = [next(listening)]  # the reader runs from now on; nobody else takes anything
        n_sent = 0
        while source.state.dropped_samples == 0:
            clock.pass_s(0.5)
            write(pcm()[:2000])
            n_sent += 1000
            wait_until(lambda: source.n_arrived == n_sent)  # noqa: B023
            assert n_sent < 200 * RATE_HZ
        assert source.state.lag_s == pytest.approx(60.0, abs=0.6)
        while not any(isinstance(one, Break) for one in heard):
            heard.append(next(listening))
            if (
                source.state.lag_s < 25 and n_sent < 200 * RATE_HZ
            ):  # room again: one more part tells of the loss
                clock.pass_s(0.5)
                write(pcm()[:2000])
                n_sent += 1000
                wait_until(lambda: source.n_arrived == n_sent)  # noqa: B023
        lost = next(one for one in heard if isinstance(one, Break))
        assert lost.reason == "samples came faster than they could be read"
        assert lost.dropped_samples == source.state.dropped_samples > 0
        stop.set()
        rest = list(listening)
        n_heard = sum(len(one.samples) for one in [*heard, *rest] if isinstance(one, Block))
        assert n_heard + source.state.dropped_samples == n_sent
