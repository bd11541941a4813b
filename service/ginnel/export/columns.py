"""The columns of each exported table: a contract, with units and meaning for the descriptor."""

from __future__ import annotations

from dataclasses import dataclass

from ginnel.stats.speeds import PERCENTILE_METHOD
from ginnel.words import Direction, Flag, MoverKind, Story


@dataclass(frozen=True, slots=True, kw_only=True)
class Column:
    """One column: what a reader must know to use it."""

    name: str
    type: str  # of the Table Schema standard: string, datetime, number, integer
    description: str
    unit: str = ""
    required: bool = False
    values: tuple[str, ...] = ()


_DIRECTIONS = tuple(Direction)
_SENSOR = Column(name="sensor", type="string", description="name of the sensor", required=True)
_DIRECTION = Column(
    name="direction",
    type="string",
    description="as the sensor sees it; the plain names of both ways are with the sensors below",
    required=True,
    values=_DIRECTIONS,
)
_INTERVAL = (
    _SENSOR,
    Column(
        name="interval_start",
        type="datetime",
        description="start of the interval, with the offset from UTC that holds at the site then",
        required=True,
    ),
    Column(
        name="interval_end",
        type="datetime",
        description="end of the interval, which is not part of it",
        required=True,
    ),
    _DIRECTION,
)

PASSAGE_COLUMNS = (
    Column(
        name="passage_id",
        type="string",
        description="lasting name: the sensor, and the crossing in microseconds since 1970 UTC",
        required=True,
    ),
    _SENSOR,
    Column(name="started_at", type="datetime", description="first heard, UTC", required=True),
    Column(
        name="crossed_at", type="datetime", description="beside or beneath the sensor, UTC", required=True
    ),
    Column(name="ended_at", type="datetime", description="last heard, UTC", required=True),
    _DIRECTION,
    Column(
        name="direction_confidence",
        type="number",
        description="probability that the direction is right, 0.5 to 1; blank where it is unknown",
        unit="1",
    ),
    Column(name="speed_mps", type="number", description="speed along the path", unit="m/s"),
    Column(name="speed_se_mps", type="number", description="standard error of the speed", unit="m/s"),
    Column(
        name="speed_band",
        type="string",
        description="speed band, in m/s, closed below and open above",
    ),
    Column(name="snr_db", type="number", description="signal to noise ratio", unit="dB"),
    Column(
        name="mover",
        type="string",
        description="what moved; blank where that cannot be told",
        values=tuple(MoverKind),
    ),
    Column(
        name="flags",
        type="string",
        description=(
            "what to know before trusting the passage, parted by semicolons, from: "
            + ", ".join([*(story for story in Story if story is not Story.PASSAGE), *Flag])
            + "; turn-backs and fidgeting are no passages and do not count"
        ),
    ),
)

COUNT_COLUMNS = (
    *_INTERVAL,
    Column(
        name="count",
        type="integer",
        description="passages counted while listening; blank where the interval was never listened to",
        unit="1",
    ),
    Column(
        name="count_low", type="number", description="lower exact 95 % Poisson limit of the count", unit="1"
    ),
    Column(
        name="count_high", type="number", description="upper exact 95 % Poisson limit of the count", unit="1"
    ),
    Column(
        name="corrected",
        type="number",
        description="count corrected by tallies; blank where there is no tally",
        unit="1",
    ),
    Column(
        name="coverage", type="number", description="share of the interval that was listened to", unit="1"
    ),
    Column(name="listened_s", type="number", description="time listened in the interval", unit="s"),
)

SPEED_COLUMNS = (
    *_INTERVAL,
    Column(
        name="n",
        type="integer",
        description="passages with a measured speed; blank where the interval was never listened to",
        unit="1",
    ),
    Column(name="mean_mps", type="number", description="mean over passages (time-mean speed)", unit="m/s"),
    Column(name="space_mean_mps", type="number", description="harmonic mean (space-mean speed)", unit="m/s"),
    Column(name="sd_mps", type="number", description="sample standard deviation, n - 1", unit="m/s"),
    *(
        Column(
            name=f"p{percent}_mps",
            type="number",
            description=f"{percent}th percentile ({PERCENTILE_METHOD})",
            unit="m/s",
        )
        for percent in (15, 50, 85, 95)
    ),
)
