"""What does not fit: hours outside their history, a direction gone missing, a slow decline."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ginnel.stats.counts import IntArray
from ginnel.stats.volumes import group_means
from ginnel.words import FloatArray

#: 1 / the upper quartile of the normal distribution: turns a median deviation into a standard deviation.
_MAD_TO_SD = 1.4826


@dataclass(frozen=True, slots=True, kw_only=True)
class History:
    """What is usual for each of some like intervals, robust against the odd ones among them."""

    median: FloatArray  # counts; NaN without history
    surprise: FloatArray  # standard deviations from usual; NaN where it cannot be told


@dataclass(frozen=True, slots=True, kw_only=True)
class Run:
    """Consecutive intervals."""

    first: int
    n: int
    expected: float  # passages that the history leads one to expect in them


@dataclass(frozen=True, slots=True, kw_only=True)
class Trend:
    """A straight line through values over time."""

    slope: float  # per unit of time
    p_value: float  # of a trend as strong by chance


def against_history(counts: FloatArray, group: IntArray, n_groups: int, least: int = 6) -> History:
    """Hold each count against all counts of its group, for example its weekday and hour.

    Parameters
    ----------
    counts : array, shape (n,); NaN, not counted, is left out
    group : array, shape (n,), 0 to n_groups - 1
    least : int, known counts that a group needs to have a history

    Notes
    -----
    (root - middle) / spread on square roots: see `middle_and_spread`.
    """
    median = np.full(len(counts), np.nan)
    surprise = np.full(len(counts), np.nan)
    known = np.isfinite(counts)
    for one in range(n_groups):
        own = np.flatnonzero(known & (group == one))
        if len(own) < least:
            continue
        middle, spread = middle_and_spread(counts[own])
        median[own] = middle**2
        surprise[own] = (np.sqrt(counts[own]) - middle) / spread
    return History(median=median, surprise=surprise)


def middle_and_spread(counts: FloatArray) -> tuple[float, float]:
    """Median and standard deviation of the square roots of like counts, robust against odd ones among them.

    Parameters
    ----------
    counts : array, shape (n,), n > 0, no NaN

    Notes
    -----
    On square roots a Poisson count has a standard deviation of 1/2 whatever its mean (M. S. Bartlett, J. R.
    Stat. Soc. Suppl. 3, 1936). The spread is 1.4826 times the median absolute deviation (F. R. Hampel, J. Am.
    Stat. Assoc. 69, 1974), and at least this 1/2. So one odd hour neither shifts nor widens what is usual.
    """
    root = np.sqrt(counts)
    middle = float(np.median(root))
    return middle, max(_MAD_TO_SD * float(np.median(np.abs(root - middle))), 0.5)


def usual_but_for_silence(counts: FloatArray, group: IntArray, n_groups: int, long: int = 24) -> FloatArray:
    """Mean of the group of each interval, not learnt from silences of ``long`` intervals or more."""
    lively = np.array(counts, float)
    for first, last in runs(lively == 0):
        if last - first >= long:
            lively[first:last] = np.nan
    return group_means(lively, group, n_groups)[0][group]


def silent_runs(counts: FloatArray, usual: FloatArray, least_expected: float = 30.0) -> list[Run]:
    """Find runs of zeros where many would be expected: rather a dead sensor than an empty place.

    Parameters
    ----------
    counts : array, shape (n,), of consecutive intervals; NaN, not counted, ends a run
    usual : array, shape (n,), what each interval usually has; NaN counts as 0
    least_expected : float, a run is told of where the usual counts in it sum to more

    Notes
    -----
    30 expected and none seen has a probability of exp(-30), 1e-13, by chance. A place that was closed looks
    the same: such a run needs a person's judgement.
    """
    before = np.concatenate([[0.0], np.cumsum(np.nan_to_num(usual))])
    return [
        Run(first=start, n=end - start, expected=float(before[end] - before[start]))
        for start, end in runs(counts == 0)
        if before[end] - before[start] > least_expected
    ]


def runs(flags: NDArray[np.bool_]) -> list[tuple[int, int]]:
    """Unbroken runs [first, last) of True."""
    steps = np.diff(np.concatenate([[0], flags.astype(np.int8), [0]]))
    return list(zip(np.flatnonzero(steps == 1).tolist(), np.flatnonzero(steps == -1).tolist(), strict=True))


def chance_of_none(n: IntArray, share: float) -> FloatArray:
    """Probability that none of n passages goes a way that a share of them usually goes: (1 - share)^n."""
    return (1.0 - share) ** np.asarray(n, float)


def trend(times: FloatArray, values: FloatArray) -> Trend | None:
    """Robust straight line through values; NaN is left out; None for fewer than 8 values.

    Notes
    -----
    Slope: the median over all pairs (P. K. Sen, J. Am. Stat. Assoc. 63, 1968). Probability: Mann-Kendall,
    by the normal approximation with continuity (M. G. Kendall, Rank Correlation Methods, 1975), two-sided.
    Values next to each other are taken as independent; ties are not corrected for, which errs to the
    safe side.
    """
    from scipy.special import ndtr

    known = np.isfinite(values)
    t, v = np.asarray(times, float)[known], np.asarray(values, float)[known]
    n = len(v)
    if n < 8:
        return None
    later, earlier = np.tril_indices(n, -1)
    dt, dv = t[later] - t[earlier], v[later] - v[earlier]
    apart = dt != 0
    slope = float(np.median(dv[apart] / dt[apart]))
    s = float(np.sum(np.sign(dv) * np.sign(dt)))
    z = max(abs(s) - 1, 0.0) / np.sqrt(n * (n - 1) * (2 * n + 5) / 18)
    return Trend(slope=slope, p_value=float(2 * ndtr(-z)))
