"""What is or was wrong, and how well a sensor heard along a stretch of time."""

from __future__ import annotations

from ginnel.store import Store
from ginnel.store.health import conditions, health_near
from ginnel.words import Condition, HealthSample

#: So many readings draw a line that looks like all of them.
MOST_READINGS = 200
_MINUTE_US = 60_000_000


def conditions_during(store: Store, sensor: str, start_us: int, end_us: int) -> tuple[Condition, ...]:
    """What was wrong with a sensor, or with all, at any time of [start_us, end_us), the oldest first."""
    found = conditions(store, start_us, end_us)
    return tuple(one for one in found if one.sensor in (None, sensor))


def health_course(store: Store, sensor: str, start_us: int, end_us: int) -> tuple[HealthSample | None, ...]:
    """Give single minutes of health at even steps, 200 at most; None where there is no reading near."""
    step_us = max((end_us - start_us) // MOST_READINGS, 5 * _MINUTE_US)
    moments_us = list(range(start_us, end_us, step_us))
    return tuple(health_near(store, sensor, moments_us, step_us))
