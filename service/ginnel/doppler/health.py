"""How well an input hears, from its samples: noise and the lines that mains and lamps leave in it.

Everything is on the scale where a sine that just fits between the ends of the converter has the power 1,
that is 0 dBFS (AES17); for an I/Q pair, two such sines a quarter of a turn apart.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
import scipy.fft
from numpy.typing import NDArray

from ginnel.words import FloatArray, SampleArray

#: A sample within this of full scale was clipped.
CLIP_LEVEL = 0.999
#: Multiples of the mains frequency: what leaks in from the supply, and what lamps flicker at.
HUM_MULTIPLES, LAMP_MULTIPLES = (1, 3, 5), (2, 4, 6, 8, 10)
#: Mains may be off by 1 % (EN 50160, for 99.5 % of a year).
_MAINS_TOLERANCE = 0.01
#: A Hann line reaches two bins to each side.
_LINE_BINS = 2
_BESIDE_HZ = 15.0
_HANN_NOISE_BINS = 1.5
_MEDIAN_OF_NOISE = {1: math.log(2), 2: 0.83917}


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """A line in a spectrum, so far above the noise beside it."""

    frequency_hz: float
    over_noise_db: float


def hann(n: int) -> NDArray[np.float32]:
    """Periodic Hann window of mean 1, shape (n,)."""
    return np.asarray(1 - np.cos(2 * np.pi / n * np.arange(n)), np.float32)


def power_density(samples: SampleArray, sample_rate_hz: float, n_bins: int) -> FloatArray:
    """Power per hertz of one stretch, both signs of an I/Q pair together.

    Parameters
    ----------
    samples : float32 or complex64, shape (n,), without their mean
    n_bins : how many bins of sample_rate_hz / n to give, at most n / 2

    Returns
    -------
    array, shape (n_bins,), full-scale sine squared per Hz

    Notes
    -----
    Hann periodogram. Of white noise it adds up to the power: over bins, times their width. A line's
    highest bin holds its power over 1.5 bins (Harris 1978: noise bandwidth of a Hann window).
    """
    n = len(samples)
    per_hz = 1 / (sample_rate_hz * _HANN_NOISE_BINS * n)
    if np.iscomplexobj(samples):
        power = np.abs(scipy.fft.fft(samples * hann(n))) ** 2
        folded = power[:n_bins] + np.concatenate([[0.0], power[:0:-1]])[:n_bins]
        return np.asarray(folded * per_hz)
    one_sided = np.abs(scipy.fft.rfft(samples.real * hann(n))[:n_bins]) ** 2
    return np.asarray(one_sided * (4 * per_hz))  # two signs, and a full-scale sine's 1/2 counts as 1


def noise_density(density: FloatArray, bin_hz: float, from_hz: float, n_signs: int = 1) -> float:
    """Level of the noise between the lines and movers, from a frequency on.

    Parameters
    ----------
    density : array, shape (n_bins,): the median over some spectra, from `power_density`
    n_signs : signs of frequency added up in it: 1, or 2 for an I/Q pair

    Notes
    -----
    The median over bins, over that of noise of mean 1: ln 2 for an exponential variable, 0.8392 for the
    mean of two (a gamma variable of shape 2). The median of an odd number of spectra has the same median
    as one of them; that of an even number, nearly.
    """
    noise = density[min(math.ceil(from_hz / bin_hz), len(density) - 1) :]
    return float(np.median(noise) / _MEDIAN_OF_NOISE[n_signs])


def strongest_line(
    density: FloatArray, bin_hz: float, mains_hz: float, multiples: Sequence[int], n_signs: int = 1
) -> Line | None:
    """Find the line at one of these multiples of the mains that stands highest; None out of the band.

    ``density`` and ``n_signs`` are as for `noise_density`.
    """
    lines = [
        line
        for multiple in multiples
        if (line := _line_near(density, bin_hz, multiple * mains_hz, n_signs)) is not None
    ]
    return max(lines, key=lambda line: line.over_noise_db, default=None)


def decibels(power_ratio: float) -> float:
    """10 log10 of a ratio, with nothing at all at -200 dB."""
    return 10 * math.log10(max(power_ratio, 1e-20))


def _line_near(density: FloatArray, bin_hz: float, frequency_hz: float, n_signs: int) -> Line | None:
    centre = frequency_hz / bin_hz
    half = _MAINS_TOLERANCE * centre + 1
    first, last = math.ceil(centre - half), math.floor(centre + half) + 1
    beside = max(4, round(_BESIDE_HZ / bin_hz))
    if last + _LINE_BINS + beside > len(density) or first - _LINE_BINS - beside < 1:
        return None
    peak = first + int(np.argmax(density[first:last]))
    left = density[first - _LINE_BINS - beside : first - _LINE_BINS]
    right = density[last + _LINE_BINS : last + _LINE_BINS + beside]
    noise = float(np.median(np.concatenate([left, right]))) / _MEDIAN_OF_NOISE[n_signs]
    return Line(frequency_hz=peak * bin_hz, over_noise_db=decibels(float(density[peak]) / max(noise, 1e-20)))
