"""Explain a cluster of activity by whole movers, one after the other.

The mover that explains most is refined and its power set aside; then the next is sought in what is
left, until nothing worth a mover remains. Its rival, the same cells told the other way round, is
fitted too: the difference of the two scores is the evidence for the direction.
"""

from __future__ import annotations

import numpy as np

from ginnel.passages.cluster import Cluster
from ginnel.passages.coarse import find_starts
from ginnel.passages.explained import Explained, claim_of
from ginnel.passages.fit import Fit, log_prior, refine, score_of
from ginnel.passages.reunite import reunite
from ginnel.passages.settle import best_fit, polished, settle, slide
from ginnel.passages.split import split
from ginnel.words import FloatArray

#: Nats that a mover must gain. A cluster offers some 10^5 distinguishable movers, so noise alone
#: brings exp(-25) * 10^5 = 1e-6 false ones a cluster.
LEAST_SCORE = 25.0
#: A mover heard together with a stronger one must gain this share of the other's score: the
#: leftovers of a strong one are of that order.
_LEAST_SHARE = 0.04
_MOST_MOVERS = 40
_N_REFINED = 3
#: A start with less than this share of the best score is not refined.
_WORTH_TRYING = 0.3
_N_ROUNDS = 2
#: To stay, a mover must stand out of the others' claims even if they are wider by this.
_WIDER_DB = 2.0


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
            best = best_fit(cluster, [mover for _, mover in promising])
            if best is not None:
                best = slide(cluster, best[0]), best[1]
            if best is None or best[0].score < _score_needed(found, best[0]):
                break
            fit, start = best
            found.append(settle(cluster, polished(cluster, fit)))
            starts = [mover for _, mover in scored if mover is not start]
        if len(found) == n_before:
            break
    if len(found) > 1:
        found = _without_leftovers(cluster, [_again(cluster, one) for one in found])
    whole = [part for one in reunite(cluster, found) for part in split(cluster, one)]
    return sorted(whole, key=lambda one: one.mover.crossed_s)


def _again(cluster: Cluster, one: Explained) -> Explained:
    """Refit a mover now that all the others are known: it may have stood in for one of them."""
    cluster.take_back(one.claim)
    fit = refine(cluster, one.mover)
    if fit is None or fit.score < LEAST_SCORE:
        fit = one.fit
    return settle(cluster, fit)


def _without_leftovers(cluster: Cluster, found: list[Explained]) -> list[Explained]:
    """Drop movers that are within what stronger ones may well have left unexplained."""
    kept: list[Explained] = []
    cluster.take_back(_sum(cluster, [one.claim for one in found]))
    for one in sorted(found, key=lambda mover: -mover.fit.score):
        margin_db = cluster.site.body.claim_db + _WIDER_DB
        wide = _sum(cluster, [claim_of(cluster, other.mover, margin_db) for other in kept])
        cluster.set_aside(wide)
        score = score_of(cluster, one.mover) + log_prior(cluster, one.mover)
        cluster.take_back(wide)
        if score >= _score_needed(kept, one.fit):
            kept.append(one)
    cluster.set_aside(_sum(cluster, [one.claim for one in kept]))
    return kept


def _sum(cluster: Cluster, claims: list[FloatArray]) -> FloatArray:
    return sum(claims, np.zeros_like(cluster.whitened))


def _score_needed(found: list[Explained], fit: Fit) -> float:
    heard_s = 20.0 / max(fit.mover.speed_mps, 1.0)
    beside = [one.fit.score for one in found if abs(one.mover.crossed_s - fit.mover.crossed_s) < heard_s]
    return max(LEAST_SCORE, _LEAST_SHARE * max(beside, default=0.0))
