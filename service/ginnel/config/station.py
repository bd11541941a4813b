"""``[sensor.station]``: what a road authority calls the place of a sensor."""

from __future__ import annotations

from pydantic import Field, model_validator

from ginnel.config.section import Section


class StationSettings(Section):
    """How a sensor is named in records by the FHWA Traffic Monitoring Guide."""

    state: str = Field(pattern=r"^[0-9]{2}$")  # FIPS code
    station: str = Field(pattern=r"^[0-9A-Za-z]{1,6}$")
    functional_class: str = Field(pattern=r"^[0-9][0-9RU]$")
    approaching: int = Field(ge=1, le=8)  # 1 north, 2 northeast, and so on to 8 northwest
    receding: int = Field(ge=1, le=8)
    lane: int = Field(default=0, ge=0, le=9)

    @model_validator(mode="after")
    def _two_directions(self) -> StationSettings:
        if self.approaching == self.receding:
            raise ValueError("approaching and receding need two different directions of travel")
        return self
