"""A fitted mover together with what it accounts for: where it was heard, and the power that is its own."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.passages.cluster import Cluster
from ginnel.passages.fit import Evidence, Fit, gather, weigh
from ginnel.passages.mover import SQRT_TAU, Mover
from ginnel.passages.site import NEPERS_PER_DB, ZONE_COSINE2
from ginnel.words import FloatArray

#: A mover claims cells within this many line widths, or this share of its frequency ...
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
    mean_speed_mps: float
    zone_gain: FloatArray
    claim: FloatArray

    @property
    def mover(self) -> Mover:
        """The mover as fitted."""
        return self.fit.mover


def claim_of(cluster: Cluster, mover: Mover, margin_db: float | None = None) -> FloatArray:
    """Power that a mover accounts for, in units of each cell's noise: its line and some tolerance.

    Its level is taken up to ``margin_db`` and, where its frames really are stronger, a
    little more: what exceeds that is somebody else's.
    """
    claim = np.zeros_like(cluster.whitened)
    cells = gather(cluster, mover)
    if cells is None:
        return claim
    evidence = weigh(cluster, cells)
    first, last = best_stretch(evidence.gain)
    n = np.arange(len(cells.frames))
    mine = (n >= first - 4) & (n <= last + 4)
    line, frames = cells.line, cells.frames[mine]
    reach = np.maximum(_OWN_WIDTHS * line.width, _OWN_SHARE * np.abs(line.centre)) + 1.0
    margin_db = cluster.site.body.claim_db if margin_db is None else margin_db
    level_db = margin_db + np.clip(evidence.stronger_db, 0.0, margin_db)
    density = np.exp(line.log_power + level_db * NEPERS_PER_DB) / (line.width * SQRT_TAU)
    bins = np.arange(cluster.n_bins) + cluster.site.plan.first_bin_idx
    near = np.abs(bins - line.centre[mine, None]) <= reach[mine, None]
    claim[frames] = near * density[mine, None] * cluster.noise_before(frames)
    return claim


def heard(cluster: Cluster, fit: Fit, rival_score: float, claim: FloatArray) -> Explained:
    """Where, how strongly and how fast a fitted mover was heard."""
    cells = gather(cluster, fit.mover)
    assert cells is not None  # noqa: S101 - a fit has cells
    evidence: Evidence = weigh(cluster, cells)
    first, last = best_stretch(evidence.gain)
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


def _mean_speed_mps(mover: Mover, zones: FloatArray) -> float:
    """Speed along the path averaged over the frames in which the line shows it.

    Frames count by the squared cosine of their zones: beside the sensor a line shows no speed.
    """
    weight = ZONE_COSINE2 @ zones
    drift = mover.drift @ zones
    return mover.speed_mps * (1.0 + float(weight @ drift) / max(float(weight.sum()), 1e-9))


def best_stretch(gain: FloatArray) -> tuple[int, int]:
    """First and last index of the run of frames with the greatest sum."""
    total = np.concatenate([[0.0], np.cumsum(gain)])
    rise = total - np.minimum.accumulate(total)
    last = int(np.argmax(rise))
    first = int(np.argmin(total[: last + 1]))
    return first, max(last - 1, first)
