"""Counts, speeds, coverage and passages as tables, over a log small enough to reckon by hand.

The log: 2026-03-02, Europe/Dublin (then UTC). North listened 09:00 to 10:30 and 12:00 to 13:00; nobody
listened from 10:30 to 12:00. South listened 09:00 to 10:00.
"""

from __future__ import annotations

from dataclasses import replace

import pytest

from ginnel.errors import ConfigError, StoreError
from ginnel.reports import (
    Every,
    counts,
    coverage,
    iter_entries,
    latest_passages,
    period,
    sensor_facts,
    site,
    speeds,
)
from ginnel.store import Store, put_sensor, record_span
from ginnel.words import Direction, Mounting, Passage, Sensor, Site, Span, Story

S = 1_000_000
HOUR = 3600 * S
NINE = 1_772_442_000 * S  # 2026-03-02T09:00:00Z
NORTH = Sensor(name="north", speed_bands_mps=(1.0, 2.0))
SOUTH = Sensor(name="south", speed_bands_mps=(1.0, 5.0))


def passage(hours: float, direction: Direction, speed_mps: float | None) -> Passage:
    at_us = NINE + round(hours * HOUR)
    return Passage(
        started_us=at_us,
        crossed_us=at_us,
        ended_us=at_us,
        direction=direction,
        direction_confidence=None,
        speed_mps=speed_mps,
        speed_se_mps=None,
        snr_db=None,
    )


def span(start_h: float, end_h: float) -> Span:
    return Span(
        started_us=NINE + round(start_h * HOUR), ended_us=NINE + round(end_h * HOUR), sample_rate_hz=8000.0
    )


A, R, U = Direction.APPROACHING, Direction.RECEDING, Direction.UNKNOWN


@pytest.fixture
def filled(store: Store) -> Store:
    morning = [
        passage(0.0, A, 1.0),
        passage(0.1, A, 2.0),
        passage(0.2, R, None),
        passage(1.0, A, 1.5),
        replace(passage(1.1, A, 1.5), story=Story.TURN_BACK),
    ]
    record_span(store, NORTH, span(0, 1.5), morning, "1")
    record_span(store, NORTH, span(3, 4), [passage(3.5, U, 0.5)], "1")
    record_span(store, SOUTH, span(0, 1), [passage(0.5, R, 3.0)], "2")
    return store


def test_counts_by_hour_and_direction(filled: Store) -> None:
    rows = counts(filled, ["north"])
    got = [((row.interval_start_us - NINE) // HOUR, row.direction, row.count, row.coverage) for row in rows]
    assert got == [
        (0, A, 2, 1.0),
        (0, R, 1, 1.0),
        (0, U, 0, 1.0),
        (1, A, 1, 0.5),
        (1, R, 0, 0.5),
        (1, U, 0, 0.5),
        (2, A, None, 0.0),
        (2, R, None, 0.0),
        (2, U, None, 0.0),
        (3, A, 0, 1.0),
        (3, R, 0, 1.0),
        (3, U, 1, 1.0),
    ]
    assert [row.listened_s for row in rows[::3]] == [3600, 1800, 0, 3600]
    assert all(row.interval_end_us - row.interval_start_us == HOUR for row in rows)
    assert all(row.corrected is None for row in rows)


def test_counts_carry_their_limits(filled: Store) -> None:
    two, *_, blank = counts(filled, ["north"], NINE, NINE + 3 * HOUR)
    # Garwood (1936), 95 %: a count of 2 has 0.2422 to 7.2247
    assert two.count_low == pytest.approx(0.2422, abs=1e-4)
    assert two.count_high == pytest.approx(7.2247, abs=1e-4)
    assert (blank.count_low, blank.count_high) == (None, None)


def test_unknown_has_a_row_only_where_there_is_any(filled: Store) -> None:
    assert {row.direction for row in counts(filled, ["north"], NINE, NINE + HOUR)} == {A, R}
    assert {row.direction for row in counts(filled, ["south"])} == {A, R}


def test_directions_together(filled: Store) -> None:
    rows = counts(filled, ["north"], together=True)
    assert [(row.direction, row.count) for row in rows] == [(None, 3), (None, 1), (None, None), (None, 1)]


def test_all_sensors_come_by_name_over_the_same_period(filled: Store) -> None:
    rows = counts(filled, together=True)
    assert [(row.sensor, row.count) for row in rows] == [
        ("north", 3),
        ("north", 1),
        ("north", None),
        ("north", 1),
        ("south", 1),
        ("south", None),
        ("south", None),
        ("south", None),
    ]


def test_an_interval_is_whole_however_the_period_is_cut(filled: Store) -> None:
    rows = counts(filled, ["north"], NINE + HOUR // 2, NINE + HOUR // 2 + 1)
    assert [(row.interval_start_us, row.count) for row in rows] == [(NINE, 2), (NINE, 1)]


def test_a_passage_that_crosses_just_outside_is_counted_all_the_same(store: Store) -> None:
    late = replace(passage(0.99, A, 1.0), crossed_us=NINE + HOUR + 1)
    record_span(store, NORTH, span(0, 1), [late], "1")
    rows = counts(store, together=True)
    assert [(row.count, row.coverage) for row in rows] == [(0, 1.0), (1, 0.0)]
    assert sum(row.count or 0 for row in rows) == 1


def test_an_empty_log_has_no_rows(store: Store) -> None:
    assert counts(store) == ()
    assert speeds(store) == ()
    assert coverage(store) == ()
    assert latest_passages(store) == ()
    put_sensor(store, NORTH)
    assert counts(store) == ()


def test_a_day_without_listening_is_blank_not_zero(store: Store) -> None:
    put_sensor(store, NORTH)
    rows = counts(store, None, NINE, NINE + 24 * HOUR, Every.DAY)
    assert [row.count for row in rows] == [None] * 4


def test_an_unknown_sensor_is_refused(filled: Store) -> None:
    for question in (counts, speeds, coverage):
        with pytest.raises(StoreError, match="no sensor 'west'"):
            question(filled, ["west"])


def test_coverage_by_day_counts_the_hours_the_day_had(store: Store) -> None:
    # 29 March 2026 has 23 hours in Dublin; listened from its midnight to noon, 11 hours by any clock.
    midnight = 1_774_742_400 * S
    whole = Span(started_us=midnight, ended_us=midnight + 11 * HOUR, sample_rate_hz=8000.0)
    record_span(store, NORTH, whole, [], "1")
    (row,) = coverage(store, every=Every.DAY)
    assert row.coverage == pytest.approx(11 / 23)
    assert row.listened_s == 11 * 3600
    assert row.interval_end_us - row.interval_start_us == 23 * HOUR


def test_another_zone_can_be_asked_for(filled: Store) -> None:
    (row, *_) = counts(filled, ["north"], every=Every.DAY, tz="Asia/Kolkata")
    assert (row.interval_start_us - NINE) / HOUR == -14.5  # 09:00 UTC is 14:30 there
    with pytest.raises(ConfigError, match="'Mars/Olympus' is no IANA time zone"):
        period(filled, Every.DAY, tz="Mars/Olympus")


def test_speeds_by_hour_and_direction(filled: Store) -> None:
    rows = {((row.interval_start_us - NINE) // HOUR, row.direction): row for row in speeds(filled, ["north"])}
    first = rows[0, A]
    assert first.summary is not None
    assert (first.summary.n, first.summary.mean_mps) == (2, 1.5)
    assert first.summary.space_mean_mps == pytest.approx(4 / 3)  # harmonic mean of 1 and 2
    assert first.summary.p85_mps == pytest.approx(1.85)  # type 7: 1 + 0.85 (2 - 1)
    assert first.bands == (0, 1, 1)
    unmeasured = rows[0, R]  # one passed, its speed was not measured
    assert unmeasured.summary is not None
    assert (unmeasured.summary.n, unmeasured.summary.mean_mps, unmeasured.bands) == (0, None, (0, 0, 0))
    never = rows[2, A]
    assert (never.summary, never.bands) == (None, None)
    assert rows[3, U].bands == (1, 0, 0)


def test_speeds_together(filled: Store) -> None:
    row = speeds(filled, ["north"], NINE, NINE + 4 * HOUR, Every.DAY, together=True)[0]
    assert row.direction is None
    assert row.summary is not None
    assert row.summary.n == 4
    assert row.summary.mean_mps == pytest.approx(1.25)


def test_pace_and_share_over_a_limit_where_they_are_asked_for(filled: Store) -> None:
    first, receding, *_, blank, _ = speeds(
        filled, ["north"], NINE, NINE + 3 * HOUR, pace_width_mps=0.5, limit_mps=1.5
    )
    assert first.pace is not None
    assert (first.pace.low_mps, first.pace.n, first.pace.share) == (1.0, 1, 0.5)
    assert first.over_limit == 0.5
    assert (receding.pace, receding.over_limit) == (None, None)  # no speed was measured
    assert (blank.pace, blank.over_limit, blank.summary) == (None, None, None)
    assert speeds(filled, ["north"])[0].pace is None


def test_entries_carry_a_lasting_name_and_the_sensors_own_band(filled: Store) -> None:
    entries = list(iter_entries(filled))
    assert [entry.passage_id for entry in entries[:2]] == [f"north-{NINE}", f"north-{NINE + HOUR // 10}"]
    assert [entry.speed_band for entry in entries] == ["1-2", ">=2", "", "1-5", "1-2", "<1"]
    assert len(list(iter_entries(filled, with_uncounted=True))) == 7
    assert [entry.sensor for entry in iter_entries(filled, ["south"])] == ["south"]


def test_latest_passages_are_those_that_count(filled: Store) -> None:
    assert [entry.passage.speed_mps for entry in latest_passages(filled, 2)] == [0.5, 1.5]
    assert [entry.sensor for entry in latest_passages(filled, 9, "south")] == ["south"]


def test_facts_tell_every_mounting_and_version_of_a_sensors_log(filled: Store) -> None:
    moved = replace(NORTH, mounting=Mounting(height_m=3.0, since_us=NINE + 5 * HOUR))
    record_span(filled, moved, span(5, 6), [], "1.1")
    north, south = sensor_facts(filled)
    assert north.sensor == moved
    assert north.mountings == (Mounting(), moved.mounting)
    assert (north.chain_versions, south.chain_versions) == (("1", "1.1"), ("2",))
    assert [one.sensor.name for one in sensor_facts(filled, ["south"])] == ["south"]
    assert site(filled) == Site(name="Tannery annex", timezone="Europe/Dublin")
