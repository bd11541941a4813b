"""Recorded captures through the chain into the store, one transaction for each span.

The sensor is asked for by time, since a mounting is dated: a span is read under the mounting of its
first sample. Nothing is stored of a span before all of it has been read, so whatever stops a replay
leaves whole spans behind, and replaying again gives the same rows.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

from ginnel.capture import RecordedSpan
from ginnel.chain import CHAIN_VERSION, Chain
from ginnel.store import SpanChange, Store, record_span
from ginnel.words import Direction, Passage, Sensor, Span, Story

BLOCK_SAMPLES = 1 << 16

OnProgress = Callable[[float], None]


@dataclass(frozen=True, slots=True, kw_only=True)
class ReplayedSpan:
    """A span that was read: what was found in it, and what that changed in the log."""

    span: Span
    paths: tuple[Path, ...]
    passages: tuple[Passage, ...]
    change: SpanChange

    def count(self, direction: Direction) -> int:
        """Passages that count, of one direction."""
        return sum(p.story is Story.PASSAGE and p.direction is direction for p in self.passages)

    def count_story(self, story: Story) -> int:
        """Movers that did a thing."""
        return sum(p.story is story for p in self.passages)


def find_passages(
    sensor: Sensor, recorded: RecordedSpan, on_progress: OnProgress | None = None
) -> tuple[Passage, ...]:
    """Read a recorded span and find the passages in it; progress is told in seconds of capture."""
    chain = Chain(sensor, recorded.sample_rate_hz, recorded.started_us)
    found: list[Passage] = []
    for block in recorded.iter_blocks(BLOCK_SAMPLES):
        found += chain.push(block.samples)
        if on_progress is not None:
            on_progress(len(block.samples) / recorded.sample_rate_hz)
    return (*found, *chain.finish())


def replay_span(
    store: Store, sensor: Sensor, recorded: RecordedSpan, on_progress: OnProgress | None = None
) -> ReplayedSpan:
    """Read a recorded span and store it with its passages, whole or not at all.

    Raises
    ------
    CaptureError
        A file is no longer what it was when it was opened. Nothing is stored.
    StoreError
        It overlaps a part of what is stored, or the store cannot be written. Nothing is stored.
    """
    passages = find_passages(sensor, recorded, on_progress)
    span = recorded.to_span()
    change = record_span(store, sensor, span, passages, CHAIN_VERSION)
    return ReplayedSpan(span=span, paths=recorded.paths, passages=passages, change=change)
