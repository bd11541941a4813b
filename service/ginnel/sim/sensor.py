"""What the sensor hears of a scatterer: beam twice, 1 / R^2 in amplitude, phase 4 pi R / lambda.

Echoes are complex, I + jQ, with approaching as positive frequency; a mono sensor gives the real
part. A wall adds an image path: out directly and back by way of the wall, or the reverse.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.words import FloatArray, Mounting

DEFAULT_WIDTH_DEG = (80.0, 40.0)
_NEAREST_M = 0.3  # nothing comes nearer than that: 1 / R^2 has an end


@dataclass(frozen=True, slots=True, kw_only=True)
class Beam:
    """The antenna's pattern: a Gaussian main lobe (-3 dB at half the width), a floor, side lobes.

    ``width_deg`` overrides the mounting's widths, so that a sensor can be configured wrongly.
    ``floor_db`` is the power, one way, that goes in every direction, the back included.
    ``side_lobes_db`` is how far irregular lobes vary the floor, up and down; ``seed`` draws them.
    """

    width_deg: tuple[float, float] | None = None
    floor_db: float = -20.0
    side_lobes_db: float = 0.0
    seed: int = 0


def beam_gain(
    beam: Beam, mounting: Mounting, x_m: FloatArray, y_m: FloatArray, up_m: FloatArray
) -> FloatArray:
    """Power gain one way, which is the amplitude gain for both ways; 1 along the beam's axis.

    Parameters
    ----------
    x_m, y_m, up_m : arrays of one shape, m, from the sensor to the scatterer

    Returns
    -------
    array of the same shape, 0 to about 1
    """
    turn, tilt = np.deg2rad(mounting.beam_angle_deg), np.deg2rad(mounting.tilt_deg)
    level = x_m * np.cos(turn) + y_m * np.sin(turn)
    ahead = level * np.cos(tilt) - up_m * np.sin(tilt)
    left = y_m * np.cos(turn) - x_m * np.sin(turn)
    above = up_m * np.cos(tilt) + level * np.sin(tilt)
    # Angle off the axis, split into its two parts: this has no seam at the zenith as azimuth has.
    across = np.hypot(left, above)
    off_deg = np.degrees(np.arctan2(across, ahead))
    share = np.divide(off_deg, across, out=np.zeros_like(off_deg), where=across > 0)
    width = beam.width_deg or mounting.beam_width_deg or DEFAULT_WIDTH_DEG
    lobe = np.exp(-4 * np.log(2) * ((share * left / width[0]) ** 2 + (share * above / width[1]) ** 2))
    floor_db = np.full_like(off_deg, beam.floor_db)
    if beam.side_lobes_db:
        rng = np.random.default_rng([beam.seed, 0x51DE])
        for _ in range(4):
            per_deg = rng.uniform(-1, 1, size=2) / 25.0
            wave = share * left * per_deg[0] + share * above * per_deg[1] + rng.uniform()
            floor_db += 0.5 * beam.side_lobes_db * np.sin(2 * np.pi * wave)
    return np.asarray(lobe + 10 ** (floor_db / 10))


@dataclass(frozen=True, slots=True, kw_only=True)
class Wall:
    """A flat wall beside the path, at y = y_m; ``reflection`` is its amplitude factor."""

    y_m: float
    reflection: float = 0.3


def echo_paths(
    places_m: FloatArray, amplitudes: FloatArray, mounting: Mounting, beam: Beam, walls: tuple[Wall, ...]
) -> tuple[FloatArray, FloatArray]:
    """Lengths and amplitudes of all paths by which scatterers are heard.

    Parameters
    ----------
    places_m : array, shape (s, t, 3): x, y and height above the floor
    amplitudes : array, shape (s, t): square roots of the reflected powers

    Returns
    -------
    tuple of arrays, shape (s * (1 + walls), t)
        Half of the way there and back, m; amplitude, where 1 is a 1 m^2 scatterer at 1 m on the axis.
    """
    x, y, up = places_m[..., 0], places_m[..., 1], places_m[..., 2] - mounting.height_m
    direct_m = np.maximum(np.sqrt(x**2 + y**2 + up**2), _NEAREST_M)
    direct_gain = beam_gain(beam, mounting, x, y, up)
    ranges_m, levels = [direct_m], [amplitudes * direct_gain / direct_m**2]
    for wall in walls:
        image_y = 2 * wall.y_m - y
        image_m = np.maximum(np.sqrt(x**2 + image_y**2 + up**2), _NEAREST_M)
        gain = np.sqrt(direct_gain * beam_gain(beam, mounting, x, image_y, up))
        ranges_m.append(0.5 * (direct_m + image_m))
        # Twice: there by the wall and back directly, and the other way about.
        levels.append(2 * wall.reflection * amplitudes * gain / (direct_m * image_m))
    return np.concatenate(ranges_m), np.concatenate(levels)
