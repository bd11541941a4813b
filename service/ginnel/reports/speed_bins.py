"""Speeds counted in bins of any width, for records that others have laid down."""

from __future__ import annotations

from contextlib import closing
from dataclasses import dataclass

import numpy as np

from ginnel import store as log
from ginnel.stats.counts import IntArray
from ginnel.store import Store
from ginnel.words import Direction, FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class SpeedBins:
    """Passages of one direction by interval and bin; those of unknown speed are in the total only."""

    binned: IntArray  # shape (intervals, bins)
    total: IntArray  # shape (intervals,)


def speed_bins(
    store: Store, sensor: str, edges_us: IntArray, uppers_mps: FloatArray
) -> dict[Direction, SpeedBins]:
    """Count the passages of each interval in bins that are closed above, the last without end.

    Parameters
    ----------
    edges_us : ascending, shape (n + 1,)
    uppers_mps : upper ends of all bins but the last, ascending, shape (m,)
    """
    n, n_bins = len(edges_us) - 1, len(uppers_mps) + 1
    binned = np.zeros((len(Direction), n, n_bins + 1), np.int64)  # the last bin: speed unknown
    places = {direction.value: place for place, direction in enumerate(Direction)}
    with closing(log.iter_passage_columns(store, sensor, int(edges_us[0]), int(edges_us[-1]))) as tables:
        for passages in tables:
            place_of = np.array([places[word] for word in passages.direction.words])
            interval = np.searchsorted(edges_us, passages.crossed_us, side="right") - 1
            bin_idx = np.searchsorted(uppers_mps, passages.speed_mps, side="left")
            bin_idx[np.isnan(passages.speed_mps)] = n_bins
            np.add.at(binned, (place_of[passages.direction.codes], interval, bin_idx), 1)
    return {
        direction: SpeedBins(binned=binned[place, :, :n_bins], total=binned[place].sum(axis=1))
        for place, direction in enumerate(Direction)
    }
