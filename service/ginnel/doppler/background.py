"""What each bin hears when nothing moves, learnt over minutes without being told when that is.

The mean power of every step (a second or two) is kept for two minutes; a low quantile of the
means, put right for the spread that noise itself has, is the background. Lines that stand still
(lamps, hum) are in it; movers are not, as long as each bin is free of them for a tenth of the time.

Two things come to stay and are not waited for: a rise of all bins at once (a gain step, an input
plugged in) makes the background forget what was before it, and a line that stays level for
``_STEADY_S`` without any flicker, as no body's echo does, is taken in (a lamp switched on).
"""

from __future__ import annotations

from collections import deque
from statistics import NormalDist

import numpy as np

from ginnel.words import FloatArray

_MEMORY_S = 120.0
_RENEW_S = 4.0
_QUANTILE = 0.1
#: A rise of all bins that lasts so long has come to stay.
_RISE_S = 6.0
#: A bin is steady if its steps stay within this ratio for so long; a walker's level changes by
#: more, with R^-4 and the gait. A line counts from twice the background on.
_STEADY_S, _STEADY_RATIO, _LINE_RATIO = 10.0, 1.6, 2.0
#: Squared mean over mean square of a bin's power: 1 for a line, 1/2 for noise and for bodies of many
#: parts, whose power is exponential; 0.74 for a line four times as strong as the noise. People one
#: behind the other keep a level for long, but flicker.
_LEAST_CONSTANCY = 0.65


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
        self._constancies: deque[FloatArray] = deque(maxlen=max(4, round(_STEADY_S / step_s)))
        self._renew_steps = max(1, round(_RENEW_S / step_s))
        self._rise_steps = max(2, round(_RISE_S / step_s))
        self._steady_steps = max(4, round(_STEADY_S / step_s))
        self._n_steps = 0
        self._n_risen = 0
        #: Background power, shape (n_bins,), float32; infinite until the first ``renew``.
        self.power = np.full(n_bins, np.inf, dtype=np.float32)

    def push(self, step_power: FloatArray, *, is_risen: bool = False) -> None:
        """Take one step of frames, shape (frames_per_step, n_bins).

        A step of less than half the frames (the span's last) is too rough to be learnt from.
        is_risen : all bins at once stand above the background.
        """
        if 2 * len(step_power) < self._n_looks and self._means:
            return
        mean = step_power.mean(axis=0, dtype=np.float64)
        mean_square = np.einsum("ij,ij->j", step_power, step_power, dtype=np.float64) / len(step_power)
        self._means.append(mean)
        self._constancies.append(mean**2 / np.maximum(mean_square, np.finfo(np.float64).tiny))
        self._n_steps += 1
        self._n_risen = self._n_risen + 1 if is_risen else 0
        if self._n_risen >= self._rise_steps:
            while len(self._means) > self._n_risen:
                self._means.popleft()
            self._n_risen = 0
            self.renew()
        elif self._n_steps % self._renew_steps == 0:
            self.renew()

    def renew(self) -> None:
        """Bring ``power`` up to date with all steps so far."""
        n = len(self._means)
        if n == 0:
            return
        means = np.stack(self._means)
        rank = int(_QUANTILE * n)
        low = np.partition(means, rank, axis=0)[rank]
        # Where a rank stands among n draws: Blom's plotting position.
        quantile = (rank + 1 - 0.375) / (n + 0.25)
        power = low / quantile_of_mean(quantile, self._n_looks)
        if n > self._steady_steps:
            recent = means[-self._steady_steps :]
            least, most = recent.min(axis=0), recent.max(axis=0)
            is_level = (least > _LINE_RATIO * power) & (most < _STEADY_RATIO * least)
            is_line = is_level & (np.mean(self._constancies, axis=0) > _LEAST_CONSTANCY)
            power = np.where(is_line, recent.mean(axis=0), power)
        self.power = power.astype(np.float32)
