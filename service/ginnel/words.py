"""The words that every part of Ginnel shares, as values.

Signs: a positive radial speed, and a positive Doppler frequency on an I/Q sensor, mean
*approaching*. ``Direction`` is as the sensor sees it; the site gives both ways plain names.

Times: ``_us`` is integer microseconds since 1970-01-01T00:00:00Z. Intervals are half-open,
[start, end), and named by their start.

Passages: ``started_us`` and ``ended_us`` bound the time in which the mover was heard,
``crossed_us`` is when it was beside (or beneath) the sensor. The crossing may lie at, or a
little outside, the heard time where the sensor looks one way only.

Speed bands are closed below and open above. ``None`` means not measured, 0 a measured zero.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

FloatArray = NDArray[np.floating]
#: float32 (mono) or complex64 (I/Q).
SampleArray = NDArray[np.inexact]

US_PER_S = 1_000_000


class Channels(StrEnum):
    """What a module gives: one mixer output, or the I/Q pair."""

    MONO = "mono"
    IQ = "iq"


class Aspect(StrEnum):
    """How a sensor looks at the path: along it, or at an angle."""

    AXIAL = "axial"
    OBLIQUE = "oblique"


class Direction(StrEnum):
    """Which way a mover went, as the sensor sees it."""

    APPROACHING = "approaching"
    RECEDING = "receding"
    UNKNOWN = "unknown"


class Story(StrEnum):
    """What a mover did. Only a passage counts; the others are logged."""

    PASSAGE = "passage"
    TURN_BACK = "turn-back"
    FIDGET = "fidget"


class MoverKind(StrEnum):
    """What moved, where that can be told."""

    ON_FOOT = "on foot"
    ON_WHEELS = "on wheels"


class Flag(StrEnum):
    """What to know before trusting one passage."""

    CLIPPED = "clipped"
    CUT = "cut"  # the span began or ended in the middle of it
    OVERLAPPING = "overlapping"  # another mover was heard at the same time
    LOW_CONFIDENCE = "low-confidence"
    UNSETTLED = "unsettled"  # the site has not been learnt yet


@dataclass(frozen=True, slots=True, kw_only=True)
class Site:
    """The place that is watched; its time zone says where hours and days begin."""

    name: str
    timezone: str = "UTC"  # an IANA name


@dataclass(frozen=True, slots=True, kw_only=True)
class Mounting:
    """How a sensor looks at the path.

    The path runs along x; the sensor line is x = 0 and the beam points towards positive x.
    """

    aspect: Aspect = Aspect.AXIAL
    height_m: float = 2.4
    offset_m: float = 0.0
    beam_angle_deg: float = 0.0
    tilt_deg: float = 0.0
    beam_width_deg: tuple[float, float] | None = None  # horizontal, vertical, half power
    since_us: int | None = None  # None: since ever


@dataclass(frozen=True, slots=True, kw_only=True)
class Sensor:
    """One radar module at one place, as the measuring chain needs to know it."""

    name: str
    carrier_hz: float = 10.525e9
    channels: Channels = Channels.MONO
    swap_iq: bool = False
    mains_hz: float = 50.0
    speed_bands_mps: tuple[float, ...] = (0.5, 1.0, 1.5, 2.0, 3.0)
    min_speed_mps: float = 0.3
    max_speed_mps: float = 5.0
    highpass_hz: float | None = None
    approaching_name: str = "approaching"
    receding_name: str = "receding"
    mounting: Mounting = Mounting()


@dataclass(frozen=True, slots=True, kw_only=True)
class Door:
    """A sensor at a way into a space, and how well it counts."""

    sensor: str
    entering: Direction  # approaching or receding
    recall: float = 0.95  # share of those who go through that is counted
    recall_se: float = 0.02  # its standard error, each way
    direction_error: float = 0.02  # share counted as going the other way


@dataclass(frozen=True, slots=True, kw_only=True)
class Space:
    """A room, wing or yard whose doors are all watched."""

    name: str
    empty_at_min: int  # when nobody is in it: minutes of the site's clock after midnight
    doors: tuple[Door, ...]


@dataclass(frozen=True, slots=True, kw_only=True)
class Block:
    """Consecutive samples of a capture with the time of the first one.

    ``samples`` is float32 (mono) or complex64 (I/Q, I + jQ), shape (n,), full scale 1.0.
    """

    started_us: int
    sample_rate_hz: float
    samples: SampleArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Gap:
    """A stretch of time that was not heard; whatever follows begins a new span."""

    started_us: int
    ended_us: int
    reason: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Span:
    """An unbroken stretch of time, [started_us, ended_us), in which a sensor was listening."""

    started_us: int
    ended_us: int
    sample_rate_hz: float
    clock_trusted: bool = True

    @property
    def listened_s(self) -> float:
        """Seconds listened."""
        return (self.ended_us - self.started_us) / US_PER_S


@dataclass(frozen=True, slots=True, kw_only=True)
class Passage:
    """One mover and what it did; see the module's text for its three times.

    ``direction_confidence`` is the probability, 0.5 to 1, that ``direction`` is right
    (None where the direction is unknown). ``speed_mps`` is along the path, never negative.
    """

    started_us: int
    crossed_us: int
    ended_us: int
    story: Story = Story.PASSAGE
    direction: Direction
    direction_confidence: float | None
    speed_mps: float | None
    speed_se_mps: float | None
    snr_db: float | None
    mover: MoverKind | None = None
    flags: frozenset[Flag] = frozenset()


class Severity(StrEnum):
    """How bad it is: counts are worse than they could be, or they are not being made."""

    WARNING = "warning"
    FAILURE = "failure"


@dataclass(frozen=True, slots=True, kw_only=True)
class HealthSample:
    """How well a sensor heard in the minute before a moment, and how its computer did; None: not known.

    Levels are decibels against full scale (0 dBFS is a sine that just fits); lines stand so far above
    the noise beside them.
    """

    at_us: int
    listened_s: float = 0.0
    level_dbfs: float | None = None
    noise_dbfs_hz: float | None = None  # density of the noise between the lines
    hum_db: float | None = None  # strongest line at an odd multiple of the mains frequency
    lamp_db: float | None = None  # strongest line at an even one, which is how lamps flicker
    lamp_mps: float | None = None  # the speed that it looks like
    clipped_share: float | None = None  # of samples
    dropped_samples: int = 0
    lag_s: float | None = None  # the newest sample is so old
    disk_free_bytes: int | None = None
    disk_size_bytes: int | None = None
    resident_bytes: int | None = None
    temperature_c: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Condition:
    """Something that is wrong, or was, and what to do about it."""

    kind: str
    sensor: str | None  # None: it concerns all
    severity: Severity
    raised_us: int
    cleared_us: int | None = None  # None: it still is
    sentence: str
    advice: str


def speed_band_label(speed_mps: float | None, edges_mps: Sequence[float]) -> str:
    """Name of the speed band that holds a speed: ``<0.5``, ``0.5-1``, ``>=3``.

    Bands are closed below and open above; an unknown speed has an empty label.
    """
    if speed_mps is None or math.isnan(speed_mps):
        return ""
    return speed_band_labels(edges_mps)[sum(speed_mps >= edge for edge in edges_mps)]


def speed_band_labels(edges_mps: Sequence[float]) -> list[str]:
    """Names of all bands between ascending edges, slowest first; one more than edges."""
    if not edges_mps:
        return ["all"]
    inner = [f"{low:g}-{high:g}" for low, high in pairwise(edges_mps)]
    return [f"<{edges_mps[0]:g}", *inner, f">={edges_mps[-1]:g}"]
