"""One mover as a hypothesis, and the spectrogram that it would make."""

from __future__ import annotations

from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from ginnel.passages.site import N_ZONES, Site
from ginnel.words import FloatArray

#: A Hann frame's main lobe as a Gaussian: its half-power width is 1.44 bins (Harris 1978, Table 1).
LOBE_BINS = 1.44 / 2.355
#: A uniform spread over one unit has this standard deviation.
_UNIFORM = 1 / np.sqrt(12.0)
#: A Hann window weighs a frame's middle: chirps smear as if it were this much shorter.
_WINDOW_SHARE = 0.67
SQRT_TAU = float(np.sqrt(2 * np.pi))


@dataclass(frozen=True, slots=True, kw_only=True)
class Mover:
    """Crossing time, speed, way, nearest distance, and level and drift zone by zone.

    ``sign`` is +1 approaching, -1 receding. ``level`` is the log power at the nominal curve's
    maximum, in units of the cluster's reference noise; ``drift`` the relative change of speed.
    """

    crossed_s: float
    speed_mps: float
    sign: int
    offset_m: float
    level: FloatArray
    drift: FloatArray = field(default_factory=lambda: np.zeros(N_ZONES))

    def position_m(self, t_s: FloatArray) -> FloatArray:
        """Where along the path; positive on the side that the beam looks at."""
        return self.speed_mps * self.sign * (self.crossed_s - t_s)


@dataclass(frozen=True, slots=True)
class Line:
    """A mover's Doppler line at some times; every array has the shape of the times.

    ``centre`` is in bins from 0 Hz, signed for I/Q, folded to positive for mono.
    """

    x_m: FloatArray
    log_range: FloatArray
    centre: FloatArray
    width: FloatArray
    log_power: FloatArray
    zones: FloatArray


def line_of(site: Site, mover: Mover, t_s: FloatArray, point: FloatArray | None = None) -> Line:
    """The line of a mover, or of variants of it.

    point : array, shape (3, n_variants), optional: crossing, speed and offset in place of the
    mover's own; results then have shape (n_variants, n_times).
    """
    if point is None:
        crossed_s, speed_mps, offset_m = mover.crossed_s, mover.speed_mps, mover.offset_m
    else:
        crossed_s, speed_mps, offset_m = (row[:, None] for row in point)
        t_s = t_s[None, :]
    x = speed_mps * mover.sign * (crossed_s - t_s)
    range2 = x * x + offset_m * offset_m
    inverse = 1.0 / np.sqrt(range2)
    log_range = 0.5 * np.log(range2)
    zones = site.zone_weights(log_range)
    bins_per_mps = site.bins_per_mps
    radial = speed_mps * x * inverse * (1.0 + np.tensordot(mover.drift, zones, axes=1))
    centre = radial * bins_per_mps
    bend = offset_m * offset_m * inverse / range2  # d cos / dx
    chirp = speed_mps**2 * bend * bins_per_mps * site.frame_s * _WINDOW_SHARE * _UNIFORM
    spread = site.body.length_m * speed_mps * bend * bins_per_mps * _UNIFORM
    wobble = site.body.gait_ratio * centre
    width = np.sqrt(LOBE_BINS**2 + chirp * chirp + spread * spread + wobble * wobble)
    log_power = site.nominal_level(x) + np.tensordot(mover.level, zones, axes=1)
    centre = centre * mover.sign if site.is_iq else np.abs(centre)
    return Line(x, log_range, centre, width, np.minimum(log_power, 40.0), zones)


def line_shape(site: Site, line: Line, bins: NDArray[np.intp]) -> FloatArray:
    """Power density of a line over bins: shape (..., n_times, n_bins); sums to its power."""
    width = line.width[..., None]
    z = (bins - line.centre[..., None]) / width
    shape = np.exp(-0.5 * z * z)
    if not site.is_iq:  # what falls below 0 Hz folds back
        z = (bins + line.centre[..., None]) / width
        shape += np.exp(-0.5 * z * z)
    limbs = site.body.limb_share
    shape *= ((1.0 - limbs) / (line.width * SQRT_TAU))[..., None]
    shape += limbs / bins.shape[-1]
    shape *= np.exp(line.log_power)[..., None]
    return shape
