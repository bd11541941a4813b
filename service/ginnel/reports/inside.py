"""How many are in a space: entries less exits since it was known empty, and how far that has drifted."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta, tzinfo

import numpy as np
from numpy.typing import NDArray

from ginnel import store as log
from ginnel.reports.intervals import Every, cut
from ginnel.reports.parts import spans_us
from ginnel.stats import union_us_in
from ginnel.stats.counts import IntArray
from ginnel.stats.occupancy import DoorError, number_inside
from ginnel.store import PassageArrays, Store
from ginnel.times import from_us, to_us
from ginnel.words import Direction, Door, FloatArray, Space

_Z95 = 1.959964


@dataclass(frozen=True, slots=True, kw_only=True)
class InsideRow:
    """How many are in a space at the end of an interval.

    ``low`` and ``high`` are 95 % limits. They widen from the reset on: by those whom the sensors missed or
    took for going the other way, by passages of unknown direction, and by time that nobody listened.
    """

    space: str
    interval_start_us: int
    interval_end_us: int
    reset_us: int  # when it was last known to be empty
    entered: int  # counted since then
    left: int
    unknown: int  # passed, nobody knows which way
    inside: float | None  # None: a door was not listened to at all since the reset
    low: float | None
    high: float | None
    caution: str  # empty: none


def inside(
    store: Store, space: Space, start_us: int, end_us: int, every: Every, zone: tzinfo
) -> tuple[InsideRow, ...]:
    """Number inside at the end of each interval that shares time with [start_us, end_us).

    An interval that ends at the reset still tells what was left then: had nobody been missed, 0.
    """
    edges_us = cut(start_us, end_us, every, zone)
    if len(edges_us) < 2:
        return ()
    ends_us = edges_us[1:]
    resets_us = np.array(list(_resets(space, int(ends_us[0]), int(ends_us[-1]), zone)), np.int64)
    reset_us = resets_us[np.searchsorted(resets_us, ends_us, side="left") - 1]
    doors = [_at_door(store, door, reset_us, ends_us) for door in space.doors]
    entered, left, unknown = (np.sum([getattr(one, name) for one in doors], axis=0) for name in _COUNTED)
    net = np.sum([one.net for one in doors], axis=0)
    half = _Z95 * np.sqrt(np.sum([one.variance for one in doors], axis=0))
    half += np.sum([one.unheard for one in doors], axis=0)
    known = np.all([one.is_known for one in doors], axis=0)
    return tuple(
        InsideRow(
            space=space.name,
            interval_start_us=int(edges_us[i]),
            interval_end_us=int(ends_us[i]),
            reset_us=int(reset_us[i]),
            entered=int(entered[i]),
            left=int(left[i]),
            unknown=int(unknown[i]),
            inside=max(float(net[i]), 0.0) if known[i] else None,
            low=max(float(net[i] - half[i]), 0.0) if known[i] else None,
            high=max(float(net[i] + half[i]), 0.0) if known[i] else None,
            caution=_caution(float(net[i]), float(half[i]), bool(known[i])),
        )
        for i in range(len(ends_us))
    )


_COUNTED = ("entered", "left", "unknown")


@dataclass(frozen=True, slots=True, kw_only=True)
class _AtDoor:
    """What one door adds at each moment; arrays of shape (m,)."""

    entered: IntArray
    left: IntArray
    unknown: IntArray
    net: FloatArray
    variance: FloatArray
    unheard: FloatArray  # as many may have passed, all of them one way, while nobody listened
    is_known: NDArray[np.bool_]


def _at_door(store: Store, door: Door, reset_us: IntArray, ends_us: IntArray) -> _AtDoor:
    first_us, last_us = int(reset_us.min()), int(ends_us[-1])
    passages = log.passage_arrays(store, door.sensor, first_us, last_us)
    leaving = Direction.RECEDING if door.entering is Direction.APPROACHING else Direction.APPROACHING
    entered, left, unknown = (
        _since(passages, way, reset_us, ends_us) for way in (door.entering, leaving, Direction.UNKNOWN)
    )
    error = DoorError(
        recall_entering=door.recall,
        recall_leaving=door.recall,
        recall_se=door.recall_se,
        direction_error=door.direction_error,
    )
    net, variance = number_inside(entered.astype(float), left.astype(float), error)
    spans = spans_us(store, door.sensor, first_us, last_us)
    edges_us = np.unique(np.concatenate([reset_us, ends_us]))
    before = np.concatenate([[0], np.cumsum(union_us_in(edges_us, *spans))])
    heard_us = before[np.searchsorted(edges_us, ends_us)] - before[np.searchsorted(edges_us, reset_us)]
    passed = entered + left + unknown + 1  # one more: who has seen nobody yet does not know that nobody comes
    missing_us = (ends_us - reset_us) - heard_us
    unheard = np.divide(passed * missing_us, heard_us, out=np.zeros(len(ends_us)), where=heard_us > 0)
    return _AtDoor(
        entered=entered,
        left=left,
        unknown=unknown,
        net=net,
        variance=variance + unknown,  # each is one more or one less
        unheard=unheard,
        is_known=heard_us > 0,
    )


def _since(passages: PassageArrays, way: Direction, reset_us: IntArray, ends_us: IntArray) -> IntArray:
    crossed_us = passages.of(way).crossed_us
    return np.searchsorted(crossed_us, ends_us) - np.searchsorted(crossed_us, reset_us)


def _resets(space: Space, first_us: int, last_us: int, zone: tzinfo) -> Iterator[int]:
    """Moments at which a space is known to be empty, from the last one before ``first_us`` on."""
    day = from_us(first_us, zone).date() - timedelta(days=2)
    while True:
        at = datetime(day.year, day.month, day.day, *divmod(space.empty_at_min, 60), tzinfo=zone)
        reset_us = to_us(at.astimezone(UTC))
        if reset_us >= last_us:
            return
        yield reset_us
        day += timedelta(days=1)


def _caution(net: float, half: float, is_known: bool) -> str:
    if not is_known:
        return "a door was not listened to since the space was last empty"
    if net + half < 0:
        return "more were counted out than in: somebody was inside at the reset, or entries are missed"
    if half > 0 and half >= abs(net):
        return f"the drift (±{half:.0f}) is larger than the number itself"
    return ""
