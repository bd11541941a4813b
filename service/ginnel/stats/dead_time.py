"""Counts lost because each passage hides the next for a while.

Source of both models: G. F. Knoll, Radiation Detection and Measurement, chapter 4 (from memory); recomputed.
"""

from __future__ import annotations

import numpy as np

from ginnel.words import FloatArray


def counted_rate(true_rate: FloatArray, dead_time: float, *, extending: bool) -> FloatArray:
    """Rate that is counted at a true rate.

    Parameters
    ----------
    true_rate : array, events per unit of time
    dead_time : float, in the same unit, >= 0
    extending : whether an event hidden by another prolongs the dead time. A counter that joins what
        is not parted by a gap does; one that is blocked for a fixed time does not.

    Notes
    -----
    n exp(-n tau) where extending, else n / (1 + n tau). 10 a minute with 1.5 s: 7.788 and 8.
    """
    rate = np.asarray(true_rate, float)
    if extending:
        return rate * np.exp(-rate * dead_time)
    return rate / (1 + rate * dead_time)


def true_rate(counted: FloatArray, dead_time: float) -> FloatArray:
    """True rate behind a counted one, for a dead time that does not extend.

    Raises
    ------
    ValueError
        A rate is as high as the dead time allows at most, 1 / dead_time, or higher.

    Notes
    -----
    n = m / (1 - m tau). 0.2 a second with 2 s: 0.3333.
    """
    rate = np.asarray(counted, float)
    if np.any(rate * dead_time >= 1):
        raise ValueError(f"no more than {1 / dead_time:g} can be counted with a dead time of {dead_time:g}")
    return rate / (1 - rate * dead_time)
