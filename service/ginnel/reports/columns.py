"""Passages as columns, with their speed bands: for files and data frames of any length."""

from __future__ import annotations

from collections.abc import Generator, Sequence
from contextlib import closing
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from ginnel import store as log
from ginnel.store import Coded, PassageColumns, Store
from ginnel.words import speed_band_labels


@dataclass(frozen=True, slots=True, kw_only=True)
class BandedPassages:
    """Some passages with the speed band that each falls into."""

    passages: PassageColumns
    speed_band: Coded


def iter_columns(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    *,
    with_uncounted: bool = False,
) -> Generator[BandedPassages]:
    """Passages that cross in [start_us, end_us), in order of crossing, in constant memory."""
    edges = {sensor.name: sensor.speed_bands_mps for sensor in log.sensors(store)}
    labels = {name: speed_band_labels(edges_mps) for name, edges_mps in edges.items()}
    words = ("", *dict.fromkeys(label for own in labels.values() for label in own))
    code_of = {word: code for code, word in enumerate(words)}
    codes = {name: np.array([code_of[label] for label in own]) for name, own in labels.items()}
    with closing(
        log.iter_passage_columns(store, sensors, start_us, end_us, with_uncounted=with_uncounted)
    ) as tables:
        for passages in tables:
            band = np.zeros(len(passages.crossed_us), np.int64)
            for number, name in enumerate(passages.sensor.words):
                chosen = (passages.sensor.codes == number) & np.isfinite(passages.speed_mps)
                band[chosen] = _bands(passages.speed_mps[chosen], edges[name], codes[name])
            yield BandedPassages(passages=passages, speed_band=Coded(codes=band, words=words))


def _bands(
    speed_mps: NDArray[np.floating], edges_mps: Sequence[float], codes: NDArray[np.int64]
) -> NDArray[np.int64]:
    """Code of each speed's band; closed below and open above."""
    return codes[np.searchsorted(edges_mps, speed_mps, side="right")]
