"""Deliveries of one sensor, as a listener would make them."""

from __future__ import annotations

from ginnel.daemon.deliveries import Delivery
from ginnel.store import Store, iter_passages, spans
from ginnel.words import Direction, Flag, Passage, Sensor, Span

S = 1_000_000
T0 = 1_772_442_000 * S  # 2026-03-02T09:00:00Z
LANE = Sensor(name="lane")


def passage(number: int, sensor_offset_us: int = 0) -> Passage:
    """The number-th passage: one every ten seconds."""
    at_us = T0 + (10 * number + 5) * S + sensor_offset_us
    return Passage(
        started_us=at_us - 2 * S,
        crossed_us=at_us,
        ended_us=at_us + S,
        direction=Direction.APPROACHING,
        direction_confidence=0.99,
        speed_mps=1.25,
        speed_se_mps=0.01,
        snr_db=18.5,
        flags=frozenset({Flag.OVERLAPPING}),
    )


def delivery(number: int, sensor: Sensor = LANE) -> Delivery:
    """The number-th of an unbroken span: one passage in it, and ten seconds more."""
    span = Span(started_us=T0, ended_us=T0 + 10 * (number + 1) * S, sample_rate_hz=8000.0)
    return Delivery(sensor=sensor, span=span, chain_version="1", passages=(passage(number),))


def numbers_in(store: Store) -> list[int]:
    """Which passages the store holds, in order."""
    return [
        (one.passage.crossed_us - T0) // (10 * S)
        for one in iter_passages(store, LANE.name, with_uncounted=True)
    ]


def listened_s(store: Store) -> float:
    return sum(one.span.listened_s for one in spans(store, LANE.name))
