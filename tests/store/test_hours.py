"""Roll-ups by hour: always those of the passages themselves, whatever is written, missed or doubled.

First what single changes do, then retention and reading, then a law over random histories.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import replace

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from sqlalchemy import text

from ginnel.errors import StoreError
from ginnel.store import (
    Store,
    extend_span,
    hourly_counts,
    hourly_listening,
    hourly_speeds,
    iter_passages,
    put_sensor,
    record_span,
    roll_up_hours,
    sensors,
    spans,
)
from ginnel.store.rollup import roll_up
from ginnel.words import Direction, Passage, Sensor, Span, Story

S = 1_000_000
HOUR_US = 3_600 * S
T0 = 1_772_442_000 * S  # 2026-03-02T09:00:00Z, a whole hour
NORTH = Sensor(name="north")


def passage(at_min: float, direction: Direction = Direction.APPROACHING, **changes: object) -> Passage:
    at_us = T0 + round(at_min * 60 * S)
    plain = Passage(
        started_us=at_us,
        crossed_us=at_us,
        ended_us=at_us + 1,
        direction=direction,
        direction_confidence=None,
        speed_mps=1.25,
        speed_se_mps=None,
        snr_db=None,
    )
    return replace(plain, **changes)  # type: ignore[arg-type] # any field


def span(start_min: float, end_min: float) -> Span:
    return Span(
        started_us=T0 + round(start_min * 60 * S),
        ended_us=T0 + round(end_min * 60 * S),
        sample_rate_hz=8000.0,
    )


def counted(store: Store, n_hours: int = 48) -> list[tuple[int, int]]:
    found = hourly_counts(store, "north", T0 - HOUR_US, T0 + n_hours * HOUR_US)
    return [
        (int(hour - T0) // HOUR_US, int(n)) for hour, n in zip(found.hour_us, found.count, strict=True) if n
    ]


def listened(store: Store) -> list[tuple[int, float]]:
    found = hourly_listening(store, "north", T0 - HOUR_US, T0 + 48 * HOUR_US)
    return [
        (int(hour - T0) // HOUR_US, int(us) / 60 / S)
        for hour, us in zip(found.hour_us, found.listened_us, strict=True)
    ]


def n_stale(store: Store) -> int:
    with store.reading() as connection:
        return int(connection.execute(text("SELECT count(*) FROM hour_stale")).scalar_one())


def test_a_span_is_rolled_up_by_hour(store: Store) -> None:
    record_span(store, NORTH, span(30, 150), [passage(40), passage(59), passage(60), passage(149)], "1")
    assert roll_up_hours(store, T0 + 3 * HOUR_US) == 3
    assert n_stale(store) == 0
    assert counted(store) == [(0, 2), (1, 1), (2, 1)]
    assert listened(store) == [(0, 30), (1, 60), (2, 30)]


def test_reading_does_not_wait_for_the_job(store: Store) -> None:
    record_span(store, NORTH, span(0, 60), [passage(40)], "1")
    assert (counted(store), listened(store)) == ([(0, 1)], [(0, 60)])
    roll_up_hours(store, T0 + HOUR_US)
    record_span(store, NORTH, span(60, 90), [passage(70), passage(80)], "1")
    assert (counted(store), listened(store)) == ([(0, 1), (1, 2)], [(0, 60), (1, 30)])


def test_an_hour_that_is_not_over_is_left_to_the_next_time(store: Store) -> None:
    record_span(store, NORTH, span(0, 90), [passage(70)], "1")
    assert roll_up_hours(store, T0 + 90 * 60 * S) == 1
    assert n_stale(store) == 1
    extend_span(store, NORTH, span(0, 120), [passage(100)], "1")
    assert roll_up_hours(store, T0 + 2 * HOUR_US) == 1
    assert counted(store) == [(1, 2)]


def test_a_missed_firing_is_made_up_and_a_doubled_one_does_nothing(store: Store) -> None:
    record_span(store, NORTH, span(0, 600), [passage(60 * hour + 5) for hour in range(10)], "1")
    assert roll_up_hours(store, T0 + 10 * HOUR_US) == 10
    before = counted(store)
    assert roll_up_hours(store, T0 + 10 * HOUR_US) == 0
    assert counted(store) == before == [(hour, 1) for hour in range(10)]


def test_a_replay_of_old_spans_is_rolled_up_anew(store: Store) -> None:
    record_span(store, NORTH, span(0, 60), [passage(10), passage(20)], "1")
    record_span(store, NORTH, span(60, 180), [passage(70)], "1")
    roll_up_hours(store, T0 + 3 * HOUR_US)
    record_span(store, NORTH, span(0, 60), [passage(30)], "2")
    assert n_stale(store) == 1
    assert counted(store) == [(0, 1), (1, 1)]
    roll_up_hours(store, T0 + 3 * HOUR_US)
    assert counted(store) == [(0, 1), (1, 1)]


def test_a_crossing_just_outside_its_span_belongs_to_its_own_hour(store: Store) -> None:
    late = passage(59.9, crossed_us=T0 + HOUR_US + 3 * S)
    record_span(store, NORTH, span(0, 60), [late], "1")
    roll_up_hours(store, T0 + 2 * HOUR_US)
    assert (counted(store), listened(store)) == ([(1, 1)], [(0, 60)])
    record_span(store, NORTH, span(0, 60), [], "2")
    roll_up_hours(store, T0 + 2 * HOUR_US)
    assert (counted(store), n_stale(store)) == ([], 0)


def test_live_listening_marks_only_what_it_adds(store: Store) -> None:
    extend_span(store, NORTH, span(0, 100), [], "1")
    roll_up_hours(store, T0 + HOUR_US)
    assert n_stale(store) == 1
    extend_span(store, NORTH, span(0, 110), [passage(59.99)], "1")  # found late, as a busy day makes it
    assert n_stale(store) == 2
    assert counted(store) == [(0, 1)]


def test_stories_and_directions_are_kept_apart(store: Store) -> None:
    record_span(
        store,
        NORTH,
        span(0, 60),
        [
            passage(1),
            passage(2, Direction.RECEDING, speed_mps=2.0),
            passage(3, Direction.RECEDING, speed_mps=None),
            passage(4, Direction.UNKNOWN, story=Story.TURN_BACK),
        ],
        "1",
    )
    for _ in range(2):  # before and after rolling up
        found = hourly_speeds(store, "north", T0, T0 + HOUR_US)
        assert found.hour_us.tolist() == [T0, T0]
        assert found.of(Direction.APPROACHING).rollups == (roll_up(np.array([1_250_000])),)
        assert found.of(Direction.RECEDING).rollups == (roll_up(np.array([2_000_000, -1])),)
        assert found.of(None).between(T0, T0 + 1) == roll_up(np.array([1_250_000, 2_000_000, -1]))
        assert found.between(T0 + 1, T0 + 2).count == 0
        turned = hourly_counts(store, "north", T0, T0 + HOUR_US, Story.TURN_BACK)
        assert turned.of(Direction.UNKNOWN).count.tolist() == [1]
        roll_up_hours(store, T0 + HOUR_US)
    with pytest.raises(StoreError, match="no sensor 'west'"):
        hourly_counts(store, "west", T0, T0 + HOUR_US)


def test_only_hours_that_start_inside_are_given(store: Store) -> None:
    record_span(store, NORTH, span(0, 180), [passage(10), passage(70), passage(130)], "1")
    found = hourly_counts(store, "north", T0 + 1, T0 + 2 * HOUR_US)
    assert found.hour_us.tolist() == [T0 + HOUR_US]
    roll_up_hours(store, T0 + 3 * HOUR_US)
    assert hourly_counts(store, "north", T0 + 1, T0 + 2 * HOUR_US).hour_us.tolist() == [T0 + HOUR_US]


minute = st.integers(0, 300)


@settings(max_examples=10, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    steps=st.lists(
        st.tuples(minute, minute, st.sampled_from("12"), st.sets(minute, max_size=9), st.booleans()).filter(
            lambda step: step[0] < step[1]
        ),
        max_size=6,
    )
)
def test_whatever_is_recorded_roll_ups_agree_with_the_passages(
    store: Store, steps: list[tuple[int, int, str, set[int], bool]]
) -> None:
    """The job fires at random between random changes; expected is counted from what iterating gives."""
    sensor = Sensor(name=f"sensor-{len(sensors(store))}")
    put_sensor(store, sensor)
    for start, end, version, at, fires in steps:
        inside = [
            passage(m, Direction.RECEDING if m % 3 else Direction.UNKNOWN) for m in at if start <= m < end
        ]
        try:
            record_span(store, sensor, span(start, end), inside, version)
        except StoreError:
            continue
        if fires:
            roll_up_hours(store, T0 + (start % 5) * HOUR_US)
    logged = [one.passage for one in iter_passages(store, sensor.name)]
    expected = Counter((one.crossed_us // HOUR_US * HOUR_US, one.direction) for one in logged)
    heard_us = sum(one.span.ended_us - one.span.started_us for one in spans(store, sensor.name))
    for _ in range(2):
        found: dict[tuple[int, Direction], int] = {}
        for way in Direction:
            those = hourly_counts(store, sensor.name, T0, T0 + 9 * HOUR_US).of(way)
            found |= {(int(hour), way): int(n) for hour, n in zip(those.hour_us, those.count, strict=True)}
        assert found == expected
        listening = hourly_listening(store, sensor.name, T0, T0 + 9 * HOUR_US)
        assert int(listening.listened_us.sum()) == heard_us
        roll_up_hours(store, T0 + 9 * HOUR_US)
    assert n_stale(store) == 0
