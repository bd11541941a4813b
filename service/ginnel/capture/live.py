"""What a live source gives: blocks of samples with their time, and where they break off."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from threading import Event
from typing import Protocol

from ginnel.words import Block


@dataclass(frozen=True, slots=True, kw_only=True)
class Break:
    """The span is over: whatever follows begins another."""

    reason: str
    dropped_samples: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Dated:
    """The clock is set now, and the open span turns out to have begun this much later (or earlier)."""

    moved_by_us: int


@dataclass(frozen=True, slots=True, kw_only=True)
class FileRead:
    """A file was read to its end. Whoever has made sure of what was in it lets the source know."""

    path: Path


@dataclass(frozen=True, slots=True, kw_only=True)
class Idle:
    """Nothing new for the moment; the source is alive."""


Heard = Block | Break | Dated | FileRead | Idle


@dataclass(frozen=True, slots=True, kw_only=True)
class SourceState:
    """How a source is doing, for whoever watches over it."""

    fault: str | None = None  # why nothing can be heard, in a few words
    lag_s: float = 0.0  # samples that wait to be read, in seconds
    dropped_samples: int = 0  # since the start
    drift_ppm: float | None = None  # of the wall clock against the sample clock
    is_clock_trusted: bool = True


class Source(Protocol):
    """Samples of one sensor as they come."""

    @property
    def state(self) -> SourceState:
        """How it is doing; may be asked from any thread."""

    def iter_heard(self, stop: Event) -> Iterator[Heard]:
        """Give whatever is heard, at least an `Idle` a second, until stopped or at an end."""

    def close(self) -> None:
        """Let go of the device; harmless when repeated."""
