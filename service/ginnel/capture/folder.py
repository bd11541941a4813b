"""A folder that a recorder drops files into, read file by file as they are completed.

A file is complete once it has not grown for a while. Files are read in order of time, and what joins to
within two samples is one span, just as in a replay of the same files. Nothing here is remembered between
two runs: whoever reads says where the last run had come to (`FolderPlace`).
"""

from __future__ import annotations

import logging
import shutil
from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from threading import Event

from ginnel.capture.live import Break, FileRead, Heard, Idle, SourceState
from ginnel.capture.recordings import Recording, Segment, find_captures, open_recording, sample_us
from ginnel.capture.spans import joins_within_us
from ginnel.clock import Clock
from ginnel.errors import CaptureError
from ginnel.times import utc_text
from ginnel.words import US_PER_S, Block, Sensor

log = logging.getLogger(__name__)

_BLOCK_SAMPLES = 1 << 16
_POLL_S = 1.0
#: Without a new file for so long, and for twice the last file's length, the span is over.
_IDLE_US = 60 * US_PER_S


@dataclass(frozen=True, slots=True, kw_only=True)
class FolderPlace:
    """How far a folder has been read: the span that is open, if any, and the files that are done with."""

    started_us: int | None = None
    sample_rate_hz: float = 0.0
    n_samples: int = 0
    read_names: frozenset[str] = frozenset()

    @property
    def ended_us(self) -> int | None:
        """Where the open span goes on."""
        if self.started_us is None:
            return None
        return sample_us(self.started_us, self.n_samples, self.sample_rate_hz)


@dataclass(slots=True)
class _Look:
    """What a file looked like, and since when."""

    size: int
    changed_ns: int
    since_us: int
    recording: Recording | None = None  # once it was found complete and sound
    is_faulty: bool = False


class FolderSource:
    """Files of one sensor as they are completed.

    Parameters
    ----------
    settle_s : a file that has not grown for so long is complete
    after : ``keep``, ``archive`` or ``delete``: what becomes of a file that was let go
    archive : where it goes then
    place : where to go on
    mounted_us : when the sensor was mounted otherwise: a span ends before the file that begins after it
    """

    def __init__(
        self,
        folder: Path,
        sensor: Sensor,
        clock: Clock,
        *,
        settle_s: float = 5.0,
        after: str = "keep",
        archive: Path | None = None,
        place: FolderPlace | None = None,
        mounted_us: Sequence[int] = (),
    ) -> None:
        self._folder, self._sensor, self._clock = folder, sensor, clock
        self._settle_us = round(settle_s * US_PER_S)
        self._poll_s = min(_POLL_S, settle_s / 2)
        self._after, self._archive = after, archive
        self._mounted_us = mounted_us
        self.place = place or FolderPlace()
        self._looks: dict[str, _Look] = {}
        self._last_file_us = 0
        self._read_us = clock.read().steady_us
        self._fault: str | None = None
        self._told: set[str] = set()

    @property
    def state(self) -> SourceState:
        """How it is doing."""
        return SourceState(fault=self._fault)

    def iter_heard(self, stop: Event) -> Iterator[Heard]:
        """Give what is heard until stopped. The open span is left open: the next run may go on with it."""
        while not stop.is_set():
            began_us = self._clock.read().steady_us
            recording = self._next_complete()
            if recording is None:
                looked_s = (self._clock.read().steady_us - began_us) / US_PER_S
                yield from self._rest()
                self._clock.wait(stop, max(self._poll_s, 20 * looked_s))  # a large folder is looked at less
                continue
            yield from self._read(recording, stop)

    def let_go(self, path: Path) -> None:
        """Keep, archive or delete a file that will never be needed again."""
        try:
            if self._after == "delete":
                path.unlink(missing_ok=True)
            elif self._after == "archive" and self._archive is not None:
                self._archive.mkdir(parents=True, exist_ok=True)
                for part in _parts(path):
                    shutil.move(part, self._archive / part.name)
        except OSError as exc:
            self._tell_once(f"{self._folder}: what was heard cannot be taken away: {exc.strerror or exc}")

    def close(self) -> None:
        """Nothing is kept open between two files."""

    def _next_complete(self) -> Recording | None:
        """Find the earliest complete file that has not been read and is fit to be."""
        try:
            if not self._folder.is_dir():
                raise CaptureError(f"{self._folder}: is no folder, or not there")
            paths = [path for path in find_captures([self._folder]) if path.name not in self.place.read_names]
            self._fault = None
        except (CaptureError, OSError) as exc:
            self._fault = f"{self._folder}: {exc.strerror}" if isinstance(exc, OSError) else str(exc)
            self._tell_once(f"{self._fault}: waiting for it")
            return None
        now_us = self._clock.read().steady_us
        self._looks = {path.name: look for path in paths if (look := self._look(path, now_us))}
        growing = [name for name, look in self._looks.items() if now_us - look.since_us < self._settle_us]
        first_growing = min(growing, default=None)
        for path in paths:
            look = self._looks.get(path.name)
            # what is still growing and sorts before it has its turn first
            if look is not None and (first_growing is None or path.name < first_growing):
                self._open(path, look)
        ready = [look.recording for look in self._looks.values() if look.recording is not None]
        return min(ready, key=lambda recording: (recording.started_us, recording.path), default=None)

    def _open(self, path: Path, look: _Look) -> None:
        if look.recording is not None or look.is_faulty:
            return
        try:
            look.recording = open_recording(path, self._sensor).check()
        except (CaptureError, OSError) as exc:
            look.is_faulty = True
            log.error("%s (left out until it changes)", exc)

    def _tell_once(self, text: str) -> None:
        if text not in self._told:
            self._told.add(text)
            log.error("%s", text)

    def _look(self, path: Path, now_us: int) -> _Look | None:
        try:
            stats = [part.stat() for part in _parts(path)]
        except OSError:
            return None  # gone again
        size, changed_ns = sum(s.st_size for s in stats), max(s.st_mtime_ns for s in stats)
        known = self._looks.get(path.name)
        if known is not None and (known.size, known.changed_ns) == (size, changed_ns):
            return known
        return _Look(size, changed_ns, now_us)

    def _rest(self) -> Iterator[Heard]:
        """Say that nothing is new, and end a span that nothing seems to follow."""
        idle_us = self._clock.read().steady_us - self._read_us
        if self.place.started_us is not None and idle_us > _IDLE_US + 2 * self._last_file_us:
            yield from self._end_span("no more files came")
        yield Idle()

    def _read(self, recording: Recording, stop: Event) -> Iterator[Heard]:
        """Give one file, and say so at its end."""
        name = recording.path.name
        late_us = self._joins(recording)
        if late_us is not None and late_us < 0:
            self._mark_read(name)
            log.error(
                "%s: starts at %s, %.6g s before what was heard last ends; `ginnel replay` can still read it",
                recording.path,
                utc_text(recording.started_us),
                -late_us / US_PER_S,
            )
            return
        try:
            for segment in recording.segments:
                yield from self._open_span(segment, recording.sample_rate_hz)
                yield from self._read_segment(recording, segment, stop)
                if stop.is_set():
                    return  # the next run begins this file anew
        except (CaptureError, OSError) as exc:
            log.error("%s", exc)
            self._mark_read(name)
            yield from self._end_span("a file could not be read")
            return
        self._last_file_us = recording.ended_us - recording.started_us
        self._read_us = self._clock.read().steady_us
        self._mark_read(name)
        yield FileRead(path=recording.path)

    def _mark_read(self, name: str) -> None:
        """A file is done with; names of files that are gone need not be kept."""
        there = {path.name for path in find_captures([self._folder])}
        self.place = replace(self.place, read_names=(self.place.read_names & there) | {name})

    def _joins(self, recording: Recording) -> int | None:
        """How long after the open span a recording begins, 0 if it joins; None without a span."""
        if self.place.ended_us is None:
            return None
        hole_us = recording.started_us - self.place.ended_us
        return 0 if abs(hole_us) <= joins_within_us(self.place.sample_rate_hz) else hole_us

    def _open_span(self, segment: Segment, rate_hz: float) -> Iterator[Heard]:
        """Go on with the span if the segment joins, else end it and begin another."""
        place = self.place
        if place.started_us is not None and place.ended_us is not None:
            is_joined = abs(segment.started_us - place.ended_us) <= joins_within_us(rate_hz)
            is_moved = any(place.started_us < us <= segment.started_us for us in self._mounted_us)
            if is_joined and not is_moved and rate_hz == place.sample_rate_hz:
                return
            why = "mounted otherwise" if is_moved else "another rate" if is_joined else "not recorded"
            yield from self._end_span(why)
        self.place = replace(self.place, started_us=segment.started_us, sample_rate_hz=rate_hz, n_samples=0)

    def _read_segment(self, recording: Recording, segment: Segment, stop: Event) -> Iterator[Block]:
        place = self.place
        assert place.started_us is not None  # noqa: S101 (a span was opened)
        for block in recording.iter_segment(
            segment, block_samples=_BLOCK_SAMPLES, started_us=place.started_us, index=place.n_samples
        ):
            if stop.is_set():
                return
            yield block
            self.place = replace(self.place, n_samples=self.place.n_samples + len(block.samples))

    def _end_span(self, reason: str) -> Iterator[Break]:
        if self.place.started_us is not None:
            self.place = FolderPlace(read_names=self.place.read_names)
            yield Break(reason=reason)


def _parts(path: Path) -> list[Path]:
    """Both files of a SigMF recording, or the one of any other."""
    if path.suffix == ".sigmf-meta":
        return [path, path.with_suffix(".sigmf-data")]
    return [path]
