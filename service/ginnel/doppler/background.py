"""What each bin hears when nothing moves, learnt over minutes without being told when that is.

The mean power of every step (a second or two) is kept for two minutes; a low quantile of the
means, put right for the spread that noise itself has, is the background. Lines that stand still
(lamps, hum) are in it; movers are not, as long as each bin is free of them for a tenth of the time.
"""

from __future__ import annotations

from collections import deque
from statistics import NormalDist

import numpy as np

from ginnel.words import FloatArray

_MEMORY_S = 120.0
_RENEW_S = 4.0
_QUANTILE = 0.1


def quantile_of_mean(quantile: float, n_looks: float) -> float:
    """A quantile of the mean of ``n_looks`` exponential variables of mean 1.

    Wilson and Hilferty's cube-root approximation of the gamma distribution; the 0.1 quantile of
    20 looks is 0.728.
    """
    third = 1.0 / (9.0 * n_looks)
    return float((1.0 - third + NormalDist().inv_cdf(quantile) * np.sqrt(third)) ** 3)


class Background:
    """Per-bin background power, fed with steps of a fixed number of frames."""

    def __init__(self, n_bins: int, frames_per_step: int, step_s: float) -> None:
        self._n_looks = frames_per_step
        self._means: deque[FloatArray] = deque(maxlen=max(10, round(_MEMORY_S / step_s)))
        self._renew_steps = max(1, round(_RENEW_S / step_s))
        self._n_steps = 0
        #: Background power, shape (n_bins,), float32; infinite until the first ``renew``.
        self.power = np.full(n_bins, np.inf, dtype=np.float32)

    def push(self, step_power: FloatArray) -> None:
        """Take one step of frames, shape (frames_per_step, n_bins)."""
        self._means.append(step_power.mean(axis=0, dtype=np.float64))
        self._n_steps += 1
        if self._n_steps % self._renew_steps == 0:
            self.renew()

    def renew(self) -> None:
        """Bring ``power`` up to date with all steps so far."""
        n = len(self._means)
        if n == 0:
            return
        rank = int(_QUANTILE * n)
        low = np.partition(np.stack(self._means), rank, axis=0)[rank]
        # Where a rank stands among n draws: Blom's plotting position.
        quantile = (rank + 1 - 0.375) / (n + 0.25)
        self.power = (low / quantile_of_mean(quantile, self._n_looks)).astype(np.float32)
