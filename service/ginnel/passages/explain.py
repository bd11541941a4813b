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
from ginnel.passages.fit import NOT_SEEN, Evidence, Fit, gather, refine, score_of, weigh
from ginnel.passages.mover import Mover
from ginnel.words import FloatArray

#: Nats that a mover must gain. A cluster offers some 10^5 distinguishable movers, so noise alone
#: brings exp(-25) * 10^5 = 1e-6 false ones a cluster.
LEAST_SCORE = 25.0
#: A mover heard together with a stronger one must gain this share of the other's score: the
#: leftovers of a strong one are of that order.
_LEAST_SHARE = 0.04
_MOST_MOVERS = 40
_N_REFINED = 4
_N_ROUNDS = 2
#: A mover owns the cells within this many line widths, or this share of its frequency.
_OWN_WIDTHS, _OWN_SHARE = 2.5, 0.12


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
    zone_gain: FloatArray

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
            best = _best_fit(cluster, [mover for _, mover in scored[:_N_REFINED]])
            if best is None or best[0].score < _score_needed(found, best[0]):
                break
            fit, start = best
            found.append(_settle(cluster, fit))
            starts = [mover for _, mover in scored if mover is not start]
        if len(found) == n_before:
            break
    return sorted(found, key=lambda one: one.mover.crossed_s)


def _best_fit(cluster: Cluster, starts: list[Mover]) -> tuple[Fit, Mover] | None:
    best: tuple[Fit, Mover] | None = None
    for start in starts:
        fit = refine(cluster, start)
        if fit is not None and (best is None or fit.score > best[0].score):
            best = fit, start
    return best


def _score_needed(found: list[Explained], fit: Fit) -> float:
    heard_s = 20.0 / max(fit.mover.speed_mps, 1.0)
    beside = [one.fit.score for one in found if abs(one.mover.crossed_s - fit.mover.crossed_s) < heard_s]
    return max(LEAST_SCORE, _LEAST_SHARE * max(beside, default=0.0))


def _settle(cluster: Cluster, fit: Fit) -> Explained:
    """Compare a fitted mover with its rival, take the better, and give it its cells."""
    own = _own_cells(cluster, fit.mover)
    rival = _rival(cluster, fit, own)
    rival_score = NOT_SEEN
    if rival is not None:
        rival_score = rival.score
        if rival.score > fit.score:
            swapped = refine(cluster, rival.mover)
            if swapped is not None and swapped.score > fit.score:
                fit, rival_score = swapped, fit.score
                own = _own_cells(cluster, fit.mover)
    explained = _heard(cluster, fit, rival_score)
    cluster.free &= ~own
    return explained


def _own_cells(cluster: Cluster, mover: Mover) -> NDArray[np.bool_]:
    own = np.zeros_like(cluster.free)
    cells = gather(cluster, mover)
    if cells is None:
        return own
    evidence = weigh(cluster, cells)
    first, last = _best_stretch(evidence.gain)
    n = np.arange(len(cells.frames))
    mine = (n >= first - 4) & (n <= last + 4) & (evidence.weight > 0)
    line = cells.line
    reach = np.maximum(_OWN_WIDTHS * line.width, _OWN_SHARE * np.abs(line.centre)) + 1.0
    bins = np.arange(cluster.n_bins) + cluster.site.plan.first_bin_idx
    own[cells.frames[mine]] = np.abs(bins - line.centre[mine, None]) <= reach[mine, None]
    return own


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


def _heard(cluster: Cluster, fit: Fit, rival_score: float) -> Explained:
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
        snr_db=float(10 * np.log10(max(evidence.power.max(), 1e-3))),
        zone_gain=cells.line.zones @ evidence.gain,
    )


def _best_stretch(gain: FloatArray) -> tuple[int, int]:
    """First and last index of the run of frames with the greatest sum."""
    total = np.concatenate([[0.0], np.cumsum(gain)])
    rise = total - np.minimum.accumulate(total)
    last = int(np.argmax(rise))
    first = int(np.argmin(total[: last + 1]))
    return first, max(last - 1, first)
