"""How sure a count is."""

from __future__ import annotations

from dataclasses import dataclass

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
    _check_level(level)
    tail = (1 - level) / 2
    # chdtri takes the upper tail; 2 k = 0 degrees of freedom has no quantile, its limit is 0
    low = np.where(k > 0, chdtri(2 * np.maximum(k, 1), 1 - tail) / 2, 0.0)
    high = chdtri(2 * k + 2, tail) / 2
    return low, high


def wilson_limits(successes: IntArray, n: IntArray, level: float = 0.95) -> tuple[FloatArray, FloatArray]:
    """Confidence limits for a share.

    Parameters
    ----------
    successes, n : arrays of one shape, 0 <= successes <= n
    level : confidence, 0 < level < 1

    Returns
    -------
    low, high : arrays of that shape; 0 and 1 where n is 0

    Notes
    -----
    (p + z^2 / 2n -+ z sqrt(p (1 - p) / n + z^2 / 4n^2)) / (1 + z^2 / n). Source: E. B. Wilson, J. Am.
    Stat. Assoc. 22 (1927). 45 of 50 give 0.7864 to 0.9565.
    """
    from scipy.special import ndtri

    _check_level(level)
    k, n = np.asarray(successes, float), np.asarray(n, float)
    if np.any((k < 0) | (k > n)):
        raise ValueError("successes must lie between 0 and n")
    z2 = ndtri((1 + level) / 2) ** 2
    centre = k + z2 / 2
    half = np.sqrt(z2 * np.divide(k * (n - k), n, out=np.zeros(n.shape), where=n > 0) + z2**2 / 4)
    return np.maximum((centre - half) / (n + z2), 0.0), np.minimum((centre + half) / (n + z2), 1.0)


def expand(count: FloatArray, coverage: FloatArray) -> FloatArray:
    """What a whole interval would have had, had the rest of it been like the part listened to.

    Count, or limit of a count, over coverage; NaN where coverage is 0. The limits of `poisson_limits`
    so expanded are exact for a steady rate (a Poisson mean for a known exposure scales with it).
    """
    share = np.asarray(coverage, float)
    expanded: FloatArray = np.full(share.shape, np.nan)
    np.divide(count, share, out=expanded, where=share > 0)
    return expanded


@dataclass(frozen=True, slots=True, kw_only=True)
class Dispersion:
    """How counts of like intervals vary, beside what chance alone would make of them."""

    n: int
    mean: float
    variance: float  # sample variance, n - 1
    ratio: float  # variance / mean: 1 where only chance varies them
    p_value: float  # of a ratio as high or higher by chance


@dataclass(frozen=True, slots=True, kw_only=True)
class Mean:
    """Mean over like intervals (days of a kind, say) with limits from how much these vary."""

    n: int
    mean: float
    low: float | None  # None: a single interval does not tell
    high: float | None
    dispersion: Dispersion | None


def dispersion(counts: FloatArray) -> Dispersion | None:
    """Tell whether counts vary more than by chance; None for fewer than two, or where nobody passed.

    Notes
    -----
    The index of dispersion (n - 1) variance / mean is chi-square with n - 1 degrees of freedom where counts
    are Poisson. Source: R. A. Fisher, Statistical Methods for Research Workers (1925), section 19.
    12 15 9 22 18 30 11 14: ratio 2.878, p 0.0053.
    """
    from scipy.special import chdtrc

    known = counts[np.isfinite(counts)]
    n = len(known)
    if n < 2 or not np.any(known > 0):
        return None
    mean, variance = float(np.mean(known)), float(np.var(known, ddof=1))
    p_value = float(chdtrc(n - 1, (n - 1) * variance / mean))
    return Dispersion(n=n, mean=mean, variance=variance, ratio=variance / mean, p_value=p_value)


def mean_with_limits(counts: FloatArray, level: float = 0.95) -> Mean | None:
    """Mean of like intervals; NaN, not counted, is left out; None where none is left.

    Notes
    -----
    Limits are mean -+ t s / sqrt(n), with Student's t for n - 1 degrees of freedom (Student, Biometrika 6,
    1908): they rest on how much the intervals did vary, so counts that vary more than by chance get the
    wider limits that they deserve. Cut at 0.
    """
    from scipy.special import stdtrit

    _check_level(level)
    known = counts[np.isfinite(counts)]
    n = len(known)
    if n == 0:
        return None
    mean = float(np.mean(known))
    if n == 1:
        return Mean(n=1, mean=mean, low=None, high=None, dispersion=None)
    half = float(stdtrit(n - 1, (1 + level) / 2) * np.std(known, ddof=1) / np.sqrt(n))
    return Mean(n=n, mean=mean, low=max(mean - half, 0.0), high=mean + half, dispersion=dispersion(known))


def _check_level(level: float) -> None:
    if not 0 < level < 1:
        raise ValueError(f"{level=} must lie between 0 and 1")
