"""How far automatic counts are from manual ones."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.words import FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Deviations:
    """Deviation of automatic from manual counts, as shares; None where it is not defined."""

    n: int  # intervals in which somebody was counted by hand
    n_left_out: int  # intervals without anybody, which have no relative deviation
    mean: float | None  # average percentage deviation, APD
    mean_absolute: float | None  # AAPD
    weighted: float | None  # AAPD weighted by the manual count, WAPD
    overall: float | None  # of the totals
    correlation: float | None  # Pearson's r


def deviations(automatic: FloatArray, manual: FloatArray) -> Deviations:
    """Compare counts of the same intervals.

    Parameters
    ----------
    automatic, manual : arrays, shape (n,), no NaN

    Notes
    -----
    Source of the four measures: NCHRP Report 797 (2014), Guidebook on Pedestrian and Bicycle Volume Data
    Collection. Small intervals rule the unweighted ones; those with a manual count of 0 are left out of
    all but the totals, and their number is told.
    """
    automatic, manual = np.asarray(automatic, float), np.asarray(manual, float)
    counted = manual > 0
    a, m = automatic[counted], manual[counted]
    n = len(m)
    relative = (a - m) / m
    varies = n > 1 and np.ptp(a) > 0 and np.ptp(m) > 0
    return Deviations(
        n=n,
        n_left_out=len(manual) - n,
        mean=float(np.mean(relative)) if n else None,
        mean_absolute=float(np.mean(np.abs(relative))) if n else None,
        weighted=float(np.sum(np.abs(a - m)) / np.sum(m)) if n else None,
        overall=float((automatic.sum() - manual.sum()) / manual.sum()) if n else None,
        correlation=float(np.corrcoef(a, m)[0, 1]) if varies else None,
    )


def geh(one: FloatArray, other: FloatArray) -> FloatArray:
    """GEH statistic between hourly volumes; 0 where both are 0.

    Notes
    -----
    sqrt(2 (a - b)^2 / (a + b)). Source: UK Design Manual for Roads and Bridges, volume 12 (from memory).
    Below 5 is close, by common practice. 1,000 and 900 give 3.244.
    """
    a, b = np.asarray(one, float), np.asarray(other, float)
    both = a + b
    statistic: FloatArray = np.sqrt(
        np.divide(2 * (a - b) ** 2, both, out=np.zeros(both.shape), where=both > 0)
    )
    return statistic


def chapman(first: int, second: int, both: int) -> tuple[float, float]:
    """How many there really were, from two observers who counted independently.

    Parameters
    ----------
    first, second : counted by each observer
    both : of these, counted by both

    Returns
    -------
    estimate, standard error

    Notes
    -----
    N = (n1 + 1)(n2 + 1) / (m + 1) - 1 (D. G. Chapman, Univ. Calif. Publ. Stat. 1, 1951); variance
    (n1 + 1)(n2 + 1)(n1 - m)(n2 - m) / ((m + 1)^2 (m + 2)) (G. A. F. Seber, The Estimation of Animal
    Abundance, 1982). 100, 100 and 10 give 926.4. Whom neither can see, neither counts: then it is too low.
    """
    if not 0 <= both <= min(first, second):
        raise ValueError(f"{both=} must lie between 0 and the smaller of {first=} and {second=}")
    product = (first + 1) * (second + 1)
    variance = product * (first - both) * (second - both) / ((both + 1) ** 2 * (both + 2))
    return product / (both + 1) - 1, float(np.sqrt(variance))
