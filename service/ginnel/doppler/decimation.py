"""Polyphase decimation to the band that the speeds need.

The filter is cut into rows of one output step each; one matrix product gives every row's
share for every output, and outputs are sums along its diagonals. Always called with whole
batches of one size, so that the rounding of the product never depends on the caller's blocks.
"""

from __future__ import annotations

import numpy as np

from ginnel.words import FloatArray, SampleArray

#: Kaiser window for 66 dB (Kaiser's formula), the most that twelve steps reach at factor 2; 64 dB measured.
_KAISER_BETA = 0.1102 * (66.0 - 8.7)
#: Filter length in output steps; sets the transition, 0.32 to 0.68 of the output rate.
_ROWS = 12
#: Share of the output rate up to which outputs are flat and free of aliases.
CLEAN_SHARE = 0.32


def decimation_factor(sample_rate_hz: float, band_hz: float) -> int:
    """Largest whole factor that keeps 0 to ``band_hz`` flat and free of aliases."""
    return max(1, int(CLEAN_SHARE * sample_rate_hz // band_hz))


def lowpass_taps(factor: int) -> FloatArray:
    """Low-pass taps for one decimation factor: unit gain at 0 Hz, half gain at half the output rate.

    Kaiser-windowed sinc, ``12 * factor`` taps.
    """
    n_taps = _ROWS * factor
    t = (np.arange(n_taps) - (n_taps - 1) / 2) / factor
    taps = np.sinc(t) * np.kaiser(n_taps, _KAISER_BETA)
    return np.asarray(taps / taps.sum())


class Decimator:
    """Keeps the filter's memory between batches.

    ``delay_samples`` input samples lie between an output's first and central input sample.
    """

    def __init__(self, factor: int, dtype: np.dtype[np.inexact]) -> None:
        self.factor = factor
        self._matrix = lowpass_taps(factor).reshape(_ROWS, factor).T.astype(np.float32)
        self._memory: SampleArray = np.zeros((0,), dtype=dtype)
        self.delay_samples = (_ROWS * factor - 1) / 2

    def push(self, samples: SampleArray) -> SampleArray:
        """Decimate one batch; the first one gives ``_ROWS - 1`` outputs fewer.

        samples : shape (n,), n a multiple of the factor.
        """
        samples = np.concatenate([self._memory, samples])
        rows = samples.reshape(-1, self.factor)
        shares = self._shares(rows)
        n_out = max(0, len(rows) - _ROWS + 1)
        self._memory = samples[n_out * self.factor :]
        out = shares[:n_out, 0].copy()
        for row in range(1, _ROWS):
            np.add(out, shares[row : row + n_out, row], out=out)
        return out

    def _shares(self, rows: SampleArray) -> SampleArray:
        """Share of every row in the outputs that it touches, shape (len(rows), _ROWS).

        A product of complex numbers with real taps costs half as much in two halves.
        """
        if not np.iscomplexobj(rows):
            return rows @ self._matrix
        shares = np.empty((len(rows), _ROWS), dtype=np.complex64)
        shares.real = np.ascontiguousarray(rows.real) @ self._matrix
        shares.imag = np.ascontiguousarray(rows.imag) @ self._matrix
        return shares
