"""One sensor's log cut into intervals and directions: the loop that every table of intervals is made of."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from ginnel.reports.flow import flow
from ginnel.reports.intervals import Period
from ginnel.store import Store
from ginnel.words import Direction


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """What passed in one interval in one direction."""

    sensor: str
    start_us: int
    end_us: int
    direction: Direction | None  # None: all directions together
    count: int | None  # None: nobody listened, and nothing was counted all the same
    listened_us: int

    @property
    def coverage(self) -> float:
        """Share of the interval that was listened to."""
        return self.listened_us / (self.end_us - self.start_us)


def iter_cells(
    store: Store, sensors: Sequence[str], cut_up: Period, *, together: bool = False
) -> Iterator[Cell]:
    """Cells by sensor, interval and direction, in this order.

    Approaching and receding always have cells, unknown where there is any in the period.
    """
    if not len(cut_up):
        return
    for sensor in sensors:
        own = flow(store, sensor, cut_up.edges_us)
        known = own.is_known
        columns = [(None, own.both)] if together else list(own.counts.items())
        for i in range(len(cut_up)):
            for direction, count in columns:
                yield Cell(
                    sensor=sensor,
                    start_us=int(cut_up.edges_us[i]),
                    end_us=int(cut_up.edges_us[i + 1]),
                    direction=direction,
                    count=int(count[i]) if known[i] else None,
                    listened_us=int(own.listened_us[i]),
                )
