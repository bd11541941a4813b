"""Counts by speed band and by what moved, which only the passages themselves tell."""

from __future__ import annotations

from contextlib import closing
from dataclasses import dataclass
from itertools import product

import numpy as np

from ginnel import store as log
from ginnel.reports.columns import iter_columns
from ginnel.stats.counts import IntArray
from ginnel.store import Coded, Store
from ginnel.words import Direction, MoverKind, speed_band_labels


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """Which passages of an interval a count is of; None: not told apart."""

    direction: Direction | None = None
    speed_band: str | None = None  # a label; empty: of unknown speed
    mover: str | None = None  # a kind; empty: cannot be told


def split_counts(
    store: Store, sensor: str, edges_us: IntArray, *, by_direction: bool, by_band: bool, by_mover: bool
) -> dict[Part, IntArray]:
    """Count the passages between ascending edges in parts; each array has shape (intervals,).

    Both directions and all bands of the sensor always have a part; unknown directions and speeds, and kinds
    of movers, where there is any of them in the period.
    """
    (bands,) = (one.speed_bands_mps for one in log.sensors(store) if one.name == sensor)
    ways = list(Direction)
    labels = [*speed_band_labels(bands), ""]
    movers = [*MoverKind, ""]
    n = np.zeros((len(edges_us) - 1, len(ways), len(labels), len(movers)), np.int64)
    with closing(iter_columns(store, [sensor], int(edges_us[0]), int(edges_us[-1]))) as tables:
        for table in tables:
            interval = np.searchsorted(edges_us, table.passages.crossed_us, side="right") - 1
            place = (
                _places(table.passages.direction, [way.value for way in ways]),
                _places(table.speed_band, labels),
                _places(table.passages.mover, [*(mover.value for mover in MoverKind), ""]),
            )
            np.add.at(n, (interval, *place), 1)
    for axis, wanted in ((1, by_direction), (2, by_band), (3, by_mover)):
        if not wanted:
            n = n.sum(axis=axis, keepdims=True)
    parts = {
        Part(
            direction=ways[way] if by_direction else None,
            speed_band=labels[band] if by_band else None,
            mover=str(movers[mover]) if by_mover else None,
        ): n[:, way, band, mover]
        for way, band, mover in product(*(range(size) for size in n.shape[1:]))
        if n[:, way].any() or ways[way] is not Direction.UNKNOWN
        if n[:, :, band].any() or not by_band or labels[band]
        if n[:, :, :, mover].any() or not by_mover or (not movers[mover] and not n.any())
    }
    return parts


def _places(column: Coded, order: list[str]) -> IntArray:
    """Place of each row's word in an order."""
    return np.array([order.index(word) for word in column.words], np.int64)[column.codes]
