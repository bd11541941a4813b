"""What is said of one passage: direction with confidence, speed with standard error, level."""

from __future__ import annotations

import math
from dataclasses import dataclass

from ginnel.passages.explained import Explained
from ginnel.passages.pace import Pace
from ginnel.words import Direction

#: Difference of scores, nats, that makes the odds for a direction e to 1.
#: tuned on the simulated corridors of tests/accuracy, 2026-12-01
_DIRECTION_NATS = 25.0
#: Below this the direction is not told.
_LEAST_CONFIDENCE = 0.6
#: Speed error that the model itself makes, relative: steps, drift and where the torso is.
_MODEL_SPEED_ERROR = 0.02


@dataclass(frozen=True, slots=True)
class Measured:
    """Direction, confidence (None where unknown), speed and its standard error, m/s."""

    direction: Direction
    confidence: float | None
    speed_mps: float
    speed_se_mps: float


def measure(one: Explained, pace: Pace) -> Measured:
    """Tell direction, by a fitted mover and its rival, and speed."""
    margin = (one.fit.score - one.rival_score) / _DIRECTION_NATS
    confidence = 1.0 / (1.0 + math.exp(-min(max(margin, -30.0), 30.0)))
    direction = Direction.APPROACHING if one.mover.sign > 0 else Direction.RECEDING
    if confidence < _LEAST_CONFIDENCE:
        direction = Direction.UNKNOWN
    return Measured(
        direction=direction,
        confidence=None if direction is Direction.UNKNOWN else min(confidence, 0.9999),
        speed_mps=pace.speed_mps,
        speed_se_mps=math.hypot(pace.se_mps, _MODEL_SPEED_ERROR * pace.speed_mps),
    )
