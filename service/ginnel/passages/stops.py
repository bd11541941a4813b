"""Someone who stops in the beam and goes on: two legs, one passage.

Braking looks like the bend beside the sensor, so each leg alone looks like a passage. What gives them
away is that the far end of one is abrupt: who approaches comes up out of nothing, who leaves vanishes
in the middle of the beam, and a like mover takes over after a pause.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from ginnel.passages.explain import LEAST_SCORE
from ginnel.passages.explained import Explained
from ginnel.passages.site import NEPERS_PER_DB, Site
from ginnel.words import Passage

#: One who stops goes on within this time, and at much the same pace (natural log).
LONGEST_STOP_S, _SAME_PACE = 12.0, 0.3
#: A far end is abrupt if silence beyond costs a leg this share of its score.
_ABRUPT_SHARE = 0.03
#: Level beside the sensor of who does not pass: simulated turns gave 3.5 to 7 dB, people who met
#: beside the sensor -5 to 2. A leg far from the sensor is fainter than one that passes by this.
STAYS_DB, _FAINTER_DB = 2.8, 6.0


@dataclass(frozen=True, slots=True)
class Leg:
    """What is kept of a mover once it has been told: enough to know its continuation."""

    sign: int
    speed_mps: float
    first_frame: int  # of the span, as ``last_frame``
    last_frame: int
    is_abrupt: bool  # begins or ends far from the sensor where it should still be heard
    size_db: float
    near_excess_db: float


def leg_of(first_frame_idx: int, one: Explained) -> Leg:
    """Keep the leg of a mover of a stretch that begins with a frame of the span."""
    return Leg(
        one.mover.sign,
        one.mean_speed_mps,
        first_frame_idx + one.first_frame,
        first_frame_idx + one.last_frame,
        ends_abruptly(one),
        float(np.median(one.mover.level[1:3])) / float(NEPERS_PER_DB),
        near_excess_db(one),
    )


def stopped_leg(site: Site, earlier: Sequence[Leg], later: Leg) -> int | None:
    """Index of the leg that another one is the rest of, None if of none.

    Who comes and goes in between has not stopped: nobody else's way back lies between the two.
    """
    for i, leg in enumerate(earlier):
        comes_back = any(
            other.sign != later.sign
            and other.first_frame < later.first_frame
            and other.last_frame > leg.last_frame
            for other in earlier
        )
        if _continues(site, leg, later) and not comes_back:
            return i
    return None


def _continues(site: Site, earlier: Leg, later: Leg) -> bool:
    """Whether a leg may be the rest of one who stopped: braking looks like a bend, so both seem to pass.

    Who approaches, stops and goes on comes up out of nothing; who leaves vanishes and comes up again.
    """
    pause_s = (later.first_frame - earlier.last_frame) / site.frame_rate_hz
    passing, stopping = (later, earlier) if later.sign > 0 else (earlier, later)
    stays = stopping.near_excess_db > STAYS_DB or stopping.size_db < passing.size_db - _FAINTER_DB
    return (
        site.body.may_turn
        and earlier.sign == later.sign
        and 0.0 <= pause_s < LONGEST_STOP_S
        and passing.is_abrupt
        and stays
        and abs(math.log(earlier.speed_mps / later.speed_mps)) < _SAME_PACE
    )


def may_have_stopped(site: Site, leg: Leg) -> bool:
    """Whether who approached may have braked in full view instead of passing: the crossing is yet to come."""
    return site.body.may_turn and leg.sign > 0 and leg.near_excess_db > STAYS_DB


def near_excess_db(one: Explained) -> float:
    """How much higher the level beside the sensor is than further out, against the mounting's curve.

    Braking looks like the bend beside the sensor, but at the level of where it happens; who passes
    leaves the beam there.
    """
    return float(one.mover.level[0] - np.median(one.mover.level[1:3])) / float(NEPERS_PER_DB)


def ends_abruptly(one: Explained) -> bool:
    """Whether a leg ends far away where it should still be heard: it did not fade, it turned."""
    return one.lost_far < -max(LEAST_SCORE, _ABRUPT_SHARE * one.fit.score)


@dataclass(frozen=True, slots=True)
class Held:
    """A passage that may yet turn out to be the leg of one who stopped."""

    passage: Passage
    leg: Leg


def joined(earlier: Held, later: Held) -> Held:
    """Make one of two legs: who approaches crosses in the last one, who leaves in the first."""
    main, leg = (later, later.leg) if later.leg.sign > 0 else (earlier, earlier.leg)
    passage = replace(
        main.passage,
        started_us=min(earlier.passage.started_us, later.passage.started_us),
        ended_us=max(earlier.passage.ended_us, later.passage.ended_us),
        flags=earlier.passage.flags | later.passage.flags,
    )
    leg = replace(leg, first_frame=earlier.leg.first_frame, last_frame=later.leg.last_frame)
    return Held(passage, leg)
