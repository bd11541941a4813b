"""``[[sensor]]``: a radar module, its mounting and its directions."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import datetime
from itertools import pairwise
from typing import Annotated, Any

from pydantic import AwareDatetime, Field, field_validator, model_validator

from ginnel.config.section import Listed, Section
from ginnel.config.source import SourceSettings
from ginnel.config.station import StationSettings
from ginnel.times import to_us
from ginnel.words import Aspect, Channels, Mounting, Sensor

_Degrees = Annotated[float, Field(gt=0, le=180)]
_BeamWidth = Annotated[tuple[_Degrees, _Degrees], Listed]
_SpeedEdge = Annotated[float, Field(gt=0, le=100)]


class MountingChange(Section):
    """``[[sensor.mounting_change]]``: what is different from a date on; the rest stays as it was."""

    since: AwareDatetime
    aspect: Aspect | None = None
    height_m: float | None = Field(default=None, ge=0, le=50)
    offset_m: float | None = Field(default=None, ge=-100, le=100)
    beam_angle_deg: float | None = Field(default=None, ge=0, le=90)
    tilt_deg: float | None = Field(default=None, ge=0, le=90)
    beam_width_deg: _BeamWidth | None = None


class MountingSettings(Section):
    """``[sensor.mounting]``: how the sensor looks at the path."""

    aspect: Aspect = Aspect.AXIAL
    height_m: float = Field(default=2.4, ge=0, le=50)
    offset_m: float = Field(default=0.0, ge=-100, le=100)
    beam_angle_deg: float = Field(default=0.0, ge=0, le=90)
    tilt_deg: float = Field(default=0.0, ge=0, le=90)
    beam_width_deg: _BeamWidth | None = None
    since: AwareDatetime | None = None


class DirectionSettings(Section):
    """``[sensor.directions]``: plain names for the two ways past the sensor."""

    approaching: str = Field(default="approaching", min_length=1, max_length=80)
    receding: str = Field(default="receding", min_length=1, max_length=80)

    @model_validator(mode="after")
    def _two_names(self) -> DirectionSettings:
        if self.approaching == self.receding:
            raise ValueError("approaching and receding need two different names")
        return self


class SensorSettings(Section):
    """``[[sensor]]``: one radar module."""

    name: str = Field(pattern=r"^[A-Za-z0-9][A-Za-z0-9._-]*$", max_length=64)
    carrier_hz: float = Field(default=10.525e9, ge=1e9, le=300e9)
    channels: Channels = Channels.MONO
    swap_iq: bool = False
    mains_hz: float = Field(default=50.0, ge=16, le=400)
    speed_bands_mps: Annotated[tuple[_SpeedEdge, ...], Listed] = (0.5, 1.0, 1.5, 2.0, 3.0)
    min_speed_mps: float = Field(default=0.3, gt=0, le=100)
    max_speed_mps: float = Field(default=5.0, gt=0, le=100)
    highpass_hz: float | None = Field(default=None, gt=0, le=10_000)
    path_width_m: float | None = Field(default=None, gt=0, le=100)
    mounting: MountingSettings = MountingSettings()
    mounting_change: Annotated[tuple[MountingChange, ...], Listed] = ()
    directions: DirectionSettings = DirectionSettings()
    source: SourceSettings = SourceSettings()
    station: StationSettings | None = None

    @field_validator("speed_bands_mps")
    @classmethod
    def _ascending(cls, edges: tuple[float, ...]) -> tuple[float, ...]:
        if any(low >= high for low, high in pairwise(edges)):
            raise ValueError("edges must ascend, each larger than the one before")
        return edges

    @field_validator("mounting_change")
    @classmethod
    def _in_order(cls, changes: tuple[MountingChange, ...]) -> tuple[MountingChange, ...]:
        if any(a.since >= b.since for a, b in pairwise(changes)):
            raise ValueError("changes must be in order of their dates (since)")
        return changes

    @model_validator(mode="after")
    def _sound(self) -> SensorSettings:
        if self.min_speed_mps >= self.max_speed_mps:
            raise ValueError(
                f"min_speed_mps ({self.min_speed_mps:g}) must be below max_speed_mps ({self.max_speed_mps:g})"
            )
        if self.swap_iq and self.channels is Channels.MONO:
            raise ValueError('swap_iq needs channels = "iq"')
        letter = "c" if self.channels is Channels.IQ else "r"
        sample_type = self.source.sample_type
        if sample_type is not None and not sample_type.startswith(letter):
            raise ValueError(
                f'source.sample_type "{sample_type}" is not for channels = "{self.channels.value}": '
                f"it must begin with {letter}"
            )
        first = self.mounting.since
        if first is not None and self.mounting_change and self.mounting_change[0].since <= first:
            raise ValueError("a mounting_change must be later than mounting.since")
        return self

    def mountings(self) -> tuple[Mounting, ...]:
        """Every mounting, oldest first, each complete."""
        current = self.mounting.model_dump()
        found = [current]
        for change in self.mounting_change:
            current = current | change.model_dump(exclude_none=True)
            found.append(current)
        return tuple(_mounting(values) for values in found)

    def to_sensor(self, at_us: int | None = None) -> Sensor:
        """Give the sensor as the measuring chain needs it, with the mounting of a moment.

        Parameters
        ----------
        at_us : int, microseconds since 1970 UTC, or None for the newest mounting
        """
        mountings = self.mountings()
        valid = [m for m in mountings if at_us is None or m.since_us is None or m.since_us <= at_us]
        return Sensor(
            name=self.name,
            carrier_hz=self.carrier_hz,
            channels=self.channels,
            swap_iq=self.swap_iq,
            mains_hz=self.mains_hz,
            speed_bands_mps=self.speed_bands_mps,
            min_speed_mps=self.min_speed_mps,
            max_speed_mps=self.max_speed_mps,
            highpass_hz=self.highpass_hz,
            approaching_name=self.directions.approaching,
            receding_name=self.directions.receding,
            mounting=valid[-1] if valid else mountings[0],
        )


def _mounting(values: Mapping[str, Any]) -> Mounting:
    """One complete mounting as the measuring chain's word."""
    fields = {key: value for key, value in values.items() if key != "since"}
    since: datetime | None = values["since"]
    return Mounting(**fields, since_us=None if since is None else to_us(since))
