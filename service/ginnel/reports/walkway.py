"""Level of service of a walkway, by quarter hour."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import tzinfo

import numpy as np

from ginnel import store as log
from ginnel.reports.flow import flow
from ginnel.reports.intervals import Every, cut
from ginnel.reports.volumes import complete
from ginnel.stats import space_mean
from ginnel.stats.walkway import Level, level_of_service, space_m2, unit_flow
from ginnel.store import Store


@dataclass(frozen=True, slots=True, kw_only=True)
class WalkwayRow:
    """How freely people walked in one quarter hour; None where too little of it was listened to."""

    sensor: str
    interval_start_us: int
    interval_end_us: int
    count: float | None
    flow_per_min_m: float | None  # persons a minute and metre of width
    space_m2: float | None  # for each person; infinite where nobody walked
    level: Level | None  # at random flow
    platoon_level: Level | None  # where people come in platoons


def walkway(
    store: Store, sensor: str, start_us: int, end_us: int, zone: tzinfo, *, width_m: float
) -> tuple[WalkwayRow, ...]:
    """Level of service of each quarter hour, for an effective width.

    The effective width is what walls and obstacles leave free to walk in. Speed is the space-mean
    speed of the quarter hour, or of the whole stretch where none was measured in it.
    """
    edges_us = cut(start_us, end_us, Every.QUARTER_HOUR, zone)
    counts = complete(flow(store, sensor, edges_us))
    passages = log.passage_arrays(store, sensor, int(edges_us[0]), int(edges_us[-1]))
    moving = passages.speed_mps > 0
    speed_mps, crossed_us = passages.speed_mps[moving], passages.crossed_us[moving]
    overall = space_mean(speed_mps) if len(speed_mps) else None
    first = np.searchsorted(crossed_us, edges_us)
    rows = []
    for i, count in enumerate(counts):
        own = speed_mps[first[i] : first[i + 1]]
        speed = space_mean(own) if len(own) else overall
        per_min_m = unit_flow(float(count), width_m) if np.isfinite(count) else None
        free = None
        if per_min_m == 0:
            free = float("inf")
        elif per_min_m is not None and speed is not None:
            free = space_m2(speed, per_min_m)
        rows.append(
            WalkwayRow(
                sensor=sensor,
                interval_start_us=int(edges_us[i]),
                interval_end_us=int(edges_us[i + 1]),
                count=float(count) if np.isfinite(count) else None,
                flow_per_min_m=per_min_m,
                space_m2=free,
                level=None if free is None else level_of_service(free),
                platoon_level=None if free is None else level_of_service(free, platoons=True),
            )
        )
    return tuple(rows)
