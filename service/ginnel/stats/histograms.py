"""Percentiles, pace and shares from speeds that are only known by class."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ginnel.stats.counts import IntArray
from ginnel.stats.pace import Pace
from ginnel.words import FloatArray

#: In words, for whoever reads a number that came from a histogram.
GROUPED_METHOD = "grouped: linear in the cumulative count between the limits of a class"


def grouped_quantiles(
    counts: IntArray, edges: FloatArray, probabilities: Sequence[float]
) -> list[float] | None:
    """Quantiles of grouped values; None where there are none.

    Parameters
    ----------
    counts : array, shape (n,), values in each class
    edges : array, shape (n + 1,), ascending limits of the classes
    probabilities : each from 0 to 1

    Notes
    -----
    S = (P - Pmin) / (Pmax - Pmin) (Smax - Smin) + Smin, between the cumulative shares at both limits of the
    class. Source: Iowa Handbook of Simplified Practice for Traffic Studies (CTRE, 2002), spot speed. No
    further from the true quantile than the class is wide, given enough values.
    """
    held = np.flatnonzero(counts)  # classes that hold any; no quantile lies in an empty one
    if not len(held):
        return None
    upper = np.cumsum(np.asarray(counts)[held])
    wanted = np.asarray(probabilities, float) * upper[-1]
    at = np.minimum(np.searchsorted(upper, wanted, side="left"), len(held) - 1)
    one = held[at]
    part = 1 - (upper[at] - wanted) / np.asarray(counts)[one]
    low, high = np.asarray(edges, float)[one], np.asarray(edges, float)[one + 1]
    return [float(value) for value in low + part * (high - low)]


def grouped_pace(counts: IntArray, edges: FloatArray, width_mps: float) -> Pace | None:
    """Pace from classes, between limits of classes; None where nothing is counted.

    The range is the widest run of whole classes that is no wider than asked.
    """
    total = int(np.sum(counts))
    if total == 0:
        return None
    cumulative = np.concatenate([[0], np.cumsum(counts)])
    stop = np.searchsorted(edges, np.asarray(edges[:-1], float) + width_mps * (1 + 1e-9), side="right") - 1
    inside = cumulative[stop] - cumulative[:-1]
    best = int(np.argmax(inside))
    return Pace(
        low_mps=float(edges[best]),
        high_mps=float(edges[stop[best]]),
        n=int(inside[best]),
        share=float(inside[best] / total),
    )
