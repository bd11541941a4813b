"""What is usual for a sensor: how many should have passed by now, and how loud its noise is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ginnel import store as log
from ginnel.store import Store
from ginnel.words import US_PER_S

HOUR_US = 3600 * US_PER_S
_HOURS_A_WEEK = 168
_WEEKS = 4
#: An hour of the week is known once it was listened to in so many weeks, for most of it.
_LEAST_WEEKS, _LEAST_LISTENED_US = 2, HOUR_US // 2


@dataclass(frozen=True, slots=True, kw_only=True)
class Usual:
    """How a sensor's present compares with its past."""

    missed_passages: float = 0.0  # usual since the last passage, where none came
    has_passed: bool = False  # somebody has, in this hour or the last
    noise_dbfs_hz: float | None = None  # median of the last week; None: not known


def usual(store: Store, sensor: str, now_us: int) -> Usual:
    """Look at a sensor's last weeks; costs a few milliseconds, so once in some minutes is right.

    Raises
    ------
    StoreError
        The store cannot be read.
    """
    until_us = now_us // HOUR_US * HOUR_US
    from_us = until_us - (_WEEKS + 1) * _HOURS_A_WEEK * HOUR_US
    counts = log.hourly_counts(store, sensor, from_us, until_us)
    listening = log.hourly_listening(store, sensor, from_us, until_us)
    n_hours = (until_us - from_us) // HOUR_US
    count, listened_us = np.zeros(n_hours), np.zeros(n_hours)
    np.add.at(count, (counts.hour_us - from_us) // HOUR_US, counts.count)
    np.add.at(listened_us, (listening.hour_us - from_us) // HOUR_US, listening.listened_us)
    since_this_hour = log.hourly_counts(store, sensor, until_us, until_us + HOUR_US).count.sum()
    week_ago_us = now_us - _HOURS_A_WEEK * HOUR_US
    noise = [
        sample.noise_dbfs_hz
        for sample in log.iter_health(store, sensor, week_ago_us, now_us)
        if sample.noise_dbfs_hz is not None
    ]
    return Usual(
        missed_passages=0.0 if since_this_hour else missed_passages(count, listened_us),
        has_passed=bool(since_this_hour or count[-1]),
        noise_dbfs_hz=float(np.median(noise)) if len(noise) >= 24 * 60 else None,
    )


def missed_passages(count: NDArray[np.float64], listened_us: NDArray[np.float64]) -> float:
    """How many are usual in the hours since the last passage, up to now.

    Parameters
    ----------
    count, listened_us : arrays, shape (n,): whole hours in a row, the last of them just over

    Notes
    -----
    What is usual for an hour is the mean rate of the same hour of the week in the four weeks before it,
    times what was listened of it now; nothing is expected of an hour not heard in two of them.
    """
    n = len(count)
    quiet = n - 1 - int(np.flatnonzero(count)[-1]) if count.any() else 0
    expected = 0.0
    for i in range(n - quiet, n):
        before = np.arange(i - _HOURS_A_WEEK, -1, -_HOURS_A_WEEK)[:_WEEKS]
        before = before[listened_us[before] >= _LEAST_LISTENED_US]
        if len(before) >= _LEAST_WEEKS:
            expected += float(count[before].sum() / listened_us[before].sum() * listened_us[i])
    return expected
