"""What listening hands to the store, and how that looks on disk while the store cannot be reached."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from functools import cache
from typing import TYPE_CHECKING

from ginnel.words import Passage, Sensor, Span

if TYPE_CHECKING:
    from pydantic import TypeAdapter


@dataclass(frozen=True, slots=True, kw_only=True)
class Delivery:
    """How far a span has come, and the passages found in it since the delivery before."""

    sensor: Sensor
    span: Span
    chain_version: str
    passages: tuple[Passage, ...] = ()
    drift_ppm: float | None = None
    dropped_samples: int = 0
    moved_from_us: int | None = None  # the span was stored as beginning then, and is to be moved first

    @property
    def key(self) -> tuple[str, int]:
        """Which span it is about."""
        return self.sensor.name, self.span.started_us


def merged(deliveries: Iterable[Delivery]) -> list[Delivery]:
    """Make one delivery of those that follow each other and are about one span."""
    out: list[Delivery] = []
    for one in deliveries:
        last = next((d for d in reversed(out) if d.sensor.name == one.sensor.name), None)
        if last is not None and _goes_on(last, one):
            joined = replace(one, passages=last.passages + one.passages, moved_from_us=last.moved_from_us)
            out[out.index(last)] = joined
        else:
            out.append(one)
    return out


def _goes_on(before: Delivery, after: Delivery) -> bool:
    return (
        before.key == after.key
        and before.sensor == after.sensor
        and before.chain_version == after.chain_version
        and after.moved_from_us is None
    )


def to_json(deliveries: Sequence[Delivery]) -> bytes:
    """Write deliveries as JSON, exactly."""
    return _adapter().dump_json(tuple(deliveries))


def from_json(text: bytes) -> tuple[Delivery, ...]:
    """Read what `to_json` wrote; ValueError where it is something else."""
    return _adapter().validate_json(text)


@cache
def _adapter() -> TypeAdapter[tuple[Delivery, ...]]:
    from pydantic import TypeAdapter

    return TypeAdapter(tuple[Delivery, ...])
