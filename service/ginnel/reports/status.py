"""Is it listening, and is anything wrong: what a watchman asks every few minutes."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from enum import StrEnum

from ginnel import store as log
from ginnel.reports.overview import extent_us, heard
from ginnel.store import JobRecord, Store
from ginnel.words import US_PER_S, Condition, HealthSample, Severity

HOUR_US = 3600 * US_PER_S
#: Spans grow every minute or so, and health is told every five; after so long without, nobody is listening.
_SILENT_US = 400 * US_PER_S
#: A sensor that was not heard of for so long, and is not asked for by name, has been taken down.
_GONE_US = 7 * 24 * HOUR_US


class State(StrEnum):
    """All in one word."""

    WELL = "well"
    WARNING = "warning"
    FAILURE = "failure"


@dataclass(frozen=True, slots=True, kw_only=True)
class SensorStatus:
    """One sensor at a moment."""

    sensor: str
    is_listened_to: bool
    heard_of_us: int | None  # last moment that the log knows anything of; None: never
    heard_until_us: int | None  # end of the last span, whether its date can be trusted or not; None: never
    hour_coverage: float  # share of the last hour that was listened to
    last_passage_us: int | None
    health: HealthSample | None  # of the last minute told


@dataclass(frozen=True, slots=True, kw_only=True)
class Status:
    """All sensors at a moment, and what is wrong."""

    at_us: int
    state: State
    sensors: tuple[SensorStatus, ...]
    conditions: tuple[Condition, ...]  # what is wrong now, the oldest first
    jobs: tuple[JobRecord, ...]


def status(store: Store, now_us: int, sensors: Sequence[str] | None = None) -> Status:
    """Tell how all is.

    Parameters
    ----------
    sensors : those that should be listened to; without them those heard of in the last week
    """
    known = {sensor.name for sensor in log.sensors(store)}
    health = {one.sensor: one.sample for one in log.latest_health(store)}
    found = []
    for name in sorted(known if sensors is None else set(sensors)):
        one = _sensor_status(store, name, health.get(name), now_us) if name in known else _unknown(name)
        if sensors is not None or now_us - (one.heard_of_us or 0) < _GONE_US:
            found.append(one)
    conditions = tuple(log.open_conditions(store))
    silent = not found or not all(one.is_listened_to for one in found)
    state = State.WELL
    if silent or any(one.severity is Severity.FAILURE for one in conditions):
        state = State.FAILURE
    elif conditions:
        state = State.WARNING
    return Status(
        at_us=now_us,
        state=state,
        sensors=tuple(found),
        conditions=conditions,
        jobs=tuple(log.job_records(store).values()),
    )


def _unknown(name: str) -> SensorStatus:
    """Tell of a sensor of which the log has nothing at all."""
    return SensorStatus(
        sensor=name,
        is_listened_to=False,
        heard_of_us=None,
        heard_until_us=None,
        hour_coverage=0.0,
        last_passage_us=None,
        health=None,
    )


def _sensor_status(store: Store, name: str, health: HealthSample | None, now_us: int) -> SensorStatus:
    passages = log.latest_passages(store, 1, name)
    heard_us = sum(
        stretch.ended_us - stretch.started_us for stretch in heard(store, name, now_us - HOUR_US, now_us)
    )
    extent = extent_us(store, name)
    # only a trusted date tells how long ago that was
    heard_of_us = max(log.listened_until_us(store, name) or 0, health.at_us if health else 0)
    return SensorStatus(
        sensor=name,
        is_listened_to=now_us - heard_of_us < _SILENT_US,
        heard_of_us=heard_of_us or None,
        heard_until_us=None if extent is None else extent[1],
        hour_coverage=heard_us / HOUR_US,
        last_passage_us=passages[0].passage.crossed_us if passages else None,
        health=health,
    )
