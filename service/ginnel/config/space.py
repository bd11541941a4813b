"""``[[space]]``: a room, wing or yard whose doors are all watched, to tell how many are inside."""

from __future__ import annotations

from datetime import time
from typing import Annotated, Literal

from pydantic import Field, field_validator

from ginnel.config.section import Listed, Section
from ginnel.words import Direction, Door, Space


class DoorSettings(Section):
    """``[[space.door]]``: a sensor at a way in, and how well it counts."""

    sensor: str = Field(min_length=1)
    entering: Literal["approaching", "receding"]
    recall: float = Field(default=0.95, gt=0, le=1)
    recall_se: float = Field(default=0.02, ge=0, le=0.5)
    direction_error: float = Field(default=0.02, ge=0, lt=0.5)


class SpaceSettings(Section):
    """``[[space]]``: a space, when it is known to be empty, and its doors."""

    name: str = Field(min_length=1, max_length=80)
    empty_at: time = time(4, 0)
    door: Annotated[tuple[DoorSettings, ...], Listed] = Field(min_length=1)

    @field_validator("empty_at")
    @classmethod
    def _local(cls, at: time) -> time:
        if at.tzinfo is not None:
            raise ValueError("is a time of the site's own clock: without an offset")
        if at.second or at.microsecond:
            raise ValueError("must be a whole minute")
        return at

    def to_space(self) -> Space:
        """Give the space as the reports need it."""
        return Space(
            name=self.name,
            empty_at_min=60 * self.empty_at.hour + self.empty_at.minute,
            doors=tuple(
                Door(
                    sensor=door.sensor,
                    entering=Direction(door.entering),
                    recall=door.recall,
                    recall_se=door.recall_se,
                    direction_error=door.direction_error,
                )
                for door in self.door
            ),
        )
