"""Two movers, one behind the other at one speed, that were fitted as one.

Far from the sensor their lines are one line, and one mover with some tolerance explains both. What
tells them apart is that each crosses for itself, with a bend and a rise and fall of level of its own.
So two stories, one mover and two, are told of the same cells in full: no cell is set aside, both have
the same level curve along the path, and the level may fade in and out for both at the same price.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ginnel.passages.cluster import Cluster
from ginnel.passages.explained import Explained, heard
from ginnel.passages.fit import Fit, log_prior, refine, score_of
from ginnel.passages.mover import Mover, line_of, line_shape
from ginnel.passages.site import N_ZONES, NEPERS_PER_DB
from ginnel.words import FloatArray

#: Fainter movers are not looked at: their level says too little.
_LEAST_SCORE = 300.0
#: Each of two must stand for itself with the other known, nats.
_LEAST_PART = 100.0
#: Nats by which two must explain the cells better than one; simulated single walkers gave up to 70.
_LEAST_GAIN = 75.0
#: Headways from which the fit starts, and the shortest that can be told.
_HEADWAYS_S, _LEAST_HEADWAY_S = (1.0, 1.6, 2.4, 3.6), 0.85
#: Who follows goes at the same speed (relative), and is of a like size: a prior, and a limit.
_SPEED_SD, _MOST_SPEED = 0.02, 1.04
_SIZE_SD, _MOST_APART_DB = 3.0 * NEPERS_PER_DB, 5.0
#: The level of all together may fade like this over the window, in either direction.
_FADE_SD_DB, _MOST_FADE_DB, _FADE_S = 3.0, 12.0, 0.6
_N_STEPS = 6
_PER_MOVER = 3  # crossing, speed, size
#: A zone counts for a mover's size from this gain on, nats.
_HEARD_GAIN = 30.0
#: Refined with the other known, a crossing moves by no more than this.
_MOST_MOVED_S = 0.5


@dataclass(frozen=True, slots=True)
class Tale:
    """Movers with one level curve, and how well they explain the cells, nats."""

    movers: tuple[Mover, ...]
    score: float


def split(cluster: Cluster, one: Explained) -> list[Explained]:
    """The two movers that a fitted one really is, or itself."""
    if not cluster.site.body.may_turn or one.fit.score < _LEAST_SCORE:
        return [one]  # vehicles keep their distance, and their frames are many
    single, pair = tales_of(cluster, one)
    first, second = pair.movers
    apart_db = abs(float(first.level.mean() - second.level.mean())) / NEPERS_PER_DB
    is_pair = (
        pair.score - single.score > _LEAST_GAIN
        and apart_db < _MOST_APART_DB
        and second.crossed_s - first.crossed_s > _LEAST_HEADWAY_S
    )
    if not is_pair:
        return [one]
    return _part(cluster, one, pair.movers)


def _part(cluster: Cluster, one: Explained, pair: tuple[Mover, ...]) -> list[Explained]:
    """Give each of a pair what is its own of a fitted mover's cells."""
    # a tale's level hangs on its fading; the fit's own scale is kept
    middle = np.mean([mover.level.mean() for mover in pair])
    size = _size_of(one)
    movers = [replace(mover, level=mover.level.mean() - middle + np.full(N_ZONES, size)) for mover in pair]
    cluster.take_back(one.claim)
    for i in (0, 1, 0, 1):
        other = _own_power(cluster, movers[1 - i])
        cluster.set_aside(other)
        fit = refine(cluster, movers[i], n_outer=1)
        cluster.take_back(other)
        if fit is not None and abs(fit.mover.crossed_s - pair[i].crossed_s) < _MOST_MOVED_S:
            movers[i] = fit.mover
    powers = [_own_power(cluster, mover) for mover in movers]
    margin = one.fit.score - one.rival_score
    both = []
    for mover, own, other in zip(movers, powers, reversed(powers), strict=True):
        cluster.set_aside(other)
        score = score_of(cluster, mover) + log_prior(cluster, mover)
        both.append(heard(cluster, Fit(mover, score, one.fit.covariance), score - margin, own))
        cluster.take_back(other)
    if min(part.fit.score for part in both) < _LEAST_PART:
        cluster.set_aside(one.claim)
        return [one]
    cluster.set_aside(powers[0] + powers[1])
    return both


def _size_of(one: Explained) -> float:
    """Median level of a fitted mover over the zones in which it was heard."""
    is_heard = one.zone_gain > _HEARD_GAIN
    return float(np.median(one.mover.level[is_heard] if is_heard.any() else one.mover.level))


def _own_power(cluster: Cluster, mover: Mover) -> FloatArray:
    """Power of a mover as told, in units of each cell's noise, without any tolerance."""
    site = cluster.site
    bins = np.broadcast_to(np.arange(cluster.n_bins) + site.plan.first_bin_idx, cluster.whitened.shape)
    return line_shape(site, line_of(site, mover, cluster.t_s), bins) * cluster.reference


def tales_of(cluster: Cluster, one: Explained) -> tuple[Tale, Tale]:
    """The best tale of one mover and the best of two, told of the cells of a fitted mover."""
    cluster.take_back(one.claim)
    stage = _Stage(cluster, one.first_frame, one.last_frame)
    cluster.set_aside(one.claim)
    lone = replace(one.mover, offset_m=cluster.site.offset_m, level=np.full(N_ZONES, _size_of(one)))
    single = stage.tell((lone,))
    (lone,) = single.movers
    pairs = []
    for headway_s in _HEADWAYS_S:
        for before_s in (0.0, headway_s):
            first = replace(lone, crossed_s=lone.crossed_s - before_s)
            pairs.append(stage.tell((first, replace(first, crossed_s=first.crossed_s + headway_s))))
    return single, max(pairs, key=lambda pair: pair.score)


class _Stage:
    """The cells of a stretch of frames, all bins of them, of which tales are told."""

    def __init__(self, cluster: Cluster, first_frame: int, last_frame: int) -> None:
        self._site = site = cluster.site
        margin = round(1.5 * site.frame_rate_hz)
        rows = slice(max(0, first_frame - margin), min(cluster.n_frames, last_frame + margin + 1))
        self._t_s: FloatArray = cluster.t_s[rows]
        self._whitened, self._reference = cluster.whitened[rows], cluster.reference[rows]
        bins = np.arange(cluster.n_bins) + site.plan.first_bin_idx
        self._bins = np.broadcast_to(bins, self._whitened.shape)
        self._window = np.ones(2 * max(1, int(0.5 * _FADE_S * site.frame_rate_hz)) + 1)

    def tell(self, movers: tuple[Mover, ...]) -> Tale:
        """Fit movers with one level curve by Fisher scoring with Levenberg's damping."""
        damping = 1e-2
        for _ in range(_N_STEPS):
            fade, _ = self._fade(self._total(movers))
            score = self._gain(movers, fade)
            gradient, information = self._slope(movers, fade)
            diagonal = np.diag(np.diag(information))
            for _ in range(4):
                ridge = damping * diagonal + 1e-9 * np.eye(len(gradient))
                trial = _moved(movers, np.linalg.solve(information + ridge, gradient))
                trial_score = self._gain(trial, fade)
                if trial_score > score:
                    break
                damping *= 6
            else:
                break
            movers, gained, damping = trial, trial_score - score, max(damping / 6, 1e-4)
            if gained < 0.5:
                break
        fade, price = self._fade(self._total(movers))
        return Tale(movers, self._gain(movers, fade) - price)

    def _power(self, mover: Mover, point: FloatArray | None = None) -> tuple[FloatArray, FloatArray]:
        line = line_of(self._site, mover, self._t_s, point)
        return line_shape(self._site, line, self._bins) * self._reference, line.zones

    def _total(self, movers: tuple[Mover, ...]) -> FloatArray:
        return sum((self._power(mover)[0] for mover in movers), np.zeros_like(self._whitened))

    def _fade(self, power: FloatArray) -> tuple[FloatArray, float]:
        """How much stronger than told each moment is, shape (n_frames, 1), and its price in nats."""
        fisher = power / (1.0 + power) ** 2
        excess = np.convolve(np.sum((self._whitened - 1.0) * fisher, axis=1), self._window, "same")
        expected = np.convolve(np.sum(power * fisher, axis=1), self._window, "same")
        # one nat of doubt: a level that nothing tells of is as told
        fade_db = np.log(np.maximum(excess + 1.0, 1e-3) / (expected + 1.0)) / NEPERS_PER_DB
        fade_db = np.clip(fade_db, -_MOST_FADE_DB, _MOST_FADE_DB)
        price = 0.5 * float(np.sum((fade_db / _FADE_SD_DB) ** 2)) / len(self._window)
        return np.exp(fade_db * NEPERS_PER_DB)[:, None], price

    def _gain(self, movers: tuple[Mover, ...], fade: FloatArray) -> float:
        mean = 1.0 + self._total(movers) * fade
        shape = movers[0].level - movers[0].level.mean()
        sizes = np.array([mover.level.mean() for mover in movers])
        speeds = np.log([mover.speed_mps for mover in movers])
        return float(
            np.sum(self._whitened * (1.0 - 1.0 / mean) - np.log(mean))
            - 0.5 * shape @ self._site.level_precision @ shape
            - 0.5 * np.sum((sizes - sizes.mean()) ** 2) / _SIZE_SD**2
            - 0.5 * np.sum((speeds - speeds.mean()) ** 2) / _SPEED_SD**2
        )

    def _slope(self, movers: tuple[Mover, ...], fade: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Gradient and Fisher information over each mover's crossing, speed and size, and the curve."""
        n = _PER_MOVER * len(movers)
        derivative = np.zeros((n + N_ZONES, *self._whitened.shape))
        power = np.zeros_like(self._whitened)
        for i, mover in enumerate(movers):
            delta = np.array([0.03, 0.01 * mover.speed_mps])
            variants = np.repeat(
                np.array([[mover.crossed_s], [mover.speed_mps], [mover.offset_m]]), 3, axis=1
            )
            variants[[0, 1], [1, 2]] += delta
            own, zones = self._power(mover, variants)
            derivative[_PER_MOVER * i : _PER_MOVER * i + 2] = (own[1:] - own[0]) / delta[:, None, None]
            derivative[_PER_MOVER * i + 2] = own[0]
            derivative[n:] += own[0] * zones[:, 0, :, None]
            power += own[0]
        mean = 1.0 + power * fade
        flat = (derivative * fade).reshape(len(derivative), -1)
        gradient = flat @ ((self._whitened - mean) / mean**2).ravel()
        information = (flat / (mean**2).ravel()) @ flat.T
        curve, speed_at, size_at = slice(n, None), np.arange(1, n, _PER_MOVER), np.arange(2, n, _PER_MOVER)
        centring = np.eye(N_ZONES) - 1.0 / N_ZONES
        precision = centring @ self._site.level_precision @ centring
        gradient[curve] -= precision @ (movers[0].level - movers[0].level.mean())
        information[curve, curve] += precision + 1e3 * np.ones((N_ZONES, N_ZONES))  # size is the movers' own
        sizes = np.array([mover.level.mean() for mover in movers])
        gradient[size_at] -= (sizes - sizes.mean()) / _SIZE_SD**2
        information[size_at, size_at] += 1.0 / _SIZE_SD**2
        speeds = np.array([mover.speed_mps for mover in movers])
        gradient[speed_at] -= (np.log(speeds) - np.log(speeds).mean()) / _SPEED_SD**2 / speeds
        information[speed_at, speed_at] += 1.0 / (_SPEED_SD * speeds) ** 2
        return gradient, information


def _moved(movers: tuple[Mover, ...], step: FloatArray) -> tuple[Mover, ...]:
    """Movers after a step, kept within what one step may change and what a pair may be."""
    curve = np.clip(step[_PER_MOVER * len(movers) :], -0.7, 0.7)
    steps = step[: _PER_MOVER * len(movers)].reshape(len(movers), _PER_MOVER)
    crossings = np.array([m.crossed_s for m in movers]) + np.clip(steps[:, 0], -0.4, 0.4)
    speeds = np.array([m.speed_mps for m in movers])
    speeds = speeds * (1.0 + np.clip(steps[:, 1] / speeds, -0.1, 0.1))
    middle = np.exp(np.log(speeds).mean())
    speeds = np.clip(speeds, middle / _MOST_SPEED, middle * _MOST_SPEED)
    return tuple(
        replace(
            mover,
            crossed_s=float(crossing),
            speed_mps=float(speed),
            level=mover.level + np.clip(size, -1.5, 1.5) + curve - curve.mean(),
        )
        for mover, crossing, speed, size in zip(movers, crossings, speeds, steps[:, 2], strict=True)
    )
