"""Means, spread, percentiles and bands of speeds."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ginnel.stats.counts import IntArray
from ginnel.words import FloatArray

#: In words, for whoever reads an exported file.
PERCENTILE_METHOD = "Hyndman-Fan type 7: linear between order statistics at 1 + p (n - 1)"


@dataclass(frozen=True, slots=True, kw_only=True)
class SpeedSummary:
    """Speeds of some passages in numbers; None where there are too few to tell."""

    n: int
    mean_mps: float | None = None
    space_mean_mps: float | None = None
    sd_mps: float | None = None
    p15_mps: float | None = None
    p50_mps: float | None = None
    p85_mps: float | None = None
    p95_mps: float | None = None


def summarise_speeds(speed_mps: FloatArray) -> SpeedSummary:
    """Summarise speeds; NaN, a speed that was not measured, is left out.

    Notes
    -----
    ``mean_mps`` is the mean over passages, which traffic engineers call time-mean speed. ``sd_mps``
    is the sample standard deviation (n - 1), so it takes two speeds. Percentiles: see `quantiles`.
    """
    measured = speed_mps[np.isfinite(speed_mps)]
    if len(measured) == 0:
        return SpeedSummary(n=0)
    p15, p50, p85, p95 = quantiles(measured, [0.15, 0.50, 0.85, 0.95])
    return SpeedSummary(
        n=len(measured),
        mean_mps=float(np.mean(measured)),
        space_mean_mps=space_mean(measured),
        sd_mps=float(np.std(measured, ddof=1)) if len(measured) > 1 else None,
        p15_mps=p15,
        p50_mps=p50,
        p85_mps=p85,
        p95_mps=p95,
    )


def space_mean(speed_mps: FloatArray) -> float:
    """Space-mean speed: the harmonic mean of the speeds of passages.

    Raises
    ------
    ValueError
        There is no speed, or one is negative or NaN.

    Notes
    -----
    n / sum(1 / v), the mean over those on a length of path at one moment, where the slow are more
    often met. Source: J. G. Wardrop, Proc. Inst. Civil Eng. 1 (1952). Twelve passages at 10 m/s and
    twelve at 20 m/s have a time-mean of 15 and a space-mean of 13.333 m/s. One speed of 0 makes it 0.
    """
    if len(speed_mps) == 0 or not np.all(speed_mps >= 0):
        raise ValueError("space_mean needs speeds, none of them negative or NaN")
    if np.any(speed_mps == 0):
        return 0.0
    return float(len(speed_mps) / np.sum(1.0 / speed_mps))


def quantiles(values: FloatArray, probabilities: Sequence[float]) -> list[float]:
    """Quantiles by Hyndman and Fan's type 7.

    Parameters
    ----------
    values : array, shape (n,), n > 0, any order, no NaN
    probabilities : each from 0 to 1

    Notes
    -----
    Linear between the order statistics on both sides of position 1 + p (n - 1). Source: R. J. Hyndman
    and Y. Fan, The American Statistician 50 (1996), definition 7. Chosen because the common tools
    default to it, so whoever recomputes our numbers from the exported passages finds them again.
    Other definitions differ visibly for a handful of passages.
    """
    if len(values) == 0:
        raise ValueError("quantiles needs at least one value")
    return [float(value) for value in np.quantile(values, probabilities, method="linear")]


def band_counts(speed_mps: FloatArray, edges_mps: Sequence[float]) -> IntArray:
    """Count speeds in bands.

    Parameters
    ----------
    speed_mps : array, shape (n,), m/s; NaN, not measured, is left out
    edges_mps : ascending, shape (m,); bands are closed below and open above

    Returns
    -------
    array, shape (m + 1,): below the first edge, between the edges, from the last edge on; this is a
    histogram with open ends, so its sum is the number of measured speeds
    """
    measured = speed_mps[np.isfinite(speed_mps)]
    band_idx = np.searchsorted(np.asarray(edges_mps, float), measured, side="right")
    return np.bincount(band_idx, minlength=len(edges_mps) + 1).astype(np.int64)
