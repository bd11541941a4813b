"""Now: is each sensor listening, what passed in the last hour, and is anything wrong."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ginnel import reports
from ginnel.reports import overview as about
from ginnel.reports.flow import Total
from ginnel.reports.flow import flow as flow_of
from ginnel.reports.flow import total as total_of
from ginnel.reports.passages import PassageEntry
from ginnel.reports.status import SensorStatus, status
from ginnel.store import Store
from ginnel.words import US_PER_S, Condition, Direction, Sensor

HOUR_US = 3600 * US_PER_S
N_LATEST = 5


@dataclass(frozen=True, slots=True, kw_only=True)
class Place:
    """One sensor as it is now."""

    sensor: Sensor
    heard_until_us: int | None  # None: never
    is_listening: bool
    hour: Total  # the last hour of which the log knows
    hour_end_us: int | None  # where that hour ends; None: now
    latest: tuple[PassageEntry, ...]

    @property
    def directions(self) -> tuple[Direction, ...]:
        """Directions to show."""
        return tuple(self.hour.counts)


@dataclass(frozen=True, slots=True, kw_only=True)
class Now:
    """All sensors, as they are now."""

    places: tuple[Place, ...]
    troubles: tuple[Condition, ...]  # what is wrong now, the oldest first

    @property
    def n_listening(self) -> int:
        """How many sensors are listening."""
        return sum(place.is_listening for place in self.places)


def look(store: Store, sensors: Sequence[Sensor], now_us: int) -> Now:
    """Ask how each sensor is doing."""
    found = status(store, now_us, [sensor.name for sensor in sensors])
    states = {one.sensor: one for one in found.sensors}
    return Now(
        places=tuple(_place(store, sensor, states[sensor.name], now_us) for sensor in sensors),
        troubles=found.conditions,
    )


def _place(store: Store, sensor: Sensor, state: SensorStatus, now_us: int) -> Place:
    extent = about.extent_us(store, sensor.name)
    until_us = None if extent is None else extent[1]
    end_us = now_us if state.is_listened_to or until_us is None else until_us
    edges_us = np.array([end_us - HOUR_US, end_us], np.int64)
    return Place(
        sensor=sensor,
        heard_until_us=until_us,
        is_listening=state.is_listened_to,
        hour=total_of(flow_of(store, sensor.name, edges_us)),
        hour_end_us=None if state.is_listened_to else until_us,
        latest=reports.latest_passages(store, N_LATEST, sensor.name),
    )
