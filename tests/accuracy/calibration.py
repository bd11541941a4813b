"""Whether the chain knows how sure it is: confidence of directions, errors of speeds, movers named."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from tests.accuracy.board import share
from tests.accuracy.scoring import Pair

from ginnel.words import Direction, MoverKind

#: Edges of the bins of confidence, closed below.
BINS = (0.5, 0.7, 0.85, 0.95, 0.99, 1.0000001)
NAMED_GOAL = 0.95
#: A normal error lies within one, two and three standard errors in so many cases.
NORMAL = ((1.0, 0.683), (2.0, 0.954), (3.0, 0.997))
_GOAL_TWO = (0.90, 0.98)
_BAR = 40  # characters for 100 %


@dataclass(frozen=True)
class Bin:
    """Passages of like confidence: how many, what they claimed on average, how many were right."""

    low: float
    high: float
    n: int
    claimed: float
    right: int


def direction_bins(pairs: Sequence[Pair]) -> list[Bin]:
    """Directions by what was claimed of them; unknown ones claim nothing."""
    called = [pair for pair in pairs if pair.found.direction is not Direction.UNKNOWN]
    claimed = np.array([pair.found.direction_confidence or np.nan for pair in called])
    right = np.array([pair.found.direction is pair.true_direction for pair in called], dtype=bool)
    bins = []
    for low, high in pairwise(BINS):
        inside = (claimed >= low) & (claimed < high)
        mean = float(claimed[inside].mean()) if inside.any() else np.nan
        bins.append(Bin(low, min(high, 1.0), int(inside.sum()), mean, int(right[inside].sum())))
    return bins


def standard_scores(pairs: Sequence[Pair]) -> np.ndarray[tuple[int], np.dtype[np.float64]]:
    """Errors of speeds over their standard errors."""
    return np.array(
        [
            (pair.found.speed_mps - pair.true_speed_mps) / pair.found.speed_se_mps
            for pair in pairs
            if pair.found.speed_mps is not None and pair.found.speed_se_mps
        ]
    )


def report(groups: Sequence[tuple[str, Sequence[Pair]]]) -> str:
    """All three, for each named group of pairs, in Markdown."""
    return "\n\n".join(part(groups) for part in (_directions, _speeds, _movers))


def _directions(groups: Sequence[tuple[str, Sequence[Pair]]]) -> str:
    lines = [
        "Direction: of those called with a confidence, the share that is right. 0.85 to 0.95 is the goal for"
        " those called with about 0.9.",
        "",
        "| scenes | confidence | passages | claimed | right | |",
        "| --- | --- | --- | --- | --- | --- |",
    ]
    for name, pairs in groups:
        for one in direction_bins(pairs):
            if one.n:
                right = one.right / one.n
                lines.append(
                    f"| {name} | {one.low:.2f} to {one.high:.2f} | {one.n} | {one.claimed:.3f}"
                    f" | {right:.3f} | `{_bar(right, one.claimed)}` |"
                )
    return "\n".join(lines)


def _bar(right: float, claimed: float) -> str:
    """A bar as long as what was right, with a mark at what was claimed."""
    bar = list(("#" * round(_BAR * right)).ljust(_BAR + 1, "."))
    bar[round(_BAR * claimed)] = "|"
    return "".join(bar)


def _speeds(groups: Sequence[tuple[str, Sequence[Pair]]]) -> str:
    low, high = _GOAL_TWO
    lines = [
        f"Speed: the share of errors within so many standard errors; the goal for two is {low} to {high}.",
        "",
        "| scenes | passages | within 1 (normal: 0.683) | within 2 (0.954) | within 3 (0.997) | |",
        "| --- | --- | --- | --- | --- | --- |",
    ]
    for name, pairs in groups:
        scores = np.abs(standard_scores(pairs))
        if len(scores):
            within = [float((scores <= width).mean()) for width, _ in NORMAL]
            mark = "met" if low <= within[1] <= high else "**missed**"
            figures = " | ".join(f"{value:.3f}" for value in within)
            lines.append(f"| {name} | {len(scores)} | {figures} | {mark} |")
    return "\n".join(lines)


def _movers(groups: Sequence[tuple[str, Sequence[Pair]]]) -> str:
    lines = [
        "Mover: of those that were named, the share named right, and how many were left blank.",
        "",
        "| scenes | truth | passages | named | right |",
        "| --- | --- | --- | --- | --- |",
    ]
    for name, pairs in groups:
        for kind in MoverKind:
            own = [pair for pair in pairs if pair.true_kind is kind]
            named = [pair for pair in own if pair.found.mover is not None]
            if own:
                right = sum(pair.found.mover is kind for pair in named)
                verdict = share(right, len(named), NAMED_GOAL if named else None)
                lines.append(f"| {name} | {kind} | {len(own)} | {len(named)} | {verdict} |")
    return "\n".join(lines)
