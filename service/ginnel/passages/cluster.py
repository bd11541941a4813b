"""The spectrogram of one stretch of activity, whitened, with what has been explained set aside."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from ginnel.doppler.frontend import DEAF_POWER, broadband_rise
from ginnel.passages.site import Site
from ginnel.words import FloatArray

#: Share of a frame's strongest cell that counts as noise: limbs, splatter and harmonics of the
#: strongest mover must not pass for another one. 17 dB below.
_OWN_CLUTTER = 0.02


class Cluster:
    """Frames ``first_frame_idx ..`` of a span as whitened power.

    whitened : (n_frames, n_bins), 1 where there is only noise and what was set aside; reference :
    reference noise over each cell's noise, 0 outside the watched bins.
    """

    def __init__(
        self,
        site: Site,
        first_frame_idx: int,
        power: NDArray[np.float32],
        background: NDArray[np.float32],
        watched: NDArray[np.bool_],
    ) -> None:
        self.site = site
        self.first_frame_idx = first_frame_idx
        self.n_frames, self.n_bins = power.shape
        #: Time of each frame's start in frames' own clock, seconds.
        self.t_s: FloatArray = (first_frame_idx + np.arange(self.n_frames)) / site.frame_rate_hz
        background = np.maximum(background, np.float32(DEAF_POWER))
        noise = background * broadband_rise(power, background)
        excess = np.where(watched, power - noise, 0.0).max(axis=1).clip(min=0.0)
        # A frame's neighbours overlap it, and so does their clutter.
        padded = np.concatenate([[0.0], excess, [0.0]])
        clutter = np.maximum(np.maximum(padded[:-2], padded[2:]), excess)
        noise = noise + _OWN_CLUTTER * clutter[:, None]
        reference_power = float(np.median(background[watched]))
        self._whitened: FloatArray = np.where(watched, power / noise, 1.0)
        self._reference: FloatArray = np.where(watched, reference_power / noise, 0.0)
        self._aside: FloatArray = np.zeros_like(self._whitened)
        self.whitened, self.reference = self._whitened, self._reference
        strongest = (self.whitened[:, watched] / self.reference[:, watched]).max(initial=3.0)
        self.strongest_db = float(10 * np.log10(strongest))

    def set_aside(self, power: FloatArray) -> None:
        """Count power (in units of each cell's noise) as explained: it joins the noise."""
        self._aside = self._aside + power
        self.whitened = self._whitened / (1.0 + self._aside)
        self.reference = self._reference / (1.0 + self._aside)

    def take_back(self, power: FloatArray) -> None:
        """Undo :meth:`set_aside`."""
        self.set_aside(-power)
        self._aside = np.maximum(self._aside, 0.0)

    def noise_before(self, frames: NDArray[np.intp]) -> FloatArray:
        """Reference noise over noise without what was set aside, shape (len(frames), n_bins)."""
        return self._reference[frames]
