"""From a promising start to a mover that is settled: fitted, compared with its rival, its power set aside."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from ginnel.passages.cluster import Cluster
from ginnel.passages.explained import Explained, claim_of, heard
from ginnel.passages.fit import NOT_SEEN, Fit, refine, score_of
from ginnel.passages.mover import Mover

#: Along a straight line a crossing with this share of the best score is worth refining.
_WORTH_SLIDING = 0.1


def best_fit(cluster: Cluster, starts: list[Mover]) -> tuple[Fit, Mover] | None:
    """Refine every start; the best fit and the start that it came from."""
    best: tuple[Fit, Mover] | None = None
    for start in starts:
        fit = refine(cluster, start)
        if fit is not None and (best is None or fit.score > best[0].score):
            best = fit, start
    return best


def slide(cluster: Cluster, fit: Fit) -> Fit:
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
            return slide(cluster, slid)
    return fit


def polished(cluster: Cluster, fit: Fit) -> Fit:
    """Climb on to the very top of a fit that will be kept."""
    better = refine(cluster, fit.mover, n_outer=2, n_inner=8)
    return better if better is not None and better.score >= fit.score else fit


def settle(cluster: Cluster, fit: Fit) -> Explained:
    """Compare a fitted mover with its rival, take the better, and set its power aside."""
    claim = claim_of(cluster, fit.mover)
    rival = _rival(cluster, fit, claim > 0)
    rival_score = NOT_SEEN
    if rival is not None:
        rival_score = rival.score
        if rival.score > fit.score:
            swapped = refine(cluster, rival.mover)
            if swapped is not None and swapped.score > fit.score:
                fit, rival_score = swapped, fit.score
                claim = claim_of(cluster, fit.mover)
    explained = heard(cluster, fit, rival_score, claim)
    cluster.set_aside(claim)
    return explained


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
