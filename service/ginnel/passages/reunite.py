"""Gives straight pieces of line without a bend back to the mover whose line they continue.

A driver who brakes or speeds up leaves the line of constant speed, and the far part may have been
found first, with a crossing that nobody made.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ginnel.passages.cluster import Cluster
from ginnel.passages.explained import Explained
from ginnel.passages.settle import best_fit, polished, settle

#: Two pieces of one line meet within this time and this relative difference of speed, and together
#: are worth this share of the better one.
_JOINT_S, _JOINT_SPEED, _JOINT_SHARE = 1.5, 0.2, 0.8


def reunite(cluster: Cluster, found: list[Explained]) -> list[Explained]:
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


def _refit_both(cluster: Cluster, one: Explained, piece: Explained) -> Explained | None:
    """One mover for the cells of two, if it is worth about as much as the better of them."""
    cluster.take_back(one.claim + piece.claim)
    starts = [
        replace(one.mover, speed_mps=which.mean_speed_mps, drift=np.zeros_like(one.mover.drift))
        for which in (piece, one)
    ]
    best = best_fit(cluster, [*starts, one.mover])
    if best is None or best[0].score < _JOINT_SHARE * max(one.fit.score, piece.fit.score):
        cluster.set_aside(one.claim + piece.claim)
        return None
    return settle(cluster, polished(cluster, best[0]))


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
