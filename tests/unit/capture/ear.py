"""Listens to a live source in a thread, while the test sends and moves the clock."""

from __future__ import annotations

import threading
import time
from collections.abc import Callable

import numpy as np
from tests.unit.capture.fed_clock import START_US, FedClock
from tests.unit.capture.simulated import RATE_HZ, SENSOR, replayed, samples_of

from ginnel.capture.links import Link
from ginnel.capture.live import Break, Heard
from ginnel.capture.pcm import PcmDecoder, default_sample_type
from ginnel.capture.stream import StreamSource
from ginnel.words import US_PER_S, Block, Sensor

PATIENCE_S = 60.0
Write = Callable[[bytes], None]


def wait_until(claim: Callable[[], bool]) -> None:
    deadline = time.monotonic() + PATIENCE_S
    while not claim():
        assert time.monotonic() < deadline
        time.sleep(0.001)


class Ear:
    """A source that is listened to by a thread, and a clock that the test moves as it sends."""

    def __init__(self, link: Link, sensor: Sensor = SENSOR) -> None:
        self.clock = FedClock()
        decoder = PcmDecoder(default_sample_type(sensor.channels), sensor)
        self.frame_bytes = decoder.frame_bytes
        self.source = StreamSource(link, decoder, RATE_HZ, self.clock, retry_s=0.5)
        self.heard: list[Heard] = []
        self._stop = threading.Event()
        self._thread = threading.Thread(target=self._listen)
        self._n_sent = 0

    def _listen(self) -> None:
        for one in self.source.iter_heard(self._stop):
            if isinstance(one, Block | Break):
                self.heard.append(one)

    def __enter__(self) -> Ear:
        self._thread.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._stop.set()
        self._thread.join(PATIENCE_S)
        self.source.close()
        assert not self._thread.is_alive()

    @property
    def n_arrived(self) -> int:
        return self.source.n_arrived

    def send(self, write: Write, data: bytes, part_s: float = 0.5) -> None:
        """Send at the pace of the clock, which goes on once a part has arrived."""
        part_bytes = round(part_s * RATE_HZ) * self.frame_bytes
        for start in range(0, len(data), part_bytes):
            part = data[start : start + part_bytes]
            self.clock.pass_s(len(part) / self.frame_bytes / RATE_HZ)
            write(part)
            self._n_sent += len(part) // self.frame_bytes
            wait_until(lambda: self.n_arrived == self._n_sent)

    def blocks(self) -> list[Block]:
        return [one for one in self.heard if isinstance(one, Block)]

    def reasons(self) -> list[str]:
        return [one.reason for one in self.heard if isinstance(one, Break)]


def assert_heard_as_replayed(ear: Ear, data: bytes, sensor: Sensor = SENSOR) -> None:
    blocks = ear.blocks()
    samples = np.concatenate([block.samples for block in blocks])
    np.testing.assert_array_equal(samples, samples_of(data, sensor))
    assert abs(blocks[0].started_us - START_US) <= US_PER_S // 2
    found = replayed(samples, blocks[0].started_us, sensor)
    assert [one.direction.value for one in found] == ["approaching", "receding"]
