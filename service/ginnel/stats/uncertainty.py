"""How sure a count is."""

from __future__ import annotations

import numpy as np

from ginnel.stats.counts import IntArray
from ginnel.words import FloatArray


def poisson_limits(counts: IntArray, level: float = 0.95) -> tuple[FloatArray, FloatArray]:
    """Exact confidence limits for the mean behind Poisson counts.

    Parameters
    ----------
    counts : array of integers >= 0, any shape
    level : confidence, 0 < level < 1

    Returns
    -------
    low, high : arrays of the shape of counts

    Raises
    ------
    ValueError
        A count is negative, or the level is not between 0 and 1.

    Notes
    -----
    With a = 1 - level: low = chi2(a / 2; 2 k) / 2 and high = chi2(1 - a / 2; 2 k + 2) / 2, where
    chi2(p; n) is the quantile of chi-square with n degrees of freedom. Source: F. Garwood,
    Biometrika 28 (1936), 437-442. A count of 10 gives 4.795 to 18.390, a count of 0 gives 0 to 3.689.

    This is the noise of counting within one interval; counts vary more than this from week to week.
    """
    from scipy.special import chdtri

    k = np.asarray(counts, dtype=np.int64)
    if np.any(k < 0):
        raise ValueError("counts must not be negative")
    if not 0 < level < 1:
        raise ValueError(f"{level=} must lie between 0 and 1")
    tail = (1 - level) / 2
    # chdtri takes the upper tail; 2 k = 0 degrees of freedom has no quantile, its limit is 0
    low = np.where(k > 0, chdtri(2 * np.maximum(k, 1), 1 - tail) / 2, 0.0)
    high = chdtri(2 * k + 2, tail) / 2
    return low, high
