"""How fast a settled mover went: its speed moment by moment, and the mean of it.

The fit needs few numbers, so it lets the speed change only from zone to zone and at a price. Here
the mover is known and only its speed is asked for: each frame says by how much the line stands
above or below the fitted one, and two Ornstein-Uhlenbeck processes say how such departures go on.
One is slow, since people and drivers change their pace; one is quick, since a torso swings with
each step. Both are Markov, so the posterior needs a banded solver only (Rue and Held 2005, ch. 2).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solveh_banded

from ginnel.passages.cluster import Cluster
from ginnel.passages.explained import Explained
from ginnel.passages.fit import AGREEMENT_DB, Cells, gather, weigh
from ginnel.passages.mover import LOBE_BINS, SQRT_TAU, Line
from ginnel.passages.site import NEPERS_PER_DB, ZONE_COSINE2, Body
from ginnel.words import FloatArray

#: Relative changes of pace on the way, and for how long they last; common practice, no source.
_PACE_SD, _PACE_S = 0.10, 2.0
#: Steps take about 0.55 s: a torso's swing (``Body.gait_ratio``) is forgotten in a fifth of that.
_SWING_S = 0.1
#: Within one frame of 0.1 s the same swing blurs the line by this share of itself.
_BLUR = 0.2
#: Half-overlapping Hann frames: each brings about half of its own news.
_NEWS_SHARE = 0.5
_N_STEPS, _MOST_STEP = 5, 0.08
#: A frame's own level is followed this far down and up.
_LEVEL_REACH_DB = (-10.0, 6.0)


@dataclass(frozen=True, slots=True)
class Pace:
    """Mean speed along the path over the time in which a mover was heard, and its standard error."""

    speed_mps: float
    se_mps: float


def pace_of(cluster: Cluster, one: Explained) -> Pace:
    """Mean speed of one of a cluster's movers, once all of them are settled."""
    cluster.take_back(one.claim)
    cells = gather(cluster, one.mover)
    assert cells is not None  # noqa: S101 - a settled mover has cells
    stronger_db = weigh(cluster, cells).stronger_db
    cluster.set_aside(one.claim)
    is_heard = (cells.frames >= one.first_frame) & (cells.frames <= one.last_frame)
    frames = _FrameCells.chosen(cells, stronger_db, is_heard)
    if len(frames.line.centre) < 2:
        return Pace(one.mean_speed_mps, 0.0)
    site = cluster.site
    smoother = Smoother(cluster.t_s[frames.frames], (_PACE_SD, _PACE_S), (site.body.gait_ratio, _SWING_S))
    width = np.sqrt(
        np.maximum(frames.line.width**2 - (site.body.gait_ratio * frames.line.centre) ** 2, LOBE_BINS**2)
        + (_BLUR * site.body.gait_ratio * frames.line.centre) ** 2
    )
    departure = np.zeros(len(frames.frames))
    for _ in range(_N_STEPS):
        slope, information = _news(frames, width, departure, site.body.limb_share)
        step = smoother.mean(information, departure * information + slope) - departure
        departure = departure + np.clip(step, -_MOST_STEP, _MOST_STEP)
    speed_mps = one.mover.speed_mps * (1.0 + one.mover.drift @ frames.line.zones) * (1.0 + departure)
    share = _shares(frames, information, site.body)
    mean_mps = float(share @ speed_mps)
    return Pace(mean_mps, mean_mps * smoother.se_of(share, information))


def _shares(frames: _FrameCells, information: FloatArray, body: Body) -> FloatArray:
    """Share of each frame in the mean speed: equal, where a frame tells more than was known before.

    Beside the sensor the line shows little speed and much of the mounting's error: shares fall with
    the squared cosine there.
    """
    known_before = 1.0 / (_PACE_SD**2 + body.gait_ratio**2)
    share = information / (information + known_before) * (ZONE_COSINE2 @ frames.line.zones) + 1e-9
    return np.asarray(share / share.sum())


@dataclass(frozen=True, slots=True)
class _FrameCells:
    """Cells along the line in the frames in which a mover was heard."""

    frames: NDArray[np.intp]
    bins: NDArray[np.intp]
    whitened: FloatArray
    power: FloatArray  # of the whole mover in each cell's units of noise
    weight: FloatArray
    line: Line

    @classmethod
    def chosen(cls, cells: Cells, stronger_db: FloatArray, chosen: NDArray[np.bool_]) -> _FrameCells:
        """Cells of some frames; those much stronger than the mover are somebody else's."""
        line = cells.line
        level = line.log_power + np.clip(stronger_db, *_LEVEL_REACH_DB) * NEPERS_PER_DB
        agreement = np.clip(1.0 - (stronger_db / AGREEMENT_DB) ** 2, 0.0, 1.0)
        return cls(
            frames=cells.frames[chosen],
            bins=cells.bins[chosen],
            whitened=cells.whitened[chosen],
            power=np.exp(level[chosen, None]) * cells.reference[chosen],
            weight=_NEWS_SHARE * np.where(stronger_db > 0, agreement, 1.0)[chosen],
            line=Line(
                line.x_m[chosen],
                line.log_range[chosen],
                line.centre[chosen],
                line.width[chosen],
                line.log_power[chosen],
                line.zones[:, chosen],
            ),
        )


def _news(
    frames: _FrameCells, width: FloatArray, departure: FloatArray, limb_share: float
) -> tuple[FloatArray, FloatArray]:
    """Slope and Fisher information of each frame's log-likelihood over the line's relative departure."""
    centre = frames.line.centre
    z = (frames.bins - (centre * (1.0 + departure))[:, None]) / width[:, None]
    torso = np.exp(-0.5 * z * z) * ((1.0 - limb_share) / (width * SQRT_TAU))[:, None]
    mean = 1.0 + (torso + limb_share / frames.bins.shape[1]) * frames.power
    change = torso * z * (centre / width)[:, None] * frames.power / mean
    slope = np.sum(change * (frames.whitened - mean) / mean, axis=1)
    return frames.weight * slope, frames.weight * np.sum(change * change, axis=1)


class Smoother:
    """Posterior of the sum of two Ornstein-Uhlenbeck processes, interleaved as (slow, quick) pairs.

    Precision of one process over times t with r = exp(-dt / tau): tridiagonal (Rue and Held 2005, 1.2.2).
    """

    def __init__(self, t_s: FloatArray, slow: tuple[float, float], quick: tuple[float, float]) -> None:
        self._n = len(t_s)
        self._banded = np.zeros((3, 2 * self._n))  # lower form: diagonal, first and second below
        for which, (sd, tau_s) in enumerate((slow, quick)):
            kept = np.exp(-np.diff(t_s) / tau_s)
            diagonal = np.ones(self._n)
            diagonal[1:] += kept**2 / (1.0 - kept**2)
            diagonal[:-1] += kept**2 / (1.0 - kept**2)
            self._banded[0, which::2] = diagonal / sd**2
            self._banded[2, which:-2:2] = -kept / (1.0 - kept**2) / sd**2

    def mean(self, information: FloatArray, weighted: FloatArray) -> FloatArray:
        """Posterior mean of the sum, given information and information-weighted observations."""
        pair = self._solve(information, weighted)
        return pair[0::2] + pair[1::2]

    def se_of(self, share: FloatArray, information: FloatArray) -> float:
        """Standard error of a weighted mean over all times."""
        pair = self._solve(information, share)
        return math.sqrt(max(float(share @ (pair[0::2] + pair[1::2])), 0.0))

    def _solve(self, information: FloatArray, right: FloatArray) -> FloatArray:
        banded = self._banded.copy()
        banded[0] += np.repeat(information, 2)
        banded[1, 0::2] += information
        return np.asarray(solveh_banded(banded, np.repeat(right, 2), lower=True, check_finite=False))
