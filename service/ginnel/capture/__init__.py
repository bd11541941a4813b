"""Where samples come from, with their time and gaps.

In: files, sound cards, pipes, sockets, serial lines. Out: blocks of samples and gaps, dated in UTC.
May not know what samples mean: no spectra, no passages, no store. Faults of files become one clear
line here (`CaptureFormatError`, `CaptureTimeError`), before any sample is handed on.
"""

from ginnel.capture.folder import FolderPlace, FolderSource
from ginnel.capture.live import Break, Dated, FileRead, Heard, Idle, Source, SourceState
from ginnel.capture.recordings import (
    RATE_LIMITS_HZ,
    Recording,
    Segment,
    find_captures,
    open_recording,
    sample_us,
)
from ginnel.capture.sound_files import RawFormat
from ginnel.capture.spans import Arrangement, RecordedSpan, arrange
from ginnel.capture.starts import StartSource

__all__ = [
    "RATE_LIMITS_HZ",
    "Arrangement",
    "Break",
    "Dated",
    "FileRead",
    "FolderPlace",
    "FolderSource",
    "Heard",
    "Idle",
    "RawFormat",
    "RecordedSpan",
    "Recording",
    "Segment",
    "Source",
    "SourceState",
    "StartSource",
    "arrange",
    "find_captures",
    "open_recording",
    "sample_us",
]
