"""Constant false alarm rate: how far above its neighbours a cell must stand.

All multipliers hold for square-law cells in exponential noise.
"""

from __future__ import annotations

import math


def ca_multiplier(n_reference: int, false_alarm_rate: float) -> float:
    """Multiplier of the *mean* of the reference cells, cell-averaging CFAR.

    alpha = N (Pfa^(-1/N) - 1). N = 16, Pfa = 1e-3 gives 8.6388.

    Raises
    ------
    ValueError
        n_reference < 1, or false_alarm_rate outside (0, 1).
    """
    _check(n_reference, false_alarm_rate)
    return n_reference * math.expm1(-math.log(false_alarm_rate) / n_reference)


def os_false_alarm_rate(n_reference: int, rank: int, multiplier: float) -> float:
    """False alarm rate of ordered-statistic CFAR.

    Pfa = prod_{i=0}^{k-1} (N - i) / (N - i + alpha), Rohling 1983; the multiplier applies to
    the ``rank``-th smallest of the reference cells.
    """
    return math.exp(
        sum(math.log(n_reference - i) - math.log(n_reference - i + multiplier) for i in range(rank))
    )


def os_multiplier(n_reference: int, rank: int, false_alarm_rate: float) -> float:
    """Multiplier of the ``rank``-th smallest reference cell; the inverse of the rate above.

    N = 24, k = 18, Pfa = 1e-3 gives 6.5024.

    Raises
    ------
    ValueError
        rank outside 1..n_reference, or as for :func:`ca_multiplier`.
    """
    _check(n_reference, false_alarm_rate)
    if not 1 <= rank <= n_reference:
        raise ValueError(f"{rank=} must lie in 1..{n_reference}")
    low, high = 0.0, 1.0
    while os_false_alarm_rate(n_reference, rank, high) > false_alarm_rate:
        low, high = high, 2 * high
    for _ in range(80):  # bisection: the rate falls monotonically with the multiplier
        middle = (low + high) / 2
        if os_false_alarm_rate(n_reference, rank, middle) > false_alarm_rate:
            low = middle
        else:
            high = middle
    return (low + high) / 2


def _check(n_reference: int, false_alarm_rate: float) -> None:
    if n_reference < 1:
        raise ValueError(f"{n_reference=} must be at least 1")
    if not 0 < false_alarm_rate < 1:
        raise ValueError(f"{false_alarm_rate=} must lie between 0 and 1")
