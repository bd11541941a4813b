"""Makes the source that a sensor's settings name."""

from __future__ import annotations

from pathlib import Path

from ginnel.capture import FolderPlace, FolderSource, Source
from ginnel.capture.links import Link, PipeLink, SerialLink, TcpLink
from ginnel.capture.pcm import PcmDecoder, default_sample_type
from ginnel.capture.sound import SoundLink
from ginnel.capture.stream import StreamSource
from ginnel.clock import Clock
from ginnel.config import SensorSettings, SourceKind
from ginnel.words import Sensor


def make_folder_source(settings: SensorSettings, clock: Clock, place: FolderPlace | None) -> FolderSource:
    """Make the source of a sensor that hears from a folder."""
    source = settings.source
    return FolderSource(
        Path(source.path),
        settings.to_sensor(),
        clock,
        settle_s=source.settle_s,
        after=source.after,
        archive=None if source.archive is None else Path(source.archive),
        place=place,
        mounted_us=tuple(
            mounting.since_us for mounting in settings.mountings() if mounting.since_us is not None
        ),
    )


def make_stream_source(settings: SensorSettings, clock: Clock, not_before_us: int | None) -> Source:
    """Make the source of a sensor that hears from anything else; nothing is opened yet.

    Raises
    ------
    CaptureError
        A library that it needs is missing.
    """
    source, sensor = settings.source, settings.to_sensor()
    if source.rate_hz is None:
        raise ValueError(f"{source.kind} without rate_hz")  # the settings have seen to it
    sample_type = source.sample_type or default_sample_type(sensor.channels)
    return StreamSource(
        make_link(settings, sensor),
        PcmDecoder(sample_type, sensor),
        source.rate_hz,
        clock,
        retry_s=source.reconnect_s,
        not_before_us=not_before_us,
    )


def make_link(settings: SensorSettings, sensor: Sensor) -> Link:
    """Make what a sensor's raw samples come over."""
    source = settings.source
    match source.kind:
        case SourceKind.PIPE:
            return PipeLink(source.path)
        case SourceKind.TCP if source.host is not None and source.port is not None:
            return TcpLink(source.host, source.port)
        case SourceKind.SERIAL:
            return SerialLink(source.path, source.baud)
        case SourceKind.SOUND if source.rate_hz is not None:
            return SoundLink(source.device, sensor, source.rate_hz)
    raise ValueError(f"no link for {source.kind}")
