"""Before and after: by how much counts and speeds changed, and how sure that is."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ginnel.stats.counts import IntArray
from ginnel.words import FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class RateRatio:
    """Rate after over rate before, day by day, weekdays compared with their like."""

    ratio: float
    log_se: float  # standard error of ln(ratio)
    low: float
    high: float
    dispersion: float  # days vary by this much more than by chance; at least 1 is reckoned with
    n_before: int  # days used
    n_after: int


@dataclass(frozen=True, slots=True, kw_only=True)
class MeanChange:
    """Mean after less mean before."""

    before: float
    after: float
    change: float
    se: float
    low: float
    high: float


def rate_ratio(
    counts: FloatArray,
    exposure: FloatArray,
    is_after: NDArray[np.bool_],
    stratum: IntArray,
    level: float = 0.95,
) -> RateRatio | None:
    """Compare the rates of two periods within strata.

    Parameters
    ----------
    counts : array, shape (n,), one a day
    exposure : array, shape (n,), how much of the day was listened to; days with 0 are left out
    is_after : array, shape (n,)
    stratum : array, shape (n,), for example the weekday; a stratum not in both periods is left out
    level : confidence of the limits

    Returns
    -------
    None where too few days are left to tell how much they vary, or nobody passed in a period

    Notes
    -----
    Log-linear model ln E(count) = a(stratum) + b after + ln(exposure), fitted as Poisson; its maximum is
    where the sum over strata of (after - total p) is 0, p = ratio e_after / (e_before + ratio e_after).
    The standard error of b is sqrt(phi / sum(total p (1 - p))), with phi Pearson's chi-square over its
    degrees of freedom, but at least 1, and Student's t. Source: P. McCullagh and J. A. Nelder,
    Generalized Linear Models (2nd ed., 1989), chapter 6: over-dispersion.
    """
    from scipy.special import stdtrit

    used = (exposure > 0) & np.isfinite(counts)
    both = np.intersect1d(stratum[used & is_after], stratum[used & ~is_after])
    used &= np.isin(stratum, both)
    count, time, after = counts[used], exposure[used], is_after[used]
    group = np.searchsorted(both, stratum[used])
    df = len(count) - len(both) - 1
    if df < 1 or not np.any(count[after] > 0) or not np.any(count[~after] > 0):
        return None
    total, time_after, time_before = (
        np.bincount(group, weights=weights).astype(float) for weights in (count, time * after, time * ~after)
    )
    log_ratio, information = _solve_log_ratio(float(count[after].sum()), total, time_before, time_after)
    ratio = float(np.exp(log_ratio))
    rate = total / (time_before + ratio * time_after)
    expected = rate[group] * time * np.where(after, ratio, 1.0)
    live = expected > 0
    chi2 = float(np.sum((count[live] - expected[live]) ** 2 / expected[live]))
    phi = max(chi2 / df, 1.0)
    log_se = float(np.sqrt(phi / information))
    half = float(stdtrit(df, (1 + level) / 2)) * log_se
    return RateRatio(
        ratio=ratio,
        log_se=log_se,
        low=float(np.exp(log_ratio - half)),
        high=float(np.exp(log_ratio + half)),
        dispersion=chi2 / df,
        n_before=int(np.sum(~after)),
        n_after=int(np.sum(after)),
    )


def _solve_log_ratio(
    after: float, total: FloatArray, time_before: FloatArray, time_after: FloatArray
) -> tuple[float, float]:
    """Newton's steps on the concave likelihood of ln(ratio), and the information at its top."""
    crude = after / np.sum(time_after) / (np.sum(total) - after) * np.sum(time_before)
    log_ratio, information = float(np.log(crude)), 1.0
    for _ in range(100):
        share = 1 / (1 + time_before / (time_after * np.exp(log_ratio)))
        information = float(np.sum(total * share * (1 - share)))
        step = (after - float(np.sum(total * share))) / information
        log_ratio += float(np.clip(step, -1, 1))
        if abs(step) < 1e-12:
            break
    return log_ratio, information


def mean_change(
    sum_before: FloatArray, n_before: IntArray, sum_after: FloatArray, n_after: IntArray, level: float = 0.95
) -> MeanChange | None:
    """Compare means over passages of two periods, days being what varies.

    Parameters
    ----------
    sum_before, n_before, sum_after, n_after : arrays, one value a day: sum of speeds, and how many

    Returns
    -------
    None where a period has fewer than two days with a speed

    Notes
    -----
    Passages of one day share its weather and its crowd, so each mean is a ratio estimate over days:
    variance d / (d - 1) sum((S - n mean)^2) / (sum n)^2. Source: W. G. Cochran, Sampling Techniques
    (3rd ed., 1977), section 2.11. Limits by Student's t with Welch's degrees of freedom (Biometrika
    34, 1947).
    """
    from scipy.special import stdtrit

    mean_b, var_b, days_b = _day_mean(sum_before, n_before)
    mean_a, var_a, days_a = _day_mean(sum_after, n_after)
    if days_b < 2 or days_a < 2:
        return None
    variance = var_b + var_a
    df = variance**2 / (var_b**2 / (days_b - 1) + var_a**2 / (days_a - 1)) if variance > 0 else 1.0
    half = float(stdtrit(df, (1 + level) / 2) * np.sqrt(variance))
    change = mean_a - mean_b
    return MeanChange(
        before=mean_b,
        after=mean_a,
        change=change,
        se=float(np.sqrt(variance)),
        low=change - half,
        high=change + half,
    )


def _day_mean(sums: FloatArray, n: IntArray) -> tuple[float, float, int]:
    some = n > 0
    sums, n = sums[some], n[some]
    days = len(n)
    if days == 0:
        return float("nan"), float("nan"), 0
    mean = float(np.sum(sums) / np.sum(n))
    variance = days / max(days - 1, 1) * float(np.sum((sums - n * mean) ** 2)) / float(np.sum(n)) ** 2
    return mean, variance, days
