"""Explain a cluster of activity by whole movers, one after the other.

The mover that explains most is refined and given its cells; then the next is sought in what is
left, until nothing worth a mover remains. Its rival, the same cells told the other way round, is
fitted too: the difference of the two scores is the evidence for the direction.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from ginnel.passages.cluster import Cluster
from ginnel.passages.coarse import find_starts
from ginnel.passages.fit import NOT_SEEN, Evidence, Fit, gather, log_prior, refine, score_of, weigh
from ginnel.passages.mover import Mover
from ginnel.passages.site import NEPERS_PER_DB, ZONE_COSINE2
from ginnel.words import FloatArray

#: Nats that a mover must gain. A cluster offers some 10^5 distinguishable movers, so noise alone
#: brings exp(-25) * 10^5 = 1e-6 false ones a cluster.
LEAST_SCORE = 25.0
#: A mover heard together with a stronger one must gain this share of the other's score: the
#: leftovers of a strong one are of that order.
_LEAST_SHARE = 0.04
_MOST_MOVERS = 40
_N_REFINED = 3
#: A start with less than this share of the best score is not refined; along a straight line, less will do.
_WORTH_TRYING, _WORTH_SLIDING = 0.3, 0.1
_N_ROUNDS = 2
#: A mover claims cells within this many line widths, or this share of its frequency ...
_OWN_WIDTHS, _OWN_SHARE = 2.5, 0.12
#: ... and to stay, a mover must stand out of the others' claims even if they are wider by this.
_WIDER_DB = 2.0
_SQRT_TAU = float(np.sqrt(2 * np.pi))
#: Two pieces of one line meet within this time and this relative difference of speed.
_JOINT_S, _JOINT_SPEED = 1.5, 0.2
_JOINT_SHARE = 0.8


@dataclass(frozen=True, slots=True)
class Explained:
    """One fitted mover, the frames in which it was heard, and its rival.

    ``first_frame``, ``last_frame``: within the cluster; ``near_m``, ``far_m``: the stretch of path
    on which it was heard; ``rival_score``: of the best mover the other way round on the same cells.
    """

    fit: Fit
    rival_score: float
    first_frame: int
    last_frame: int
    near_m: float
    far_m: float
    lost_near: float
    lost_far: float
    snr_db: float
    mean_speed_mps: float
    zone_gain: FloatArray
    claim: FloatArray

    @property
    def mover(self) -> Mover:
        """The mover as fitted."""
        return self.fit.mover


def explain(cluster: Cluster) -> list[Explained]:
    """All movers of a cluster, in order of their crossing."""
    found: list[Explained] = []
    for _ in range(_N_ROUNDS):
        n_before = len(found)
        starts = [mover for _, mover in find_starts(cluster)]
        while starts and len(found) < _MOST_MOVERS:
            scored = [(score_of(cluster, mover), mover) for mover in starts]
            scored = sorted(
                ((score, mover) for score, mover in scored if score > 5.0), key=lambda pair: -pair[0]
            )
            promising = [one for one in scored[:_N_REFINED] if one[0] > _WORTH_TRYING * scored[0][0]]
            best = _best_fit(cluster, [mover for _, mover in promising])
            if best is not None:
                best = _slide(cluster, best[0]), best[1]
            if best is None or best[0].score < _score_needed(found, best[0]):
                break
            fit, start = best
            found.append(_settle(cluster, _polished(cluster, fit)))
            starts = [mover for _, mover in scored if mover is not start]
        if len(found) == n_before:
            break
    if len(found) > 1:
        found = _without_leftovers(cluster, [_again(cluster, one) for one in found])
    return sorted(_reunite(cluster, found), key=lambda one: one.mover.crossed_s)


def _again(cluster: Cluster, one: Explained) -> Explained:
    """Refit a mover now that all the others are known: it may have stood in for one of them."""
    cluster.take_back(one.claim)
    fit = refine(cluster, one.mover)
    if fit is None or fit.score < LEAST_SCORE:
        fit = one.fit
    return _settle(cluster, fit)


def _without_leftovers(cluster: Cluster, found: list[Explained]) -> list[Explained]:
    """Drop movers that are within what stronger ones may well have left unexplained."""
    kept: list[Explained] = []
    cluster.take_back(_sum(cluster, [one.claim for one in found]))
    for one in sorted(found, key=lambda mover: -mover.fit.score):
        wide = _sum(
            cluster, [_claim(cluster, other.mover, cluster.site.body.claim_db + _WIDER_DB) for other in kept]
        )
        cluster.set_aside(wide)
        score = score_of(cluster, one.mover) + log_prior(cluster, one.mover)
        cluster.take_back(wide)
        if score >= _score_needed(kept, one.fit):
            kept.append(one)
    cluster.set_aside(_sum(cluster, [one.claim for one in kept]))
    return kept


def _sum(cluster: Cluster, claims: list[FloatArray]) -> FloatArray:
    return sum(claims, np.zeros_like(cluster.whitened))


def _reunite(cluster: Cluster, found: list[Explained]) -> list[Explained]:
    """Give straight pieces of line without a bend back to the mover whose line they continue.

    A driver who brakes or speeds up leaves the line of constant speed, and the far part may have
    been found first, with a crossing that nobody made.
    """
    site = cluster.site
    bend_m = site.body.bend_ratio * site.offset_m
    whole = [one for one in found if one.near_m <= bend_m]
    for piece in sorted((one for one in found if one.near_m > bend_m), key=lambda one: -one.fit.score):
        partner = min(
            (one for one in whole if _continues(site.frame_rate_hz, site.is_iq, one, piece)),
            key=lambda one: abs(one.mover.crossed_s - piece.mover.crossed_s),
            default=None,
        )
        joined = None if partner is None else _refit_both(cluster, partner, piece)
        if partner is None:
            whole.append(piece)
        else:
            whole[whole.index(partner)] = joined or _strung_together(partner, piece)
    return whole


def _continues(frame_rate_hz: float, is_iq: bool, one: Explained, piece: Explained) -> bool:
    """Whether a piece begins where a mover's line ends, far from the sensor, at its speed.

    A straight line in one channel has no direction of its own.
    """
    if is_iq and one.mover.sign != piece.mover.sign:
        return False
    if one.mover.sign < 0:
        apart_s = (piece.first_frame - one.last_frame) / frame_rate_hz
        goes_further = piece.last_frame > one.last_frame
    else:
        apart_s = (one.first_frame - piece.last_frame) / frame_rate_hz
        goes_further = piece.first_frame < one.first_frame
    speeds = [one.mean_speed_mps, piece.mean_speed_mps]
    return goes_further and apart_s < _JOINT_S and abs(np.log(speeds[0] / speeds[1])) < _JOINT_SPEED


def _mean_speed_mps(mover: Mover, zones: FloatArray) -> float:
    """Speed along the path averaged over the frames in which the line shows it.

    Frames count by the squared cosine of their zones: beside the sensor a line shows no speed.
    """
    weight = ZONE_COSINE2 @ zones
    drift = mover.drift @ zones
    return mover.speed_mps * (1.0 + float(weight @ drift) / max(float(weight.sum()), 1e-9))


def _refit_both(cluster: Cluster, one: Explained, piece: Explained) -> Explained | None:
    """One mover for the cells of two, if it is worth about as much as the better of them."""
    cluster.take_back(one.claim + piece.claim)
    starts = [
        replace(one.mover, speed_mps=which.mean_speed_mps, drift=np.zeros_like(one.mover.drift))
        for which in (piece, one)
    ]
    best = _best_fit(cluster, [*starts, one.mover])
    if best is None or best[0].score < _JOINT_SHARE * max(one.fit.score, piece.fit.score):
        cluster.set_aside(one.claim + piece.claim)
        return None
    return _settle(cluster, _polished(cluster, best[0]))


def _strung_together(one: Explained, piece: Explained) -> Explained:
    """A mover and the far piece of its line where no single curve fits both."""
    n_frames = [1 + part.last_frame - part.first_frame for part in (one, piece)]
    speed_mps = (n_frames[0] * one.mean_speed_mps + n_frames[1] * piece.mean_speed_mps) / sum(n_frames)
    return replace(
        one,
        fit=replace(one.fit, score=max(one.fit.score, piece.fit.score)),
        mean_speed_mps=speed_mps,
        first_frame=min(one.first_frame, piece.first_frame),
        last_frame=max(one.last_frame, piece.last_frame),
        far_m=max(one.far_m, piece.far_m),
        lost_far=piece.lost_far,
        claim=one.claim + piece.claim,
    )


def _best_fit(cluster: Cluster, starts: list[Mover]) -> tuple[Fit, Mover] | None:
    best: tuple[Fit, Mover] | None = None
    for start in starts:
        fit = refine(cluster, start)
        if fit is not None and (best is None or fit.score > best[0].score):
            best = fit, start
    return best


def _slide(cluster: Cluster, fit: Fit) -> Fit:
    """Try crossings further along the straight line, where the bend that belongs to it may lie.

    Far from the sensor a line is straight and fits a crossing nearly anywhere.
    """
    offset_s = cluster.site.offset_m / fit.mover.speed_mps
    for n_offsets in (1.0, 2.0, 4.0):
        crossed_s = fit.mover.crossed_s + fit.mover.sign * n_offsets * offset_s
        start = replace(
            fit.mover,
            crossed_s=crossed_s,
            offset_m=cluster.site.offset_m,
            drift=np.zeros_like(fit.mover.drift),
        )
        if score_of(cluster, start) < _WORTH_SLIDING * fit.score:
            continue
        slid = refine(cluster, start)
        if slid is not None and slid.score > fit.score:
            return _slide(cluster, slid)
    return fit


def _polished(cluster: Cluster, fit: Fit) -> Fit:
    better = refine(cluster, fit.mover, n_outer=2, n_inner=8)
    return better if better is not None and better.score >= fit.score else fit


def _score_needed(found: list[Explained], fit: Fit) -> float:
    heard_s = 20.0 / max(fit.mover.speed_mps, 1.0)
    beside = [one.fit.score for one in found if abs(one.mover.crossed_s - fit.mover.crossed_s) < heard_s]
    return max(LEAST_SCORE, _LEAST_SHARE * max(beside, default=0.0))


def _settle(cluster: Cluster, fit: Fit) -> Explained:
    """Compare a fitted mover with its rival, take the better, and set its power aside."""
    claim = _claim(cluster, fit.mover)
    rival = _rival(cluster, fit, claim > 0)
    rival_score = NOT_SEEN
    if rival is not None:
        rival_score = rival.score
        if rival.score > fit.score:
            swapped = refine(cluster, rival.mover)
            if swapped is not None and swapped.score > fit.score:
                fit, rival_score = swapped, fit.score
                claim = _claim(cluster, fit.mover)
    explained = _heard(cluster, fit, rival_score, claim)
    cluster.set_aside(claim)
    return explained


def _claim(cluster: Cluster, mover: Mover, margin_db: float | None = None) -> FloatArray:
    """Power that a mover accounts for, in units of each cell's noise: its line and some tolerance.

    Its level is taken up to ``margin_db`` and, where its frames really are stronger, a
    little more: what exceeds that is somebody else's.
    """
    claim = np.zeros_like(cluster.whitened)
    cells = gather(cluster, mover)
    if cells is None:
        return claim
    evidence = weigh(cluster, cells)
    first, last = _best_stretch(evidence.gain)
    n = np.arange(len(cells.frames))
    mine = (n >= first - 4) & (n <= last + 4)
    line, frames = cells.line, cells.frames[mine]
    reach = np.maximum(_OWN_WIDTHS * line.width, _OWN_SHARE * np.abs(line.centre)) + 1.0
    margin_db = cluster.site.body.claim_db if margin_db is None else margin_db
    level_db = margin_db + np.clip(evidence.stronger_db, 0.0, margin_db)
    density = np.exp(line.log_power + level_db * NEPERS_PER_DB) / (line.width * _SQRT_TAU)
    bins = np.arange(cluster.n_bins) + cluster.site.plan.first_bin_idx
    near = np.abs(bins - line.centre[mine, None]) <= reach[mine, None]
    claim[frames] = near * density[mine, None] * cluster.noise_before(frames)
    return claim


def _rival(cluster: Cluster, fit: Fit, own: NDArray[np.bool_]) -> Fit | None:
    """The best mover the other way round, if only the first one's cells held energy."""
    first, last = np.nonzero(own.any(axis=1))[0][[0, -1]] if own.any() else (0, 0)
    mover = fit.mover
    ends_s = cluster.t_s[first], cluster.t_s[last]
    whitened = cluster.whitened
    cluster.whitened = np.where(own, whitened, np.minimum(whitened, 1.0))
    try:
        edge_s = float(ends_s[0] if mover.sign > 0 else ends_s[1])
        starts = [
            replace(mover, sign=-mover.sign, crossed_s=edge_s + shift_s) for shift_s in (-1.0, 0.0, 1.0)
        ]
        starts.append(replace(mover, sign=-mover.sign))
        scored = sorted(((score_of(cluster, start), i) for i, start in enumerate(starts)), reverse=True)
        fits = [refine(cluster, starts[i]) for _, i in scored[:2]]
        kept = [one for one in fits if one is not None]
        return max(kept, key=lambda one: one.score, default=None)
    finally:
        cluster.whitened = whitened


def _heard(cluster: Cluster, fit: Fit, rival_score: float, claim: FloatArray) -> Explained:
    cells = gather(cluster, fit.mover)
    assert cells is not None  # noqa: S101 - a fit has cells
    evidence: Evidence = weigh(cluster, cells)
    first, last = _best_stretch(evidence.gain)
    x = np.abs(cells.line.x_m[first : last + 1])
    before, after = float(evidence.gain[:first].sum()), float(evidence.gain[last + 1 :].sum())
    lost_near, lost_far = (after, before) if fit.mover.sign > 0 else (before, after)
    return Explained(
        fit=fit,
        rival_score=rival_score,
        first_frame=int(cells.frames[first]),
        last_frame=int(cells.frames[last]),
        near_m=float(x.min()),
        far_m=float(x.max()),
        lost_near=lost_near,
        lost_far=lost_far,
        mean_speed_mps=_mean_speed_mps(fit.mover, cells.line.zones[:, first : last + 1]),
        snr_db=float(10 * np.log10(max(evidence.power.max(), 1e-3))),
        zone_gain=cells.line.zones @ evidence.gain,
        claim=claim,
    )


def _best_stretch(gain: FloatArray) -> tuple[int, int]:
    """First and last index of the run of frames with the greatest sum."""
    total = np.concatenate([[0.0], np.cumsum(gain)])
    rise = total - np.minimum.accumulate(total)
    last = int(np.argmax(rise))
    first = int(np.argmin(total[: last + 1]))
    return first, max(last - 1, first)
