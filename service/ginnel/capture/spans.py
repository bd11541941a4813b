"""One sensor's recordings in order: what joins is one span, holes are gaps, overlaps are refused."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path

from ginnel.capture.recordings import Recording, Segment, sample_us
from ginnel.errors import CaptureError, CaptureFormatError, CaptureTimeError
from ginnel.times import utc_text
from ginnel.words import US_PER_S, Block, Gap, Span

_JOINS_WITHIN_SAMPLES = 2.0
_ROUNDING_US = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class RecordedSpan:
    """An unbroken stretch of listening, recorded in one file or several.

    Its first sample is dated by the file it is in; the sample clock counts from there.
    """

    started_us: int
    sample_rate_hz: float
    pieces: tuple[tuple[Recording, Segment], ...]

    @property
    def n_samples(self) -> int:
        """Samples of all pieces."""
        return sum(segment.n_samples for _, segment in self.pieces)

    @property
    def ended_us(self) -> int:
        """When the sample after the last would have been taken."""
        return sample_us(self.started_us, self.n_samples, self.sample_rate_hz)

    @property
    def paths(self) -> tuple[Path, ...]:
        """Files that it is recorded in, in order."""
        return tuple(dict.fromkeys(recording.path for recording, _ in self.pieces))

    def to_span(self) -> Span:
        """Give the stretch of time."""
        return Span(started_us=self.started_us, ended_us=self.ended_us, sample_rate_hz=self.sample_rate_hz)

    def iter_blocks(self, block_samples: int = 65536) -> Iterator[Block]:
        """Give all samples in blocks; each file is checked before any of its samples is handed on."""
        index = 0
        for recording, segment in self.pieces:
            recording.check()
            yield from recording.iter_segment(
                segment, block_samples=block_samples, started_us=self.started_us, index=index
            )
            index += segment.n_samples


@dataclass(frozen=True, slots=True, kw_only=True)
class Arrangement:
    """Recordings in order: spans, the gaps between them, and what is wrong with those left out."""

    spans: tuple[RecordedSpan, ...]
    gaps: tuple[Gap, ...]
    refused: tuple[CaptureError, ...]


def arrange(recordings: Sequence[Recording]) -> Arrangement:
    """Put one sensor's recordings in order of time.

    Those that follow on to within two sample periods are one span. A recording that overlaps an earlier
    one, or that follows on at another sample rate, is left out with the reason.
    """
    if len({recording.sensor_name for recording in recordings}) > 1:
        raise ValueError("recordings of several sensors cannot be arranged together")
    runs: list[_Run] = []
    refused: list[CaptureError] = []
    for recording in sorted(recordings, key=lambda r: (r.started_us, r.path)):
        fault = _misfit(runs[-1], recording) if runs else None
        if fault is not None:
            refused.append(fault)
            continue
        for segment in recording.segments:
            if not runs or segment.started_us - runs[-1].ended_us > joins_within_us(recording.sample_rate_hz):
                runs.append(_Run(segment.started_us, recording.sample_rate_hz))
            runs[-1].add(recording, segment)
    spans = [run.to_recorded_span() for run in runs]
    gaps = tuple(
        Gap(
            started_us=before.ended_us,
            ended_us=after.started_us,
            reason="dropped samples" if before.paths[-1] == after.paths[0] else "not recorded",
        )
        for before, after in pairwise(spans)
    )
    return Arrangement(spans=tuple(spans), gaps=gaps, refused=tuple(refused))


def joins_within_us(sample_rate_hz: float) -> float:
    """How far two pieces may lie apart, or overlap, and still join."""
    return _JOINS_WITHIN_SAMPLES * US_PER_S / sample_rate_hz + _ROUNDING_US


class _Run:
    """A span while it is being put together."""

    def __init__(self, started_us: int, sample_rate_hz: float) -> None:
        self.started_us, self.sample_rate_hz = started_us, sample_rate_hz
        self.ended_us = started_us
        self._n_samples = 0
        self._pieces: list[tuple[Recording, Segment]] = []

    @property
    def last_name(self) -> str:
        return self._pieces[-1][0].path.name

    def add(self, recording: Recording, segment: Segment) -> None:
        self._pieces.append((recording, segment))
        self._n_samples += segment.n_samples
        self.ended_us = sample_us(self.started_us, self._n_samples, self.sample_rate_hz)

    def to_recorded_span(self) -> RecordedSpan:
        return RecordedSpan(
            started_us=self.started_us, sample_rate_hz=self.sample_rate_hz, pieces=tuple(self._pieces)
        )


def _misfit(run: _Run, recording: Recording) -> CaptureError | None:
    hole_us = recording.started_us - run.ended_us
    tolerance_us = joins_within_us(run.sample_rate_hz)
    if hole_us < -tolerance_us:
        return CaptureTimeError(
            f"{recording.path}: starts at {utc_text(recording.started_us)}, {-hole_us / US_PER_S:.6g} s "
            f"before {run.last_name} ends; mend its start time (--started-at) or leave one of the two out"
        )
    if hole_us <= tolerance_us and recording.sample_rate_hz != run.sample_rate_hz:
        return CaptureFormatError(
            f"{recording.path}: sampled at {recording.sample_rate_hz:g} Hz, but {run.last_name}, "
            f"which it follows on, at {run.sample_rate_hz:g} Hz; resample one of them"
        )
    return None
