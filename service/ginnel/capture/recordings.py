"""Recordings on disk: opened cheaply, checked before anything is handed on, read in blocks."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass, replace
from pathlib import Path

from ginnel.capture.sigmf_files import SigmfFile, Stretch, look_at_sigmf_file, sigmf_paths
from ginnel.capture.sound_files import RawFormat, SoundFile, look_at_sound_file
from ginnel.capture.starts import StartSource, find_start
from ginnel.errors import CaptureError, CaptureFormatError
from ginnel.words import US_PER_S, Block, Channels, Gap, Sensor

RATE_LIMITS_HZ = (1_000.0, 192_000.0)
#: Suffixes that a folder is searched for; raw PCM must be named by hand, since it cannot say what it is.
SUFFIXES = (".wav", ".wave", ".rf64", ".bwf", ".flac", ".sigmf-meta")
_SIGMF_SUFFIXES = (".sigmf-meta", ".sigmf-data")


def sample_us(started_us: int, index: int, sample_rate_hz: float) -> int:
    """When a sample was taken, by the sample clock."""
    return started_us + round(index * US_PER_S / sample_rate_hz)


@dataclass(frozen=True, slots=True, kw_only=True)
class Segment:
    """Samples of a recording without a hole in time."""

    started_us: int
    first_sample: int
    n_samples: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Recording:
    """One recorded capture, of one sensor; nothing of it is kept open or in memory."""

    path: Path
    sensor_name: str
    channels: Channels
    sample_rate_hz: float
    segments: tuple[Segment, ...]
    start_source: StartSource
    source: SoundFile | SigmfFile
    is_checked: bool = False

    @property
    def started_us(self) -> int:
        """When the first sample was taken."""
        return self.segments[0].started_us

    @property
    def ended_us(self) -> int:
        """When the sample after the last would have been taken."""
        last = self.segments[-1]
        return sample_us(last.started_us, last.n_samples, self.sample_rate_hz)

    @property
    def n_samples(self) -> int:
        """Samples that are there, holes not counted."""
        return sum(segment.n_samples for segment in self.segments)

    def check(self) -> Recording:
        """Read whatever the header cannot vouch for; gives the recording marked as checked.

        Raises
        ------
        CaptureFormatError
            The samples are not what the header promises.
        """
        if not self.is_checked:
            self.source.check()
        return replace(self, is_checked=True)

    def iter_blocks(self, block_samples: int = 65536) -> Iterator[Block | Gap]:
        """Give the samples in blocks, with the holes between; the whole file is checked first."""
        self.check()
        for number, segment in enumerate(self.segments):
            if number:
                before = self.segments[number - 1]
                yield Gap(
                    started_us=sample_us(before.started_us, before.n_samples, self.sample_rate_hz),
                    ended_us=segment.started_us,
                    reason="dropped samples",
                )
            yield from self.iter_segment(segment, block_samples=block_samples)

    def iter_segment(
        self, segment: Segment, *, block_samples: int = 65536, started_us: int | None = None, index: int = 0
    ) -> Iterator[Block]:
        """Give the blocks of one segment, its first sample being the index-th since started_us."""
        origin_us = segment.started_us if started_us is None else started_us
        for samples in self.source.iter_samples(segment.first_sample, segment.n_samples, block_samples):
            yield Block(
                started_us=sample_us(origin_us, index, self.sample_rate_hz),
                sample_rate_hz=self.sample_rate_hz,
                samples=samples,
            )
            index += len(samples)


def open_recording(
    path: Path, sensor: Sensor, *, started_us: int | None = None, raw: RawFormat | None = None
) -> Recording:
    """Look at a capture's header and settle when it begins; reads no samples of plain files.

    Parameters
    ----------
    path : a WAV, RF64, FLAC or raw PCM file, or either file of a SigMF recording
    sensor : whose channels the file must have
    started_us : when it begins, above all that the file itself says
    raw : the sample type and rate of a file without a header

    Raises
    ------
    CaptureFormatError
        The file is empty, truncated, of another kind, or not of this sensor.
    CaptureTimeError
        Nothing tells when it begins.
    """
    try:
        source = _look_at(path, sensor, raw)
    except OSError as exc:
        raise CaptureError(f"{path}: {exc.strerror or exc}") from exc
    low_hz, high_hz = RATE_LIMITS_HZ
    if not low_hz <= source.sample_rate_hz <= high_hz:
        raise CaptureFormatError(
            f"{path}: sampled at {source.sample_rate_hz:g} Hz; Ginnel reads {low_hz:g} to {high_hz:g} Hz, "
            "resample it"
        )
    if source.n_samples == 0:
        raise CaptureFormatError(f"{path}: holds no samples; remove it")
    start = find_start(source.path, given_us=started_us, header_us=source.header_us)
    stretches = (
        source.stretches
        if isinstance(source, SigmfFile)
        else (Stretch(first_sample=0, n_samples=source.n_samples, after_us=0),)
    )
    return Recording(
        path=source.path,
        sensor_name=sensor.name,
        channels=sensor.channels,
        sample_rate_hz=source.sample_rate_hz,
        segments=tuple(
            Segment(
                started_us=start.started_us + stretch.after_us,
                first_sample=stretch.first_sample,
                n_samples=stretch.n_samples,
            )
            for stretch in stretches
        ),
        start_source=start.source,
        source=source,
    )


def find_captures(paths: Sequence[Path]) -> list[Path]:
    """Name the captures that are meant: files as they are, folders by what lies in them.

    Both files of a SigMF recording are one capture; the order is that of the names.

    Raises
    ------
    CaptureError
        A path does not exist.
    """
    found: dict[Path, None] = {}
    for path in paths:
        if path.is_dir():
            inside = sorted(p for p in path.iterdir() if p.is_file() and p.suffix.lower() in SUFFIXES)
            found.update(dict.fromkeys(inside))
        elif not path.exists():
            raise CaptureError(f"{path}: is not there")
        elif path.suffix.lower() in _SIGMF_SUFFIXES:
            found[sigmf_paths(path)[0]] = None
        else:
            found[path] = None
    return list(found)


def _look_at(path: Path, sensor: Sensor, raw: RawFormat | None) -> SoundFile | SigmfFile:
    if path.is_dir():
        raise CaptureFormatError(f"{path}: is a folder; name the captures in it")
    suffix = path.suffix.lower()
    if suffix in _SIGMF_SUFFIXES:
        return look_at_sigmf_file(path, sensor)
    if suffix == ".sigmf":
        raise CaptureFormatError(
            f"{path}: is a SigMF archive; unpack it (it is a tar file) and name what is inside"
        )
    if path.stat().st_size == 0:
        raise CaptureFormatError(f"{path}: is empty; remove it")
    return look_at_sound_file(path, sensor, raw)
