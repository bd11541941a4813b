"""The columns of each exported table: a contract, with units and meaning for the descriptor."""

from __future__ import annotations

from dataclasses import dataclass
from enum import StrEnum

from ginnel.stats.speeds import PERCENTILE_METHOD
from ginnel.words import Direction, Flag, MoverKind, Story


class Kind(StrEnum):
    """What the cells of a column are, by the names of the Table Schema standard."""

    TEXT = "string"
    MOMENT = "datetime"
    NUMBER = "number"
    WHOLE = "integer"


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One column: what a reader must know to use it."""

    name: str
    kind: Kind
    description: str
    unit: str = ""
    decimals: int = 0  # of a number, as every kind of file has it
    local: bool = False  # of a moment: by the site's clock, with its offset from UTC
    required: bool = False
    values: tuple[str, ...] = ()


def _text(name: str, description: str, *, required: bool = False, values: tuple[str, ...] = ()) -> Column:
    return Column(name=name, kind=Kind.TEXT, description=description, required=required, values=values)


def _moment(name: str, description: str, *, local: bool = False) -> Column:
    return Column(name=name, kind=Kind.MOMENT, description=description, local=local, required=True)


def _number(name: str, description: str, unit: str = "1", decimals: int = 4) -> Column:
    return Column(name=name, kind=Kind.NUMBER, description=description, unit=unit, decimals=decimals)


def _whole(name: str, description: str, unit: str = "1") -> Column:
    return Column(name=name, kind=Kind.WHOLE, description=description, unit=unit)


_SENSOR = _text("sensor", "name of the sensor", required=True)
_DIRECTION = _text(
    "direction",
    "as the sensor sees it; the site's plain names of both ways are told with each sensor",
    required=True,
    values=tuple(Direction),
)
_INTERVAL = (
    _SENSOR,
    _moment("interval_start", "start of the interval, by the site's clock", local=True),
    _moment("interval_end", "end of the interval, which is not part of it, by the site's clock", local=True),
)
_LISTENED = (
    _number("coverage", "share of the interval that was listened to", decimals=6),
    _number("listened_s", "time listened in the interval", "s", 6),
)
_NOT_COUNTED = tuple(story for story in Story if story is not Story.PASSAGE)

PASSAGE_COLUMNS = (
    _text(
        "passage_id",
        "lasting name: the sensor, and the crossing in microseconds since 1970 UTC",
        required=True,
    ),
    _SENSOR,
    _moment("started_at", "first heard, UTC"),
    _moment("crossed_at", "beside or beneath the sensor, UTC"),
    _moment("ended_at", "last heard, UTC"),
    _DIRECTION,
    _number(
        "direction_confidence",
        "probability that the direction is right, 0.5 to 1; blank where it is unknown",
    ),
    _number("speed_mps", "speed along the path", "m/s"),
    _number("speed_se_mps", "standard error of the speed", "m/s"),
    _text("speed_band", "speed band, in m/s, closed below and open above"),
    _number("snr_db", "signal to noise ratio", "dB", 2),
    _text("mover", "what moved; blank where that cannot be told", values=tuple(MoverKind)),
    _text(
        "flags",
        "what to know before trusting the passage, parted by semicolons, from: "
        + ", ".join([*_NOT_COUNTED, *Flag])
        + "; turn-backs and fidgeting are no passages and do not count",
    ),
)

COUNT_COLUMNS = (
    *_INTERVAL,
    _DIRECTION,
    _whole("count", "passages counted while listening; blank where the interval was never listened to"),
    _number("count_low", "lower exact 95 % Poisson limit of the count"),
    _number("count_high", "upper exact 95 % Poisson limit of the count"),
    _number("corrected", "count corrected by tallies; blank where there is no tally"),
    *_LISTENED,
)

SPEED_COLUMNS = (
    *_INTERVAL,
    _DIRECTION,
    _whole("n", "passages with a measured speed; blank where the interval was never listened to"),
    _number("mean_mps", "mean over passages (time-mean speed)", "m/s"),
    _number("space_mean_mps", "harmonic mean (space-mean speed)", "m/s"),
    _number("sd_mps", "sample standard deviation, n - 1", "m/s"),
    *(
        _number(f"p{percent}_mps", f"{percent}th percentile ({PERCENTILE_METHOD})", "m/s")
        for percent in (15, 50, 85, 95)
    ),
)

OCCUPANCY_COLUMNS = (
    *_INTERVAL,
    _number(
        "occupied_s",
        "time in which at least one mover was heard, several at once once; blank where never listened to",
        "s",
        6,
    ),
    _number("occupancy", "share of the time listened in which at least one mover was heard", decimals=6),
    *_LISTENED,
)

HEALTH_COLUMNS = (
    _SENSOR,
    _moment("measured_at", "end of the minute that was measured, UTC"),
    _number("listened_s", "time listened in the minute", "s", 3),
    _number("level_dbfs", "level of the input, full scale 0", "dB", 3),
    _number("noise_dbfs_hz", "noise of the input in a band of 1 Hz, full scale 0", "dB", 3),
    _number("hum_db", "hum of the mains above the noise", "dB", 3),
    _number("lamp_db", "strongest line of lamps above the noise", "dB", 3),
    _number("lamp_mps", "speed that the line of lamps looks like", "m/s", 3),
    _number("clipped_share", "share of the samples that were clipped", decimals=6),
    _whole("dropped_samples", "samples lost since the one before"),
    _number("lag_s", "how far counting was behind", "s", 3),
    _whole("disk_free_bytes", "room left on the disk", "B"),
    _whole("disk_size_bytes", "size of the disk", "B"),
    _whole("resident_bytes", "memory that the program held", "B"),
    _number("temperature_c", "temperature of the computer", "°C", 3),
)


def band_column(label: str) -> Column:
    """Column of the passages in one speed band."""
    return _whole(f"band_{label}", f"passages in the speed band {label} m/s, closed below and open above")
