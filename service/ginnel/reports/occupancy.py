"""Share of the time in which somebody was in the beam."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from ginnel import store as log
from ginnel.reports.intervals import Every, period
from ginnel.reports.parts import chosen_sensors, spans_us
from ginnel.stats import union_us_in
from ginnel.stats.counts import IntArray
from ginnel.stats.occupancy import share_occupied
from ginnel.store import Store
from ginnel.words import US_PER_S

#: Nobody is expected to stay in a beam longer; whoever does is seen in the hours near the crossing only.
LONGEST_PRESENCE_US = 6 * 3600 * US_PER_S


@dataclass(frozen=True, slots=True, kw_only=True)
class OccupancyRow:
    """How much of one interval the beam of a sensor was occupied."""

    sensor: str
    interval_start_us: int
    interval_end_us: int
    occupied_s: float | None  # None: never listened
    occupancy: float | None  # share of the time listened, 0 to 1
    coverage: float
    listened_s: float


def occupancy(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
) -> tuple[OccupancyRow, ...]:
    """Occupancy by interval: see `iter_occupancy`."""
    return tuple(iter_occupancy(store, sensors, start_us, end_us, every, tz))


def iter_occupancy(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    every: Every = Every.HOUR,
    tz: str | None = None,
) -> Iterator[OccupancyRow]:
    """Occupancy by sensor and interval, in this order.

    Time is occupied where at least one mover was heard, also one that turned back or fidgeted. It is a
    union: two at once occupy the time once.
    """
    names = chosen_sensors(store, sensors)
    cut_up = period(store, every, start_us, end_us, tz, names)
    if not len(cut_up):
        return
    edges_us = cut_up.edges_us
    for sensor in names:
        listened_us = union_us_in(edges_us, *spans_us(store, sensor, int(edges_us[0]), int(edges_us[-1])))
        occupied_us = np.minimum(occupied_us_in(store, sensor, edges_us), listened_us)
        share = share_occupied(occupied_us.astype(float), listened_us.astype(float))
        for i in range(len(cut_up)):
            heard = bool(listened_us[i] > 0)
            yield OccupancyRow(
                sensor=sensor,
                interval_start_us=int(edges_us[i]),
                interval_end_us=int(edges_us[i + 1]),
                occupied_s=float(occupied_us[i] / US_PER_S) if heard else None,
                occupancy=float(share[i]) if heard else None,
                coverage=float(listened_us[i] / (edges_us[i + 1] - edges_us[i])),
                listened_s=float(listened_us[i] / US_PER_S),
            )


def occupied_us_in(store: Store, sensor: str, edges_us: IntArray) -> IntArray:
    """Microseconds of each interval in which some mover was heard; 16 bytes of memory a passage."""
    reach_us = int(edges_us[0]) - LONGEST_PRESENCE_US, int(edges_us[-1]) + LONGEST_PRESENCE_US
    presences = [
        np.stack([passages.started_us, passages.ended_us])
        for passages in log.iter_passage_columns(store, sensor, *reach_us, with_uncounted=True)
    ]
    started_us, ended_us = np.concatenate([np.empty((2, 0), np.int64), *presences], axis=1)
    return union_us_in(edges_us, started_us, ended_us)
