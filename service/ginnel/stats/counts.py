"""Events, and time covered by stretches, in intervals."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

IntArray = NDArray[np.int64]


def counts_in(times_us: IntArray, edges_us: IntArray) -> IntArray:
    """Count events in half-open intervals.

    Parameters
    ----------
    times_us : array, shape (n,), integer microseconds, any order
    edges_us : array, shape (m + 1,), ascending; interval i is [edges_us[i], edges_us[i + 1])

    Returns
    -------
    array, shape (m,); events outside all intervals are left out

    Notes
    -----
    Exact integers throughout: an event on an edge belongs to the interval that begins there.
    """
    _check_ascending(edges_us)
    n_intervals = max(len(edges_us) - 1, 0)
    interval_idx = np.searchsorted(edges_us, times_us, side="right") - 1
    inside = (interval_idx >= 0) & (interval_idx < n_intervals)
    return np.bincount(interval_idx[inside], minlength=n_intervals).astype(np.int64)


def union_us_in(edges_us: IntArray, started_us: IntArray, ended_us: IntArray) -> IntArray:
    """Microseconds of each interval that lie in at least one of some stretches.

    Parameters
    ----------
    edges_us : array, shape (m + 1,), ascending; interval i is [edges_us[i], edges_us[i + 1])
    started_us, ended_us : arrays, shape (n,); stretches [started, ended), any order, may overlap

    Returns
    -------
    array, shape (m,); of spans this is the time listened, of presences the time occupied
    """
    _check_ascending(edges_us)
    if len(started_us) == 0 or len(edges_us) == 0:
        return np.zeros(max(len(edges_us) - 1, 0), np.int64)
    order = np.argsort(started_us, kind="stable")
    starts = np.asarray(started_us, np.int64)[order]
    ends = np.maximum.accumulate(np.asarray(ended_us, np.int64)[order])
    # A stretch that begins inside an earlier one only counts from where that one ends.
    starts = np.maximum(starts, np.concatenate([starts[:1], ends[:-1]]))
    before = np.concatenate([[0], np.cumsum(np.maximum(ends - starts, 0))])
    stretch_idx = np.searchsorted(starts, edges_us, side="right")
    last_end = np.concatenate([[np.iinfo(np.int64).min], ends])[stretch_idx]
    covered = before[stretch_idx] - np.maximum(last_end, edges_us) + edges_us
    return np.diff(np.where(stretch_idx == 0, 0, covered)).astype(np.int64)


def _check_ascending(edges_us: IntArray) -> None:
    if np.any(np.diff(edges_us) < 0):
        raise ValueError("edges_us must not descend")
