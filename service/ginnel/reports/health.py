"""How well the sensors heard, minute by minute."""

from __future__ import annotations

from collections.abc import Iterator, Sequence

from ginnel import store as log
from ginnel.reports.parts import chosen_sensors
from ginnel.store import LoggedHealth, Store


def iter_health(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
) -> Iterator[LoggedHealth]:
    """Samples taken in [start_us, end_us), by sensor and time, in constant memory."""
    for sensor in chosen_sensors(store, sensors):
        for sample in log.iter_health(store, sensor, start_us, end_us):
            yield LoggedHealth(sensor=sensor, sample=sample)
