"""One sensor's log cut into intervals and parts: the loop that tables of intervals are made of."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

from ginnel.reports.flow import flow
from ginnel.reports.intervals import Period
from ginnel.reports.split import Part, split_counts
from ginnel.store import Store


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """What passed in one interval, all or a part of it."""

    sensor: str
    start_us: int
    end_us: int
    part: Part
    count: int | None  # None: nobody listened, and nothing was counted all the same
    listened_us: int

    @property
    def coverage(self) -> float:
        """Share of the interval that was listened to."""
        return self.listened_us / (self.end_us - self.start_us)


def iter_cells(
    store: Store,
    sensors: Sequence[str],
    cut_up: Period,
    *,
    together: bool = False,
    by_band: bool = False,
    by_mover: bool = False,
) -> Iterator[Cell]:
    """Cells by sensor, interval and part, in this order.

    Approaching and receding always have cells, unknown where there is any in the period; see `split_counts`
    for bands and movers.
    """
    if not len(cut_up):
        return
    for sensor in sensors:
        own = flow(store, sensor, cut_up.edges_us)
        known = own.is_known
        if by_band or by_mover:
            parts = split_counts(
                store,
                sensor,
                cut_up.edges_us,
                by_direction=not together,
                by_band=by_band,
                by_mover=by_mover,
            )
        elif together:
            parts = {Part(): own.both}
        else:
            parts = {Part(direction=direction): count for direction, count in own.counts.items()}
        for i in range(len(cut_up)):
            for part, count in parts.items():
                yield Cell(
                    sensor=sensor,
                    start_us=int(cut_up.edges_us[i]),
                    end_us=int(cut_up.edges_us[i + 1]),
                    part=part,
                    count=int(count[i]) if known[i] else None,
                    listened_us=int(own.listened_us[i]),
                )
