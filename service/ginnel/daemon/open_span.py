"""A span that is being listened to: the chain, and what of it has been handed on."""

from __future__ import annotations

from dataclasses import replace

from ginnel.chain import CHAIN_VERSION, Chain
from ginnel.daemon.deliveries import Delivery
from ginnel.words import Block, Passage, Sensor, Span


class OpenSpan:
    """Blocks of one span in, deliveries out.

    It is remembered by pickling it, so it holds plain values and the chain only.
    """

    def __init__(
        self, sensor: Sensor, first: Block, *, is_clock_trusted: bool = True, dropped_samples: int = 0
    ) -> None:
        self.sensor = sensor
        self._rate_hz = first.sample_rate_hz
        self._chain = Chain(sensor, first.sample_rate_hz, first.started_us)
        self._is_clock_trusted = is_clock_trusted
        self._started_us = self._until_us = first.started_us
        self._moved_by_us = 0
        self._moved_from_us: int | None = None
        self._found: list[Passage] = []
        self.dropped_samples = dropped_samples
        self.drift_ppm: float | None = None
        self.n_passages = 0

    @property
    def key(self) -> tuple[str, int]:
        """Which span it is."""
        return self.sensor.name, self._started_us + self._moved_by_us

    @property
    def has_found(self) -> bool:
        """Whether there are passages that were not taken yet."""
        return bool(self._found)

    @property
    def listened_until_us(self) -> int:
        """Time after the last sample."""
        return self._chain.listened_until_us + self._moved_by_us

    def push(self, block: Block) -> None:
        """Take the next samples."""
        self._find(self._chain.push(block.samples))

    def move(self, by_us: int) -> None:
        """Give the span another date: it began this much later, and now the clock is trusted."""
        self._moved_from_us = self._started_us + self._moved_by_us
        self._moved_by_us += by_us
        self._is_clock_trusted = True

    def take(self) -> Delivery:
        """Hand on what is known for certain: stretches that were read to their end.

        What was heard since then counts as listened to once it has been read.
        """
        self._until_us = max(self._until_us, self._chain.settled_us)
        return self._deliver()

    def finish(self) -> Delivery:
        """End the span and hand on all of the rest."""
        self._find(self._chain.finish())
        self._until_us = self._chain.listened_until_us
        return self._deliver()

    def _find(self, passages: list[Passage]) -> None:
        self._found += passages
        self.n_passages += len(passages)
        # nothing else can be found before the end of a stretch that was read
        self._until_us = max([self._until_us, *(one.ended_us for one in passages)])

    def _deliver(self) -> Delivery:
        found, self._found = self._found, []
        moved_from_us, self._moved_from_us = self._moved_from_us, None
        by_us = self._moved_by_us
        return Delivery(
            sensor=self.sensor,
            span=Span(
                started_us=self._started_us + by_us,
                ended_us=self._until_us + by_us,
                sample_rate_hz=self._rate_hz,
                clock_trusted=self._is_clock_trusted,
            ),
            chain_version=CHAIN_VERSION,
            passages=tuple(_moved(one, by_us) for one in found) if by_us else tuple(found),
            drift_ppm=self.drift_ppm,
            dropped_samples=self.dropped_samples,
            moved_from_us=moved_from_us,
        )


def _moved(one: Passage, by_us: int) -> Passage:
    return replace(
        one,
        started_us=one.started_us + by_us,
        crossed_us=one.crossed_us + by_us,
        ended_us=one.ended_us + by_us,
    )
