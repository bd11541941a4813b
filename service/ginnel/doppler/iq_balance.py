"""Removes the mirror image that unequal I and Q channels leave on the other side of zero.

With gain and phase errors the pair gives y = a z + b z*, so each line at +f has an image
(b/a*) of itself, conjugated, at -f. Gram-Schmidt orthogonalisation on the sample covariance
does the same in time; here the covariance is taken over bins that move, since hum and lamps
really are symmetric and would bias it.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

#: Moving energy (in units of noise power) that is worth as much as the prior "well balanced".
_PRIOR_ENERGY = 2000.0
#: A cell whose mirror is stronger than this against it, in power, is no mover's: the worst pairs
#: leave images 10 dB down, while lamps and hum that have just come on are the same on both sides.
_MIRROR_RATIO = 0.25
#: Memory of the estimate in moving energy: drifting offsets and ageing are followed slowly.
_FORGET_ENERGY = 2e6


class IqBalance:
    """Keeps a running estimate of the image ratio b/a* and takes the image out of spectra."""

    def __init__(self) -> None:
        self._pseudo_covariance = 0j
        self._energy = 0.0

    @property
    def image_ratio(self) -> complex:
        """Estimated ratio of image to line, complex; 0 until something has moved."""
        return self._pseudo_covariance / (self._energy + _PRIOR_ENERGY)

    @property
    def image_db(self) -> float:
        """Image below the line, dB, negative; -inf while unknown."""
        with np.errstate(divide="ignore"):
            return float(20 * np.log10(abs(self.image_ratio)))

    def correct(self, spectra: NDArray[np.complex64]) -> NDArray[np.complex64]:
        """Spectra of shape (n_frames, n_bins), bins symmetric about zero, without their image."""
        image = np.complex64(self.image_ratio) * np.conj(spectra[:, ::-1])
        return (spectra - image).astype(np.complex64, copy=False)

    def learn(
        self,
        spectra: NDArray[np.complex64],
        noise_power: NDArray[np.float32],
        moving: NDArray[np.bool_],
    ) -> None:
        """Take uncorrected spectra into the estimate, where cells move; mirrored cells go along."""
        if not moving.any():
            return
        mirror = spectra[:, ::-1]
        frames, bins = np.nonzero(moving)
        weight = 1.0 / noise_power[bins]
        here, there = spectra[frames, bins], mirror[frames, bins]
        # Each pair is seen from its stronger side only, else it would count twice.
        keep = np.abs(there) ** 2 < _MIRROR_RATIO * np.abs(here) ** 2
        self._pseudo_covariance += complex(np.sum((here * there * weight)[keep], dtype=np.complex128))
        energy = float(np.sum(((np.abs(here) ** 2) * weight)[keep], dtype=np.float64))
        self._energy += energy
        if self._energy > _FORGET_ENERGY:
            self._pseudo_covariance *= _FORGET_ENERGY / self._energy
            self._energy = _FORGET_ENERGY
