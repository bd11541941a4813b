"""Speed, frequency and geometry of a continuous-wave radar, as formulas.

The path runs along x with the sensor line at x = 0; ``offset_m`` is the nearest distance
between a mover's line and the sensor, sideways and in height together.
"""

from __future__ import annotations

import numpy as np

from ginnel.words import FloatArray, Mounting

C_MPS = 299_792_458.0  # speed of light, exact (SI)

#: Height of a walker's centre line above the floor; common practice, no source.
BODY_CENTRE_M = 1.0


def hz_per_mps(carrier_hz: float) -> float:
    """Two-way Doppler shift for each m/s of radial speed: 2 f0 / c.

    10.525 GHz gives 70.215 Hz, 24.125 GHz gives 160.945 Hz.

    Raises
    ------
    ValueError
        carrier_hz is not finite and positive.
    """
    if not (np.isfinite(carrier_hz) and carrier_hz > 0):
        raise ValueError(f"{carrier_hz=} must be finite and positive")
    return 2.0 * carrier_hz / C_MPS


def wavelength_m(carrier_hz: float) -> float:
    """Free-space wavelength, m."""
    return C_MPS / carrier_hz


def range_m(x_m: FloatArray, offset_m: float) -> FloatArray:
    """Distance from the sensor to a mover at x along the path."""
    return np.hypot(x_m, offset_m)


def cosine(x_m: FloatArray, offset_m: float) -> FloatArray:
    """Cosine between the path and the line of sight, x / R; 0 at the sensor itself."""
    distance_m = np.hypot(x_m, offset_m)
    return np.divide(x_m, distance_m, out=np.zeros_like(distance_m), where=distance_m > 0)


def nearest_distance_m(mounting: Mounting, target_height_m: float = BODY_CENTRE_M) -> float:
    """Nearest distance between sensor and a mover on the path's centre line.

    Height counts as offset too.
    """
    return float(np.hypot(mounting.offset_m, mounting.height_m - target_height_m))
