"""The busiest hour, and how evenly it is used."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.words import FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Window:
    """Some consecutive intervals."""

    first: int  # index of the first
    n: int
    volume: float


def busiest_window(counts: FloatArray, n: int) -> Window | None:
    """Find the n consecutive intervals with the most passages; the earliest of equals.

    Parameters
    ----------
    counts : array, shape (m,), of consecutive intervals; NaN where not counted
    n : int, for example 4 quarter hours for an hour

    Returns
    -------
    the window, or None where no n intervals in a row were all counted
    """
    if n < 1:
        raise ValueError(f"{n=} must be at least 1")
    if len(counts) < n:
        return None
    volumes = np.lib.stride_tricks.sliding_window_view(np.asarray(counts, float), n).sum(axis=1)
    if not np.any(np.isfinite(volumes)):
        return None
    first = int(np.nanargmax(volumes))
    return Window(first=first, n=n, volume=float(volumes[first]))


def peak_hour_factor(quarter_counts: FloatArray) -> float | None:
    """How even an hour is: 1 where its quarters are alike, 0.25 where all pass in one.

    Parameters
    ----------
    quarter_counts : array, shape (4,), passages in the quarters of one hour

    Returns
    -------
    float from 0.25 to 1; None where a quarter was not counted, or nobody passed

    Notes
    -----
    PHF = V / (4 V15). Source: Highway Capacity Manual (2010), equation 4-2. Quarters of 900, 1000, 1200
    and 850 give 0.8229.
    """
    if len(quarter_counts) != 4:
        raise ValueError(f"an hour has 4 quarters, not {len(quarter_counts)}")
    busiest = np.max(quarter_counts)
    return float(np.sum(quarter_counts) / (4 * busiest)) if busiest > 0 else None
