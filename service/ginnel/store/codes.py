"""How words become the small whole numbers of the passage table, and words again.

The one place where codes and units of the table are fixed. Codes are never reused or renumbered:
stores on disk hold them. Speeds are kept in micrometres per second, levels in thousandths of a
decibel and probabilities in millionths, all far finer than any of them is known.
"""

from __future__ import annotations

import math
from typing import Any, NamedTuple

from ginnel.words import Direction, Flag, MoverKind, Passage, Story

STORY_CODES = {Story.PASSAGE: 0, Story.TURN_BACK: 1, Story.FIDGET: 2}
DIRECTION_CODES = {Direction.UNKNOWN: 0, Direction.APPROACHING: 1, Direction.RECEDING: 2}
MOVER_CODES = {MoverKind.ON_FOOT: 1, MoverKind.ON_WHEELS: 2}
FLAG_BITS = {
    Flag.CLIPPED: 1,
    Flag.CUT: 2,
    Flag.OVERLAPPING: 4,
    Flag.LOW_CONFIDENCE: 8,
    Flag.UNSETTLED: 16,
}

_STORIES = {code: story for story, code in STORY_CODES.items()}
_DIRECTIONS = {code: direction for direction, code in DIRECTION_CODES.items()}
_MOVERS = {code: mover for mover, code in MOVER_CODES.items()}
_FLAG_SETS: dict[int, frozenset[Flag]] = {}  # bits seen so far; at most one entry a combination

MILLIONTHS = 1_000_000
THOUSANDTHS = 1_000
_INT32_MAX = 2**31 - 1


class PassageCodes(NamedTuple):
    """The columns of the passage table that come from a passage, in the table's units."""

    crossed_us: int
    started_us: int
    ended_us: int
    story: int
    direction: int
    mover: int | None
    flags: int
    direction_confidence_ppm: int | None
    speed_umps: int | None
    speed_se_umps: int | None
    snr_mdb: int | None


def encode(passage: Passage) -> PassageCodes:
    """Columns for a passage; two passages that differ by less than a unit are one row."""
    return PassageCodes(
        crossed_us=passage.crossed_us,
        started_us=passage.started_us,
        ended_us=passage.ended_us,
        story=STORY_CODES[passage.story],
        direction=DIRECTION_CODES[passage.direction],
        mover=None if passage.mover is None else MOVER_CODES[passage.mover],
        flags=sum(FLAG_BITS[flag] for flag in passage.flags),
        direction_confidence_ppm=scaled(passage.direction_confidence, MILLIONTHS),
        speed_umps=scaled(passage.speed_mps, MILLIONTHS),
        speed_se_umps=scaled(passage.speed_se_mps, MILLIONTHS),
        snr_mdb=scaled(passage.snr_db, THOUSANDTHS),
    )


def decode(row: Any) -> Passage:
    """Passage from anything that has the columns of `PassageCodes` as attributes."""
    return Passage(
        crossed_us=row.crossed_us,
        started_us=row.started_us,
        ended_us=row.ended_us,
        story=_STORIES[row.story],
        direction=_DIRECTIONS[row.direction],
        mover=None if row.mover is None else _MOVERS[row.mover],
        flags=_flag_set(row.flags),
        direction_confidence=unscaled(row.direction_confidence_ppm, MILLIONTHS),
        speed_mps=unscaled(row.speed_umps, MILLIONTHS),
        speed_se_mps=unscaled(row.speed_se_umps, MILLIONTHS),
        snr_db=unscaled(row.snr_mdb, THOUSANDTHS),
    )


def scaled(value: float | None, per_unit: float) -> int | None:
    """Whole number of small units; what is not finite or absurdly large was not measured."""
    if value is None or not math.isfinite(value) or abs(value) * per_unit > _INT32_MAX:
        return None
    return round(value * per_unit)


def unscaled(value: int | None, per_unit: float) -> float | None:
    """Number in plain units again."""
    return None if value is None else value / per_unit


def _flag_set(bits: int) -> frozenset[Flag]:
    if bits not in _FLAG_SETS:
        _FLAG_SETS[bits] = frozenset(flag for flag, bit in FLAG_BITS.items() if bits & bit)
    return _FLAG_SETS[bits]
