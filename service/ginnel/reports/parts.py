"""Which sensors, and when they listened."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ginnel import store as log
from ginnel.stats.counts import IntArray
from ginnel.store import Store


def chosen_sensors(store: Store, sensors: Sequence[str] | None) -> list[str]:
    """Names of the sensors asked for, or of all, in order of name."""
    return [sensor.name for sensor in log.sensors(store)] if sensors is None else sorted(set(sensors))


def spans_us(
    store: Store, sensor: str, start_us: int | None, end_us: int | None
) -> tuple[IntArray, IntArray]:
    """Starts and ends of the spans that share time with [start_us, end_us), in order."""
    heard = log.spans(store, sensor, start_us, end_us)
    return (
        np.array([one.span.started_us for one in heard], np.int64),
        np.array([one.span.ended_us for one in heard], np.int64),
    )
