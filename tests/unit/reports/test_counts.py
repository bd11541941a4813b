"""Partly heard intervals, bands and movers, speeds of passages that are gone: reckoned by hand."""

from __future__ import annotations

import numpy as np
import pytest
from tests.unit.reports.invented import DUBLIN, HOUR, MINUTE, NORTH, A, R, U, at, heard, passed, spread

from ginnel.reports import CountRow, Every, counts, speeds
from ginnel.store import Store, prune_passages, roll_up_hours
from ginnel.words import MoverKind, Story

NINE = at(2026, 3, 2, 9)


def test_a_partly_heard_hour_is_told_as_counted_and_expanded(store: Store) -> None:
    heard(store, NORTH, NINE, NINE + 15 * MINUTE, spread(NINE, NINE + 15 * MINUTE, 10))
    (row,) = counts(store, together=True)
    assert (row.count, row.coverage, row.is_partial) == (10, 0.25, True)
    assert row.expanded == 40
    # four times Garwood's limits of 10: 4.7954 to 18.3904
    assert row.expanded_low == pytest.approx(4 * 4.7954, abs=2e-4)
    assert row.expanded_high == pytest.approx(4 * 18.3904, abs=2e-4)


def test_a_whole_hour_expands_to_itself_and_one_unheard_to_nothing(store: Store) -> None:
    heard(store, NORTH, NINE, NINE + HOUR, spread(NINE, NINE + HOUR, 7))
    whole, unheard = counts(store, None, NINE, NINE + 2 * HOUR, together=True)
    assert (whole.expanded, whole.is_partial) == (7, False)
    assert (unheard.count, unheard.expanded, unheard.expanded_low, unheard.is_partial) == (
        None,
        None,
        None,
        False,
    )


def test_a_crossing_where_nobody_listened_is_counted_and_not_expanded(store: Store) -> None:
    heard(store, NORTH, NINE, NINE + HOUR, [passed(NINE + HOUR + 5, stay_s=0)])
    _, after = counts(store, together=True)
    assert (after.count, after.coverage, after.expanded) == (1, 0, None)


def told(rows: tuple[CountRow, ...]) -> list[tuple[str, str | None, str | None, int | None]]:
    return [(row.direction or "", row.speed_band, row.mover, row.count) for row in rows]


def test_counts_by_speed_band(store: Store) -> None:
    morning = [
        passed(NINE + MINUTE, A, 0.5),
        passed(NINE + 2 * MINUTE, A, 1.0),  # bands are closed below
        passed(NINE + 3 * MINUTE, R, 2.5),
        passed(NINE + 4 * MINUTE, R, 0.2, story=Story.FIDGET),  # counts nowhere
    ]
    heard(store, NORTH, NINE, NINE + HOUR, morning)
    assert told(counts(store, by_band=True)) == [
        (A, "<1", None, 1),
        (A, "1-2", None, 1),
        (A, ">=2", None, 0),
        (R, "<1", None, 0),
        (R, "1-2", None, 0),
        (R, ">=2", None, 1),
    ]
    unmeasured = passed(NINE + HOUR + MINUTE, U, None)
    heard(store, NORTH, NINE + HOUR, NINE + 2 * HOUR, [unmeasured])
    rows = counts(store, together=True, by_band=True)
    assert [(row.speed_band, row.count) for row in rows] == [
        *(("<1", 1), ("1-2", 1), (">=2", 1), ("", 0)),
        *(("<1", 0), ("1-2", 0), (">=2", 0), ("", 1)),
    ]


def test_counts_by_mover(store: Store) -> None:
    morning = [
        passed(NINE + MINUTE, A, mover=MoverKind.ON_FOOT),
        passed(NINE + 2 * MINUTE, A, mover=MoverKind.ON_WHEELS),
        passed(NINE + 3 * MINUTE, R, mover=MoverKind.ON_WHEELS),
        passed(NINE + 4 * MINUTE, R),
    ]
    heard(store, NORTH, NINE, NINE + HOUR, morning)
    assert told(counts(store, together=True, by_mover=True)) == [
        ("", None, "on foot", 1),
        ("", None, "on wheels", 2),
        ("", None, "", 1),
    ]
    both = counts(store, by_band=True, by_mover=True)
    assert sum(row.count or 0 for row in both) == 4
    assert (R, "1-2", "on wheels", 1) in told(both)


def test_parts_sum_to_the_whole_and_blanks_stay_blank(store: Store) -> None:
    rng = np.random.default_rng(9)
    times = np.sort(rng.integers(NINE, NINE + HOUR, 200))
    ways = rng.choice([A, R, U], 200).tolist()
    speed_mps = rng.uniform(0.3, 3, 200).tolist()
    heard(
        store,
        NORTH,
        NINE - MINUTE,
        NINE + HOUR + MINUTE,
        [passed(int(time), way, speed) for time, way, speed in zip(times, ways, speed_mps, strict=True)],
    )
    stretch = (None, NINE, NINE + 2 * HOUR, Every.FIVE_MINUTES)
    whole = counts(store, *stretch)
    parts = counts(store, *stretch, by_band=True, by_mover=True)
    for row in whole:
        same = [
            part.count
            for part in parts
            if (part.interval_start_us, part.direction) == (row.interval_start_us, row.direction)
        ]
        assert same
        assert (None if None in same else sum(one or 0 for one in same)) == row.count
    assert parts[-1].count is None


def test_a_log_without_passages_has_one_row_an_interval_and_band(store: Store) -> None:
    heard(store, NORTH, NINE, NINE + HOUR)
    assert told(counts(store, together=True, by_mover=True)) == [("", None, "", 0)]
    assert len(counts(store, together=True, by_band=True)) == 3


def test_speeds_of_passages_that_are_gone_come_from_their_roll_ups(store: Store) -> None:
    rng = np.random.default_rng(1)
    day = at(2025, 3, 3, 0)
    speed_mps = np.abs(rng.normal(1.34, 0.26, 600)) + 0.2
    times = np.linspace(day + HOUR, day + 20 * HOUR, 600).astype(np.int64)
    heard(
        store,
        NORTH,
        day,
        day + 24 * HOUR,
        [passed(int(time), A, float(speed)) for time, speed in zip(times, speed_mps, strict=True)],
    )
    roll_up_hours(store, day + 24 * HOUR)
    (before, _) = speeds(store, None, day, day + 24 * HOUR, Every.DAY, DUBLIN.key)
    prune_passages(store, day + 30 * 24 * HOUR)
    (after, _) = speeds(store, None, day, day + 24 * HOUR, Every.DAY, DUBLIN.key)
    assert before.summary is not None
    assert after.summary is not None
    assert (before.is_grouped, after.is_grouped) == (False, True)
    assert after.summary.n == 600
    for name in ("mean_mps", "space_mean_mps", "sd_mps", "p15_mps", "p50_mps", "p85_mps", "p95_mps"):
        # within half a percent of what the passages themselves gave
        assert getattr(after.summary, name) == pytest.approx(getattr(before.summary, name), rel=0.005), name
    assert after.bands == before.bands  # their edges are whole centimetres a second
