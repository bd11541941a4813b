"""Passages rolled up: what a number of them amount to, whoever they were.

Only what can be added up is kept, in whole numbers, so that rolling up parts and merging them gives
exactly what rolling up the whole gives. Percentiles come from the histogram, whose bins are finer
than any one speed is known.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ginnel.words import FloatArray

#: Width of a bin of the histogram. A percentile read at the bin's middle is off by half of it at most.
BIN_MPS = 0.01
_BIN_UMPS = 10_000
_LAST_BIN = 2**16 - 1  # and above: 655 m/s
_CELL = np.dtype([("bin", "<u2"), ("n", "<u4")])

IntArray = NDArray[np.int64]


@dataclass(frozen=True, slots=True, kw_only=True)
class Rollup:
    """Passages in sums. What is said of speeds is of those that were measured.

    ``histogram`` holds cells of six bytes, a bin (unsigned, 16 bits) and how many are in it (32 bits),
    little end first, bins ascending, none empty; bin b is [b, b + 1) cm/s.
    """

    count: int = 0
    measured: int = 0
    speed_sum_mmps: int = 0
    speed_square_sum_mm2ps2: int = 0
    slowness_sum_uspm: int = 0  # microseconds per metre: sum of 1 / v
    histogram: bytes = b""

    @property
    def mean_mps(self) -> float | None:
        """Mean over passages, to half a millimetre a second; None where no speed was measured."""
        return self.speed_sum_mmps / self.measured / 1e3 if self.measured else None

    @property
    def space_mean_mps(self) -> float | None:
        """Harmonic mean; None where no speed was measured."""
        return 1e6 * self.measured / self.slowness_sum_uspm if self.measured else None

    @property
    def sd_mps(self) -> float | None:
        """Sample standard deviation (n - 1); None for fewer than two speeds."""
        n = self.measured
        if n < 2:
            return None
        spread = n * self.speed_square_sum_mm2ps2 - self.speed_sum_mmps**2  # whole numbers: never negative
        return math.sqrt(spread / (n * (n - 1))) / 1e3

    def speed_cells(self) -> tuple[FloatArray, IntArray]:
        """Middles of the bins that hold any speed, m/s ascending, and how many are in each; shape (n,)."""
        cells = np.frombuffer(self.histogram, _CELL)
        return (cells["bin"] + 0.5) * BIN_MPS, cells["n"].astype(np.int64)

    def speed_mps(self) -> FloatArray:
        """Speeds in ascending order, each at the middle of its bin; shape (measured,)."""
        middle_mps, n = self.speed_cells()
        return np.repeat(middle_mps, n)


def roll_up(speed_umps: IntArray) -> Rollup:
    """Roll up passages.

    Parameters
    ----------
    speed_umps : array, shape (n,), micrometres per second in any order; negative: not measured
    """
    measured = speed_umps[speed_umps >= 0]
    speed_mmps = np.round(measured / 1000).astype(np.int64)
    bins, n = np.unique(np.minimum(measured // _BIN_UMPS, _LAST_BIN), return_counts=True)
    return Rollup(
        count=len(speed_umps),
        measured=len(measured),
        speed_sum_mmps=int(speed_mmps.sum()),
        speed_square_sum_mm2ps2=int((speed_mmps**2).sum()),
        # what stands still would take for ever; a micrometre a second is slow enough
        slowness_sum_uspm=int((10**12 // np.maximum(measured, 1)).sum()),
        histogram=_packed(bins, n),
    )


def merge(rollups: Sequence[Rollup]) -> Rollup:
    """Roll-up of all passages together; merging none gives one of no passages."""
    cells = np.frombuffer(b"".join(one.histogram for one in rollups), _CELL)
    total = np.bincount(cells["bin"], weights=cells["n"])  # sums of whole numbers, exact up to 2^53
    bins = np.flatnonzero(total)
    n = total[bins].astype(np.int64)
    return Rollup(
        count=sum(one.count for one in rollups),
        measured=sum(one.measured for one in rollups),
        speed_sum_mmps=sum(one.speed_sum_mmps for one in rollups),
        speed_square_sum_mm2ps2=sum(one.speed_square_sum_mm2ps2 for one in rollups),
        slowness_sum_uspm=sum(one.slowness_sum_uspm for one in rollups),
        histogram=_packed(bins, n),
    )


def _packed(bins: NDArray[np.integer], n: NDArray[np.integer]) -> bytes:
    cells = np.empty(len(bins), _CELL)
    cells["bin"], cells["n"] = bins, n
    return cells.tobytes()
