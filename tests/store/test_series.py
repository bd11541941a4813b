"""Series of counts that others made, on both databases: in as they came, replaced whole, by direction."""

from __future__ import annotations

from dataclasses import replace

import pytest

from ginnel.errors import StoreError
from ginnel.store import SeriesCount, Store, all_series, put_series, series_arrays
from ginnel.words import Direction

HOUR = 3_600_000_000
ONE = SeriesCount(started_us=0, ended_us=HOUR, direction=Direction.RECEDING, count=7)


def test_counts_come_out_as_they_went_in(store: Store) -> None:
    rows = [replace(ONE, started_us=at * HOUR, ended_us=(at + 1) * HOUR, count=at) for at in range(30)]
    rows += [replace(one, direction=Direction.UNKNOWN, count=0) for one in rows[:3]]
    assert put_series(store, "loop", "loop.csv", rows) == 33
    found = series_arrays(store, "loop", 2 * HOUR, 5 * HOUR)
    assert found[Direction.RECEDING].started_us.tolist() == [2 * HOUR, 3 * HOUR, 4 * HOUR]
    assert found[Direction.RECEDING].count.tolist() == [2, 3, 4]
    assert found[Direction.UNKNOWN].count.tolist() == [0]
    assert found[Direction.APPROACHING].count.tolist() == []


def test_a_series_is_replaced_whole_and_others_stay(store: Store) -> None:
    put_series(store, "loop", "old.csv", [ONE, replace(ONE, started_us=HOUR, ended_us=2 * HOUR)])
    put_series(store, "pole", "pole.csv", [ONE])
    put_series(store, "loop", "new.csv", [replace(ONE, count=1)])
    assert [(one.name, one.source, one.n_counts, one.extent_us) for one in all_series(store)] == [
        ("loop", "new.csv", 1, (0, HOUR)),
        ("pole", "pole.csv", 1, (0, HOUR)),
    ]


def test_a_series_that_does_not_fit_leaves_the_old_one(store: Store) -> None:
    put_series(store, "loop", "old.csv", [ONE])
    with pytest.raises(StoreError):
        put_series(store, "loop", "new.csv", [replace(ONE, count=2), replace(ONE, count=3)])
    (kept,) = all_series(store)
    assert (kept.source, kept.n_counts) == ("old.csv", 1)


def test_an_unknown_series_is_told(store: Store) -> None:
    with pytest.raises(StoreError, match="knows no series 'loop'; it knows: none"):
        series_arrays(store, "loop", 0, HOUR)
