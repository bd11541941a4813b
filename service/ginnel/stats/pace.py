"""The range of speeds that most keep, and the share above a limit."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.words import FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Pace:
    """The range [low, high) of a chosen width that holds the most speeds."""

    low_mps: float
    high_mps: float
    n: int
    share: float  # of all measured speeds


def pace(speed_mps: FloatArray, width_mps: float) -> Pace | None:
    """Find the pace; NaN, not measured, is left out; None without a speed.

    Parameters
    ----------
    speed_mps : array, shape (n,)
    width_mps : float, > 0; 10 mph (4.4704 m/s) on roads by custom

    Notes
    -----
    The range of that width with the most observations (as in the Iowa Handbook of Simplified Practice for
    Traffic Studies, CTRE, 2002). A best range always begins at an observation, so only those are tried;
    of equals the slowest is given.
    """
    if not width_mps > 0:
        raise ValueError(f"{width_mps=} must be positive")
    ordered = np.sort(speed_mps[np.isfinite(speed_mps)])
    if len(ordered) == 0:
        return None
    n_inside = np.searchsorted(ordered, ordered + width_mps, side="left") - np.arange(len(ordered))
    best = int(np.argmax(n_inside))
    low, n = float(ordered[best]), int(n_inside[best])
    return Pace(low_mps=low, high_mps=low + width_mps, n=n, share=n / len(ordered))


def share_over(speed_mps: FloatArray, limit_mps: float) -> float | None:
    """Share of measured speeds that are above a limit; None without a speed."""
    measured = speed_mps[np.isfinite(speed_mps)]
    return float(np.mean(measured > limit_mps)) if len(measured) else None
