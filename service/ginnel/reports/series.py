"""Counts that others made, in the same form as those of a sensor, so that both can be compared."""

from __future__ import annotations

import numpy as np

from ginnel import store as log
from ginnel.errors import StoreError
from ginnel.reports.flow import Flow
from ginnel.stats.counts import IntArray
from ginnel.store import Store
from ginnel.words import Direction


def series_flow(store: Store, name: str, edges_us: IntArray) -> Flow:
    """Counts of a series between ascending edges; listened to is what it has a count of.

    Raises
    ------
    StoreError
        There is no such series, or one of its intervals lies across an edge.
    """
    found = log.series_arrays(store, name, int(edges_us[0]), int(edges_us[-1]))
    n = len(edges_us) - 1
    counts = {direction: np.zeros(n, np.int64) for direction in found}
    told_us = {}  # time with a count, by direction
    for direction, one in found.items():
        interval = np.searchsorted(edges_us, one.started_us, side="right") - 1
        last = np.searchsorted(edges_us, one.ended_us, side="left") - 1
        if np.any(interval != last):
            raise StoreError(f"the intervals of {name} are longer than those asked for: ask for longer ones")
        np.add.at(counts[direction], interval, one.count)
        told_us[direction] = np.zeros(n, np.int64)
        np.add.at(told_us[direction], interval, one.ended_us - one.started_us)
    if not counts[Direction.UNKNOWN].any():
        del counts[Direction.UNKNOWN]
    listened_us = np.max(list(told_us.values()), axis=0)
    return Flow(edges_us=edges_us, listened_us=listened_us, counts=counts)
