"""One sensor's log cut into intervals, and into the parts that a row may be about."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import numpy as np

from ginnel import store as log
from ginnel.reports.intervals import Every, Period, period
from ginnel.stats import union_us_in
from ginnel.stats.counts import IntArray
from ginnel.store import PassageArrays, Store
from ginnel.words import Direction, FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """Passages of one direction in each interval of a period."""

    direction: Direction | None  # None: all directions together
    count: IntArray  # shape (m,)
    passages: PassageArrays
    first: IntArray  # shape (m + 1,): where in ``passages`` each interval begins

    def speed_mps(self, i: int) -> FloatArray:
        """Speeds in interval i, NaN where not measured."""
        return self.passages.speed_mps[self.first[i] : self.first[i + 1]]


@dataclass(frozen=True, slots=True, kw_only=True)
class Cell:
    """One interval and one part of what passed in it."""

    sensor: str
    start_us: int
    end_us: int
    listened_us: int
    known: bool  # somebody listened, or something was counted all the same
    part: Part
    i: int  # of the interval in the part

    @property
    def coverage(self) -> float:
        """Share of the interval that was listened to."""
        return self.listened_us / (self.end_us - self.start_us)


def iter_cells(
    store: Store,
    sensors: Sequence[str] | None,
    start_us: int | None,
    end_us: int | None,
    every: Every,
    tz: str | None,
    *,
    together: bool,
) -> Iterator[Cell]:
    """Cells by sensor, interval and part, in this order.

    Approaching and receding always have a part, unknown where there is any in the period.
    """
    names = chosen_sensors(store, sensors)
    cut_up = period(store, every, start_us, end_us, tz, names)
    if not len(cut_up):
        return
    edges_us = cut_up.edges_us
    for sensor in names:
        listened_us = listened(store, sensor, cut_up)
        passages = log.passage_arrays(store, sensor, int(edges_us[0]), int(edges_us[-1]))
        known = (listened_us > 0) | (np.diff(np.searchsorted(passages.crossed_us, edges_us)) > 0)
        parts = _parts(passages, edges_us, together=together)
        for i in range(len(cut_up)):
            for part in parts:
                yield Cell(
                    sensor=sensor,
                    start_us=int(edges_us[i]),
                    end_us=int(edges_us[i + 1]),
                    listened_us=int(listened_us[i]),
                    known=bool(known[i]),
                    part=part,
                    i=i,
                )


def chosen_sensors(store: Store, sensors: Sequence[str] | None) -> list[str]:
    """Names of the sensors asked for, or of all, in order of name."""
    return [sensor.name for sensor in log.sensors(store)] if sensors is None else sorted(set(sensors))


def listened(store: Store, sensor: str, cut_up: Period) -> IntArray:
    """Microseconds listened in each interval."""
    if not len(cut_up):
        return np.empty(0, np.int64)
    started_us, ended_us = spans_us(store, sensor, int(cut_up.edges_us[0]), int(cut_up.edges_us[-1]))
    return union_us_in(cut_up.edges_us, started_us, ended_us)


def spans_us(
    store: Store, sensor: str, start_us: int | None, end_us: int | None
) -> tuple[IntArray, IntArray]:
    """Starts and ends of the spans that share time with [start_us, end_us), in order."""
    heard = log.spans(store, sensor, start_us, end_us)
    return (
        np.array([one.span.started_us for one in heard], np.int64),
        np.array([one.span.ended_us for one in heard], np.int64),
    )


def _parts(passages: PassageArrays, edges_us: IntArray, *, together: bool) -> list[Part]:
    parts = []
    for direction in (None,) if together else Direction:
        chosen = passages.of(direction)
        if direction is Direction.UNKNOWN and not len(chosen.crossed_us):
            continue
        first = np.searchsorted(chosen.crossed_us, edges_us)
        parts.append(Part(direction=direction, count=np.diff(first), passages=chosen, first=first))
    return parts
