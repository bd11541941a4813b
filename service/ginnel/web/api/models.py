"""What the API is asked, and what it answers: the contract, of which the OpenAPI document is made."""

from __future__ import annotations

from datetime import date, datetime
from typing import Literal

from pydantic import BaseModel, ConfigDict, Field


class ViewQuery(BaseModel):
    """One sensor and whole days of the site's calendar."""

    model_config = ConfigDict(extra="ignore")

    sensor: str | None = Field(default=None, description="name of the sensor; the first one without")
    show: Literal["day", "week", "month", "year", "range"] = "day"
    on: date | None = Field(default=None, description="a day in it; the newest one without")
    to: date | None = Field(default=None, description="last day of a range")


class PassagesQuery(ViewQuery):
    """An hour of one day."""

    hour: str | None = Field(
        default=None,
        max_length=4,
        description="hour of the clock: 08, or 01+1 for one shown again; the last busy one without",
    )
    uncounted: bool = Field(default=False, description="turn-backs and fidgeting too, which do not count")


class Problem(BaseModel):
    """What went wrong (RFC 9457)."""

    type: str
    title: str
    status: int
    detail: str


class SensorOut(BaseModel):
    """A sensor."""

    name: str
    carrier_hz: float
    channels: Literal["mono", "iq"]
    approaching: str = Field(description="plain name of this direction")
    receding: str


class Sensors(BaseModel):
    """The site and its sensors."""

    site: str
    timezone: str
    sensors: list[SensorOut]


class ConditionOut(BaseModel):
    """Something that is or was wrong."""

    kind: str
    sensor: str | None
    severity: Literal["warning", "failure"]
    raised_at: datetime
    cleared_at: datetime | None
    sentence: str
    advice: str


class Ways(BaseModel):
    """Numbers by direction, as the sensor sees it."""

    approaching: int | None
    receding: int | None
    unknown: int | None = None


class SensorNow(BaseModel):
    """A sensor as it is now."""

    sensor: str
    listening: bool
    heard_until: datetime | None
    last_hour: Ways = Field(description="passages of the last hour of which the log knows")
    last_hour_coverage: float


class NowOut(BaseModel):
    """All sensors as they are now."""

    at: datetime
    sensors: list[SensorNow]
    conditions: list[ConditionOut]


class CountInterval(BaseModel):
    """One interval; counts are null where nobody listened."""

    start: datetime
    end: datetime
    counts: Ways
    both: int | None
    coverage: float
    usual: float | None = Field(description="both ways, median of like intervals of eight weeks before")
    usual_low: float | None
    usual_high: float | None


class Counts(BaseModel):
    """How busy it was."""

    sensor: str
    every: str
    intervals: list[CountInterval]
    total: Ways
    both: int | None
    low: float | None = Field(description="exact 95 % Poisson limits of both ways")
    high: float | None
    coverage: float
    listened_s: float


class Week(BaseModel):
    """Passages an hour by weekday and hour."""

    sensor: str
    rate_per_hour: list[list[float | None]] = Field(description="7 weekdays from Monday, 24 hours each")
    listened_h: list[list[float]]


class SpeedsOut(BaseModel):
    """Speeds of some passages."""

    n: int
    mean_mps: float | None
    space_mean_mps: float | None
    sd_mps: float | None
    p15_mps: float | None
    p50_mps: float | None
    p85_mps: float | None
    p95_mps: float | None


class Profile(BaseModel):
    """Speeds of one direction, or of all (null)."""

    direction: Literal["approaching", "receding", "unknown"] | None
    speeds: SpeedsOut
    pace_low_mps: float | None
    pace_high_mps: float | None
    pace_share: float | None
    over_limit: float | None
    histogram_edges_mps: list[float]
    histogram_counts: list[int]


class SpeedInterval(BaseModel):
    """Speeds of one interval, both ways."""

    start: datetime
    end: datetime
    speeds: SpeedsOut


class Speeds(BaseModel):
    """How fast they went."""

    sensor: str
    every: str
    limit_mps: float | None
    profiles: list[Profile]
    intervals: list[SpeedInterval]
    clock_hours: list[SpeedsOut] = Field(description="hours 0 to 23 of the local clock")


class OccupancyInterval(BaseModel):
    """How much of an interval somebody was in the beam."""

    start: datetime
    end: datetime
    occupied_s: float | None
    occupancy: float | None
    coverage: float


class InsideInterval(BaseModel):
    """How many were in a space at the end of an interval."""

    start: datetime
    end: datetime
    inside: float | None
    low: float | None
    high: float | None
    caution: str


class SpaceOut(BaseModel):
    """One space along the view."""

    space: str
    intervals: list[InsideInterval]


class Fullness(BaseModel):
    """How full it was; no intervals where more than 100 days are asked for."""

    sensor: str
    every: str
    intervals: list[OccupancyInterval]
    spaces: list[SpaceOut]


class PassageOut(BaseModel):
    """One passage."""

    passage_id: str
    started_at: datetime
    crossed_at: datetime
    ended_at: datetime
    story: Literal["passage", "turn-back", "fidget"]
    direction: Literal["approaching", "receding", "unknown"]
    direction_confidence: float | None
    speed_mps: float | None
    speed_se_mps: float | None
    speed_band: str
    snr_db: float | None
    flags: list[str]


class Passages(BaseModel):
    """Passages of an hour, 400 at most."""

    sensor: str
    start: datetime
    end: datetime
    listened_s: float
    complete: bool
    passages: list[PassageOut]


class Gap(BaseModel):
    """A stretch of time that nobody listened to."""

    start: datetime
    end: datetime


class CoverageInterval(BaseModel):
    """Share of an interval that was listened to."""

    start: datetime
    end: datetime
    coverage: float


class HealthOut(BaseModel):
    """One minute of hearing."""

    at: datetime
    level_dbfs: float | None
    noise_dbfs_hz: float | None
    hum_db: float | None
    lamp_db: float | None
    clipped_share: float | None


class Finding(BaseModel):
    """Something that does not fit."""

    kind: str
    start: datetime
    end: datetime
    reason: str


class TrustOut(BaseModel):
    """How far the numbers can be trusted."""

    sensor: str
    every: str
    coverage: float
    intervals: list[CoverageInterval]
    gaps: list[Gap] = Field(description="the longest 50, in order of time")
    n_gaps: int
    health: list[HealthOut] = Field(description="single minutes at even steps")
    conditions: list[ConditionOut]
    findings: list[Finding]
    chain_versions: list[str]
