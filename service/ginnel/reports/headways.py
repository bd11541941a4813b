"""Times between one passage and the next, and what they would be at random."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel import store as log
from ginnel.reports.parts import spans_us
from ginnel.stats import band_counts
from ginnel.stats.headways import HeadwaySummary, headways_s, random_share_below, summarise_headways
from ginnel.store import Store
from ginnel.words import Direction

#: Limits of the classes, seconds; headways grow roughly twofold from class to class.
CLASSES_S = (0.0, 1.0, 2.0, 3.0, 5.0, 10.0, 20.0, 30.0, 60.0, 120.0, 300.0, float("inf"))


@dataclass(frozen=True, slots=True, kw_only=True)
class HeadwayClass:
    """Headways in [low_s, high_s)."""

    low_s: float
    high_s: float
    n: int
    share: float
    random_share: float  # of a Poisson process with the same mean


@dataclass(frozen=True, slots=True, kw_only=True)
class Headways:
    """Distribution of the headways of one sensor."""

    summary: HeadwaySummary
    classes: tuple[HeadwayClass, ...]  # none without headways


def headways(
    store: Store, sensor: str, start_us: int, end_us: int, direction: Direction | None = None
) -> Headways:
    """Headways between crossings in [start_us, end_us) of one direction, or of all.

    A pair of crossings with a gap in listening between them has no headway.
    """
    crossed_us = log.passage_arrays(store, sensor, start_us, end_us).of(direction).crossed_us
    headway_s = headways_s(crossed_us, *spans_us(store, sensor, start_us, end_us))
    summary = summarise_headways(headway_s)
    if not summary.mean_s:
        return Headways(summary=summary, classes=())
    counts = band_counts(headway_s, CLASSES_S[1:-1])
    expected = np.diff(random_share_below(np.array(CLASSES_S), summary.mean_s))
    return Headways(
        summary=summary,
        classes=tuple(
            HeadwayClass(
                low_s=CLASSES_S[i],
                high_s=CLASSES_S[i + 1],
                n=int(counts[i]),
                share=float(counts[i] / summary.n),
                random_share=float(expected[i]),
            )
            for i in range(len(counts))
        ),
    )
