"""One scene captured at several sample rates: the passages must be the same.

The noise has one density at all rates, so that nothing but the rate differs; it is drawn anew, since samples
of one rate are no subset of another's.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from tests.accuracy import places
from tests.accuracy.cases import Case
from tests.accuracy.scoring import find, match

from ginnel.words import US_PER_S, Direction, Passage, Story

RATES_HZ = (2000.0, 8000.0, 44100.0, 96000.0)
WITHIN_S = 0.15
WITHIN_SPEED = 0.02
_SNR_DB = 30.0  # nothing on the edge of being heard

_HEAD = "| capture | passages | those of 2 kHz | other direction | crossing off, s | speed off, % | |"
_RULE = "| --- | --- | --- | --- | --- | --- | --- |"


def at_rate(seed: int, rate_hz: float) -> Case:
    """Ten walkers, some of whom cross each other, at a rate."""
    rng = np.random.default_rng([seed, 15])
    movers, until_s = places.one_by_one(rng, 8, alone_s=14.0)
    way = Direction.RECEDING
    movers += [places.walks(rng, at_s, direction=way) for at_s in (until_s - 40.0, until_s - 12.0)]
    case = places.corridor_case(movers, until_s, seed=seed, peak_snr_db=_SNR_DB)
    return replace(case, scene=replace(case.scene, sample_rate_hz=rate_hz))


def passages_at(rate_hz: float, seed: int = 0) -> list[Passage]:
    """What is counted of the scene at a rate."""
    return [one for one in find(at_rate(seed, rate_hz)) if one.story is Story.PASSAGE]


def table(found: list[list[Passage]]) -> str:
    """The passages of each rate beside those of the first."""
    first = found[0]
    lines = [_HEAD, _RULE]
    for rate_hz, passages in zip(RATES_HZ, found, strict=True):
        pairs = same(first, passages)
        wrong = sum(one.direction is not other.direction for one, other in pairs)
        apart_s = max(
            (abs(one.crossed_us - other.crossed_us) / US_PER_S for one, other in pairs), default=0.0
        )
        off = max((abs(_speed(other) / _speed(one) - 1.0) for one, other in pairs), default=0.0)
        met = (
            0 < len(pairs) == len(first) == len(passages)
            and not wrong
            and apart_s <= WITHIN_S
            and off <= WITHIN_SPEED
        )
        lines.append(
            f"| {rate_hz / 1000:g} kHz | {len(passages)} | {len(pairs)} of {len(first)} | {wrong}"
            f" | {apart_s:.2f} (<= {WITHIN_S:g}) | {100 * off:.1f} (<= {100 * WITHIN_SPEED:g})"
            f" | {'met' if met else '**missed**'} |"
        )
    return "\n".join(lines)


def same(first: list[Passage], other: list[Passage]) -> list[tuple[Passage, Passage]]:
    """Passages of two captures that are one."""
    at_s = [np.array([one.crossed_us / US_PER_S for one in passages]) for passages in (first, other)]
    ways = [[one.direction for one in passages] for passages in (first, other)]
    partner = match(at_s[0], at_s[1], ways[0], ways[1])
    return [(first[one], other[two]) for one, two in sorted(partner.items())]


def _speed(passage: Passage) -> float:
    return passage.speed_mps or np.nan
