"""Single passages, as they are shown and exported."""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Generator, Sequence
from contextlib import closing
from dataclasses import dataclass

from ginnel import store as log
from ginnel.store import LoggedPassage, Store
from ginnel.words import Passage, speed_band_labels


@dataclass(frozen=True, slots=True, kw_only=True)
class PassageEntry:
    """A passage with its lasting name and the speed band that it falls into."""

    passage_id: str
    sensor: str
    passage: Passage
    speed_band: str  # empty: speed not measured


def iter_entries(
    store: Store,
    sensors: Sequence[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    *,
    with_uncounted: bool = False,
) -> Generator[PassageEntry]:
    """Passages that cross in [start_us, end_us), in order of crossing, in constant memory."""
    bands = _bands(store)
    with closing(
        log.iter_passages(store, sensors, start_us, end_us, with_uncounted=with_uncounted)
    ) as entries:
        for logged in entries:
            yield _entry(logged, bands)


def latest_passages(store: Store, n: int = 20, sensor: str | None = None) -> tuple[PassageEntry, ...]:
    """Get the last n passages that count, the latest first."""
    bands = _bands(store)
    return tuple(_entry(logged, bands) for logged in log.latest_passages(store, n, sensor))


_Bands = dict[str, tuple[tuple[float, ...], list[str]]]


def _bands(store: Store) -> _Bands:
    """Edges and labels of each sensor's speed bands; making labels for each passage would be slow."""
    return {
        sensor.name: (sensor.speed_bands_mps, speed_band_labels(sensor.speed_bands_mps))
        for sensor in log.sensors(store)
    }


def _entry(logged: LoggedPassage, bands: _Bands) -> PassageEntry:
    speed_mps = logged.passage.speed_mps
    edges_mps, labels = bands[logged.sensor]
    return PassageEntry(
        passage_id=logged.passage_id,
        sensor=logged.sensor,
        passage=logged.passage,
        speed_band="" if speed_mps is None else labels[bisect_right(edges_mps, speed_mps)],
    )
