"""What the sensor hears of a scatterer: beam twice, 1 / R^2 in amplitude, phase 4 pi R / lambda.

Echoes are complex, I + jQ, with approaching as positive frequency; a mono sensor gives the real
part. A wall, floor or ceiling adds an image path: out directly and back by way of the wall, or the reverse.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.words import FloatArray, Mounting

DEFAULT_WIDTH_DEG = (80.0, 40.0)
_RIPPLES = 6
_NEAREST_M = 0.3  # nothing comes nearer than that: 1 / R^2 has an end


@dataclass(frozen=True, slots=True, kw_only=True)
class Beam:
    """The antenna's pattern: a Gaussian main lobe (-3 dB at half the width), a floor, side lobes.

    ``width_deg`` overrides the mounting's widths, so that a sensor can be configured wrongly.
    ``floor_db`` is the power, one way, that goes in every direction, the back included.
    ``side_lobes_db`` is how far irregular lobes vary the floor, up and down; ``ripple_db`` is the standard
    deviation of a smooth unevenness of the whole pattern, one way, that no data sheet shows; ``seed`` draws
    both.
    """

    width_deg: tuple[float, float] | None = None
    floor_db: float = -20.0
    side_lobes_db: float = 0.0
    ripple_db: float = 0.0
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
    gain = lobe + 10 ** (floor_db / 10)
    if beam.ripple_db:
        gain *= 10 ** (_ripple_db(beam, share * left, share * above) / 10)
    return np.asarray(gain)


def _ripple_db(beam: Beam, left_deg: FloatArray, above_deg: FloatArray) -> FloatArray:
    """Waves over the angles, of 15 to 40 degrees each, in directions drawn by the beam's seed."""
    rng = np.random.default_rng([beam.seed, 0x21BB])
    total_db = np.zeros_like(left_deg)
    for _ in range(_RIPPLES):
        per_deg, turn, start = 1 / rng.uniform(15.0, 40.0), *rng.uniform(0, 2 * np.pi, size=2)
        along_deg = left_deg * np.cos(turn) + above_deg * np.sin(turn)
        total_db += np.sin(2 * np.pi * per_deg * along_deg + start)
    return np.asarray(beam.ripple_db * np.sqrt(2 / _RIPPLES) * total_db)


@dataclass(frozen=True, slots=True, kw_only=True)
class Wall:
    """A flat wall beside the path, at y = y_m; ``reflection`` is its amplitude factor."""

    y_m: float
    reflection: float = 0.3

    def image_m(self, y_m: FloatArray, up_m: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Sideways place and height of a scatterer's mirror image."""
        return 2 * self.y_m - y_m, up_m


@dataclass(frozen=True, slots=True, kw_only=True)
class Floor:
    """A level surface ``up_m`` above the floor: the floor itself, or a ceiling."""

    up_m: float = 0.0
    reflection: float = 0.3

    def image_m(self, y_m: FloatArray, up_m: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Sideways place and height of a scatterer's mirror image."""
        return y_m, 2 * self.up_m - up_m


#: Anything that gives a second way to the sensor and back.
Mirror = Wall | Floor


def echo_paths(
    places_m: FloatArray,
    amplitudes: FloatArray,
    mounting: Mounting,
    beam: Beam,
    walls: tuple[Mirror, ...],
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
        image_y, image_height = wall.image_m(y, places_m[..., 2])
        image_up = image_height - mounting.height_m
        image_m = np.maximum(np.sqrt(x**2 + image_y**2 + image_up**2), _NEAREST_M)
        gain = np.sqrt(direct_gain * beam_gain(beam, mounting, x, image_y, image_up))
        ranges_m.append(0.5 * (direct_m + image_m))
        # Twice: there by the wall and back directly, and the other way about.
        levels.append(2 * wall.reflection * amplitudes * gain / (direct_m * image_m))
    return np.concatenate(ranges_m), np.concatenate(levels)
