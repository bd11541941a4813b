"""How well a mover explains the cells along its line, and the mover nearby that does so best.

Whitened cells are exponential with mean 1 + P where a mover adds P: the gain of a frame is the
log-likelihood ratio against noise alone (the Itakura-Saito form). Two things keep the model's own
errors from being taken for evidence:

* a frame that is far stronger or weaker than the mover's level there says nothing for it, since
  that energy must be somebody else's;
* the gain of each zone along the path counts in full while small and logarithmically beyond
  ``SATURATION``: a thousand frames of a straight line far away cannot outvote the bend beside the
  sensor.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from ginnel.passages.cluster import Cluster
from ginnel.passages.mover import Line, Mover, line_of, line_shape
from ginnel.passages.site import N_ZONES, NEPERS_PER_DB, Body
from ginnel.words import FloatArray

#: Gain of one zone, nats, where model errors begin to outweigh chance.
SATURATION = 200.0
#: A level this far from a frame's own takes the frame out of the fit, dB.
AGREEMENT_DB = 10.0
#: Power, relative to a cell's noise, from which a line is looked at.
_VISIBLE = 0.03
_N_SHAPE = 3  # crossing, speed, offset
_MAX_STEP_LEVEL, _MAX_STEP_DRIFT, _MAX_STEP_S = 2.0, 0.1, 0.5
NOT_SEEN = -1e6


@dataclass(frozen=True, slots=True)
class Cells:
    """The cells along a mover's line: n frames of w bins each."""

    frames: NDArray[np.intp]  # (n,)
    bins: NDArray[np.intp]  # (n, w), from 0 Hz
    whitened: FloatArray  # (n, w)
    reference: FloatArray  # (n, w), 0 where a cell is not watched
    line: Line


@dataclass(frozen=True, slots=True)
class Evidence:
    """What cells say about a mover: score in nats, and gain and weight of every frame."""

    score: float
    gain: FloatArray
    weight: FloatArray
    raw: FloatArray
    power: FloatArray
    stronger_db: FloatArray  # how much stronger than the mover's level each frame is


def gather(cluster: Cluster, mover: Mover) -> Cells | None:
    """Cells about a mover's line wherever it should be seen; None if nowhere."""
    site = cluster.site
    reach_s = site.body.reach_m / mover.speed_mps
    behind_s = site.behind_m / mover.speed_mps + 0.1
    before_s, after_s = (reach_s, behind_s) if mover.sign > 0 else (behind_s, reach_s)
    start_s = float(cluster.t_s[0])
    low = max(0, int((mover.crossed_s - before_s - start_s) * site.frame_rate_hz))
    high = min(cluster.n_frames, int((mover.crossed_s + after_s - start_s) * site.frame_rate_hz) + 2)
    if high - low < 3:
        return None
    line = line_of(site, mover, cluster.t_s[low:high])
    with np.errstate(divide="ignore"):
        visible = line.log_power + np.log(cluster.reference[low:high].max(axis=1)) > np.log(_VISIBLE)
    chosen = np.nonzero(visible)[0]
    if len(chosen) < 3:
        return None
    line = Line(
        line.x_m[chosen],
        line.log_range[chosen],
        line.centre[chosen],
        line.width[chosen],
        line.log_power[chosen],
        line.zones[:, chosen],
    )
    half = int(np.clip(np.ceil(2.5 * np.median(line.width) + 1), 4, 12))
    bins = np.round(line.centre).astype(np.intp)[:, None] + np.arange(-half, half + 1)
    column = bins - site.plan.first_bin_idx
    inside = (column >= 0) & (column < cluster.n_bins)
    column = np.clip(column, 0, cluster.n_bins - 1)
    frames = chosen + low
    whitened = np.where(inside, cluster.whitened[frames[:, None], column], 1.0)
    reference = np.where(inside, cluster.reference[frames[:, None], column], 0.0)
    return Cells(frames, bins, whitened, reference, line)


def weigh(cluster: Cluster, cells: Cells) -> Evidence:
    """Evidence of cells for the mover whose line they follow."""
    power = line_shape(cluster.site, cells.line, cells.bins) * cells.reference
    mean = 1.0 + power
    raw = np.sum(cells.whitened * (power / mean) - np.log(mean), axis=1)
    fisher = power / (mean * mean)
    excess = np.sum((cells.whitened - 1.0) * fisher, axis=1)
    expected = np.sum(power * fisher, axis=1)
    window = np.ones(2 * max(1, int(0.3 * cluster.site.frame_rate_hz)) + 1)
    if len(raw) > len(window):
        excess, expected = np.convolve(excess, window, "same"), np.convolve(expected, window, "same")
    else:
        excess, expected = np.full_like(raw, excess.sum()), np.full_like(raw, expected.sum())
    stronger_db = np.log(np.maximum(excess / (expected + 1e-12), 1e-3)) / NEPERS_PER_DB
    agreement = 1.0 - (stronger_db / AGREEMENT_DB) ** 2
    is_stronger = stronger_db > 0
    factor = np.clip(agreement, np.where(is_stronger, -0.5, -1.0), 1.0)
    gain = np.where(raw > 0, raw * factor, raw)
    weight = np.where(is_stronger, np.clip(agreement, 0, 1), 1.0)
    zone_gain = cells.line.zones @ gain
    positive = np.maximum(zone_gain, 0.0)
    score = np.where(zone_gain > 0, SATURATION * np.log1p(positive / SATURATION), zone_gain).sum()
    weight = weight * ((1.0 / (1.0 + positive / SATURATION)) @ cells.line.zones)
    return Evidence(float(score), gain, weight, raw, power, stronger_db)


def log_prior(cluster: Cluster, mover: Mover) -> float:
    """How far a mover departs from what the mounting leads to expect, nats, at most 0."""
    site = cluster.site
    level = mover.level - mover.level.mean()
    offset = np.log(mover.offset_m / site.offset_m) / site.body.offset_log_sd
    return float(
        -0.5 * level @ site.level_precision @ level
        - 0.5 * mover.drift @ site.drift_precision @ mover.drift
        - 0.5 * offset * offset
    )


def score_of(cluster: Cluster, mover: Mover) -> float:
    """Score of a mover as it stands, without its prior."""
    cells = gather(cluster, mover)
    return NOT_SEEN if cells is None else weigh(cluster, cells).score


@dataclass(frozen=True, slots=True)
class Fit:
    """A refined mover with its score (prior included) and the covariance of its parameters.

    ``covariance`` is over crossing (s), speed (m/s), offset (m), N_ZONES levels, N_ZONES drifts.
    """

    mover: Mover
    score: float
    covariance: FloatArray


def refine(cluster: Cluster, mover: Mover, n_outer: int = 2, n_inner: int = 4) -> Fit | None:
    """Climb to the best mover nearby: Fisher scoring with Levenberg's damping.

    Frame weights are fixed within one outer round, so that each round climbs one smooth function.
    """
    information: FloatArray | None = None
    for _ in range(n_outer):
        cells = gather(cluster, mover)
        if cells is None:
            return None
        evidence = weigh(cluster, cells)
        weight = np.ones(cluster.n_frames)
        weight[cells.frames] = evidence.weight
        value = float(evidence.raw @ evidence.weight) + log_prior(cluster, mover)
        started, damping = mover, 1e-2
        for _ in range(n_inner):
            cells = gather(cluster, mover)
            if cells is None:
                return None
            gradient, information = _slope(cluster, mover, cells, weight)
            step = _climb(cluster, mover, gradient, information, weight, value, damping)
            if step is None:
                break
            gained, damping = step[1] - value, step[2]
            mover, value = step[0], step[1]
            if gained < 0.1:
                break
        if abs(mover.crossed_s - started.crossed_s) < 0.01:
            break
    assert information is not None  # noqa: S101 - a round either returned or made one
    score = score_of(cluster, mover) + log_prior(cluster, mover)
    return Fit(mover, score, np.linalg.pinv(information))


def _climb(
    cluster: Cluster,
    mover: Mover,
    gradient: FloatArray,
    information: FloatArray,
    weight: FloatArray,
    value: float,
    damping: float,
) -> tuple[Mover, float, float] | None:
    """One damped step that gains, or None."""
    diagonal = np.diag(np.diag(information))
    for _ in range(4):
        step = np.linalg.solve(information + damping * diagonal + 1e-9 * np.eye(len(gradient)), gradient)
        trial = _moved(cluster.site.body, mover, step)
        trial_value = _weighted_gain(cluster, trial, weight) + log_prior(cluster, trial)
        if trial_value > value:
            return trial, trial_value, max(damping / 6, 1e-4)
        damping *= 6
    return None


def _moved(body: Body, mover: Mover, step: FloatArray) -> Mover:
    """A mover after a step, kept within what one step may change."""
    level_step, drift_step = step[_N_SHAPE : _N_SHAPE + N_ZONES], step[_N_SHAPE + N_ZONES :]
    level = mover.level + np.clip(level_step, -_MAX_STEP_LEVEL, _MAX_STEP_LEVEL)
    drift = mover.drift + np.clip(drift_step, -_MAX_STEP_DRIFT, _MAX_STEP_DRIFT)
    middle = float(np.median(level))
    relative = np.clip(step[1] / mover.speed_mps, -0.15, 0.15), np.clip(step[2] / mover.offset_m, -0.3, 0.3)
    return replace(
        mover,
        crossed_s=mover.crossed_s + float(np.clip(step[0], -_MAX_STEP_S, _MAX_STEP_S)),
        speed_mps=mover.speed_mps * (1 + float(relative[0])),
        offset_m=mover.offset_m * (1 + float(relative[1])),
        level=np.clip(level, middle - body.most_level, middle + body.most_level),
        drift=np.clip(drift, -body.most_drift, body.most_drift),
    )


def _weighted_gain(cluster: Cluster, mover: Mover, weight: FloatArray) -> float:
    cells = gather(cluster, mover)
    if cells is None:
        return NOT_SEEN
    power = line_shape(cluster.site, cells.line, cells.bins) * cells.reference
    mean = 1.0 + power
    raw = np.sum(cells.whitened * (power / mean) - np.log(mean), axis=1)
    return float(raw @ weight[cells.frames])


def _slope(cluster: Cluster, mover: Mover, cells: Cells, weight: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Gradient and Fisher information of the weighted gain and the prior."""
    site = cluster.site
    point = np.array([mover.crossed_s, mover.speed_mps, mover.offset_m])
    delta = np.array([0.02, 0.01 * mover.speed_mps, 0.02 * mover.offset_m])
    variants = np.repeat(point[:, None], _N_SHAPE + 1, axis=1)
    variants[np.arange(_N_SHAPE), np.arange(1, _N_SHAPE + 1)] += delta
    line = line_of(site, mover, cluster.t_s[cells.frames], variants)
    power = line_shape(site, line, cells.bins) * cells.reference
    base, zones, centre, width = power[0], line.zones[:, 0], line.centre[0], line.width[0]
    derivative = np.empty((_N_SHAPE + 2 * N_ZONES, *base.shape))
    derivative[:_N_SHAPE] = (power[1:] - base) / delta[:, None, None]
    derivative[_N_SHAPE : _N_SHAPE + N_ZONES] = base * zones[:, :, None]
    stretch = (cells.bins - centre[:, None]) / (width * width)[:, None] * centre[:, None]
    derivative[_N_SHAPE + N_ZONES :] = (base * stretch) * zones[:, :, None]
    mean = 1.0 + base
    frame_weight = weight[cells.frames][:, None]
    flat = derivative.reshape(len(derivative), -1)
    gradient = flat @ (frame_weight * (cells.whitened - mean) / mean**2).ravel()
    information = (flat * (frame_weight / mean**2).ravel()) @ flat.T
    level = mover.level - mover.level.mean()
    levels = slice(_N_SHAPE, _N_SHAPE + N_ZONES)
    drifts = slice(_N_SHAPE + N_ZONES, None)
    centring = np.eye(N_ZONES) - 1.0 / N_ZONES
    precision = centring @ site.level_precision @ centring
    gradient[levels] -= precision @ level
    information[levels, levels] += precision
    gradient[drifts] -= site.drift_precision @ mover.drift
    information[drifts, drifts] += site.drift_precision
    gradient[2] -= np.log(mover.offset_m / site.offset_m) / (site.body.offset_log_sd**2 * mover.offset_m)
    information[2, 2] += 1.0 / (site.body.offset_log_sd * mover.offset_m) ** 2
    return gradient, information
