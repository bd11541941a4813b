"""What goes when it is old enough, and what stays known of it."""

from __future__ import annotations

import sqlite3
from contextlib import closing
from dataclasses import replace

import pytest
from sqlalchemy import make_url, text

from ginnel.store import (
    LoggedHealth,
    Store,
    conditions,
    extend_span,
    find_faults,
    hourly_counts,
    hourly_listening,
    iter_health,
    iter_passages,
    newest_us,
    prune_conditions,
    prune_health,
    prune_passages,
    prune_rollups,
    put_conditions,
    put_health,
    record_span,
    roll_up_hours,
    spans,
)
from ginnel.words import Condition, Direction, HealthSample, Passage, Sensor, Severity, Span

S = 1_000_000
HOUR_US = 3_600 * S
T0 = 1_772_442_000 * S  # 2026-03-02T09:00:00Z
NORTH = Sensor(name="north")


def passage(at_h: float, crossed_h: float | None = None) -> Passage:
    at_us = T0 + round(at_h * HOUR_US)
    return Passage(
        started_us=at_us,
        crossed_us=at_us if crossed_h is None else T0 + round(crossed_h * HOUR_US),
        ended_us=at_us,
        direction=Direction.RECEDING,
        direction_confidence=None,
        speed_mps=1.5,
        speed_se_mps=None,
        snr_db=None,
    )


def span(start_h: float, end_h: float) -> Span:
    return Span(
        started_us=T0 + round(start_h * HOUR_US), ended_us=T0 + round(end_h * HOUR_US), sample_rate_hz=8000.0
    )


def counted(store: Store) -> dict[int, int]:
    found = hourly_counts(store, "north", T0, T0 + 24 * HOUR_US)
    return {int(hour - T0) // HOUR_US: int(n) for hour, n in zip(found.hour_us, found.count, strict=True)}


def listened_h(store: Store) -> float:
    return float(hourly_listening(store, "north", T0, T0 + 24 * HOUR_US).listened_us.sum() / HOUR_US)


@pytest.fixture
def filled(store: Store) -> Store:
    record_span(store, NORTH, span(0, 1.5), [passage(0.1), passage(1.2)], "1")
    record_span(store, NORTH, span(1.5, 3), [passage(1.7), passage(2.5)], "1")
    record_span(store, NORTH, span(3, 5), [passage(3.5), passage(4.5)], "1")
    return store


@pytest.mark.parametrize("rolled_first", [True, False])
def test_counts_outlive_their_passages(filled: Store, rolled_first: bool) -> None:
    if rolled_first:
        roll_up_hours(filled, T0 + 9 * HOUR_US)
    before = counted(filled)
    assert prune_passages(filled, T0 + round(3.2 * HOUR_US)) == 4
    assert [one.passage for one in iter_passages(filled)] == [passage(3.5), passage(4.5)]
    assert [one.span for one in spans(filled)] == [span(3, 5)]
    assert counted(filled) == before == {0: 1, 1: 2, 2: 1, 3: 1, 4: 1}
    assert listened_h(filled) == 5
    assert find_faults(filled) == []
    assert prune_passages(filled, T0 + round(3.2 * HOUR_US)) == 0
    roll_up_hours(filled, T0 + 9 * HOUR_US)
    assert counted(filled) == before


def test_a_span_goes_as_a_whole_once_all_of_it_is_old(filled: Store) -> None:
    assert prune_passages(filled, T0 + 2 * HOUR_US) == 2
    assert [one.span for one in spans(filled)] == [span(1.5, 3), span(3, 5)]
    assert counted(filled) == {0: 1, 1: 2, 2: 1, 3: 1, 4: 1}


def test_what_is_replayed_into_pruned_hours_does_not_halve_their_counts(filled: Store) -> None:
    prune_passages(filled, T0 + 3 * HOUR_US)
    before = counted(filled)
    record_span(filled, NORTH, span(0, 1.5), [passage(0.1), passage(1.2)], "2")
    assert counted(filled) == before
    roll_up_hours(filled, T0 + 9 * HOUR_US)
    assert counted(filled) == before
    assert find_faults(filled) == []


def test_a_crossing_outside_all_listening_stays_counted(store: Store) -> None:
    late = passage(0.999, crossed_h=1.001)
    record_span(store, NORTH, span(0, 1), [late], "1")
    assert prune_passages(store, T0 + 2 * HOUR_US) == 1
    record_span(store, NORTH, span(1.5, 1.6), [], "1")  # marks that hour
    roll_up_hours(store, T0 + 9 * HOUR_US)
    assert counted(store) == {1: 1}


def test_final_roll_ups_go_when_they_are_old_others_stay(filled: Store) -> None:
    roll_up_hours(filled, T0 + 9 * HOUR_US)
    prune_passages(filled, T0 + 3 * HOUR_US)
    assert prune_rollups(filled, T0 + 2 * HOUR_US) == 2
    assert counted(filled) == {2: 1, 3: 1, 4: 1}
    assert prune_rollups(filled, T0 + 9 * HOUR_US) == 1
    assert counted(filled) == {3: 1, 4: 1}
    assert find_faults(filled) == []


def test_a_span_that_still_grows_is_left_alone(store: Store) -> None:
    extend_span(store, NORTH, span(0, 100), [passage(1)], "1")
    assert prune_passages(store, T0 + 50 * HOUR_US) == 0
    assert extend_span(store, NORTH, span(0, 101), [], "1").added == 0


def test_health_and_conditions_go_by_age(filled: Store) -> None:
    samples = [HealthSample(at_us=T0 + i) for i in range(3)]
    put_health(filled, [LoggedHealth(sensor="north", sample=one) for one in samples])
    assert prune_health(filled, T0 + 2) == 2
    assert list(iter_health(filled, "north")) == samples[2:]
    plain = Condition(
        kind="too-hot", sensor=None, severity=Severity.WARNING, raised_us=T0, sentence="x", advice="y"
    )
    over = replace(plain, kind="disk-full", cleared_us=T0 + 5)
    put_conditions(filled, [plain, over])
    assert prune_conditions(filled, T0 + 6) == 1
    assert conditions(filled, T0, T0 + HOUR_US) == [plain]


def test_the_newest_moment_is_that_of_spans_and_health(store: Store) -> None:
    assert newest_us(store) is None
    record_span(store, NORTH, span(0, 1), [], "1")
    assert newest_us(store) == T0 + HOUR_US
    put_health(store, [LoggedHealth(sensor="north", sample=HealthSample(at_us=T0 + 2 * HOUR_US))])
    assert newest_us(store) == T0 + 2 * HOUR_US


ROLLUP = "the roll-up of 2026-03-02T09h contradicts the passages"


@pytest.mark.parametrize(
    ("harm", "told"),
    [
        (
            "UPDATE hour_passages SET count = count + 1 WHERE direction = 2",
            "roll-up of 2026-03-02T09h contradicts",
        ),
        ("UPDATE hour_listened SET listened_us = 1", "roll-up of 2026-03-02T09h contradicts"),
        ("DELETE FROM hour_passages", "roll-up of 2026-03-02T09h contradicts"),
        ("UPDATE passage SET speed_umps = 9 WHERE story = 0", "roll-up of 2026-03-02T09h contradicts"),
        ("DELETE FROM span WHERE id = 1", "2 passages lie in no span"),
        ("UPDATE span SET ended_us = ended_us + 5 WHERE id = 1", "2026-03-02T10:30:00.000000Z overlap"),
    ],
)
def test_what_contradicts_itself_is_told(filled: Store, harm: str, told: str) -> None:
    roll_up_hours(filled, T0 + 9 * HOUR_US)
    assert find_faults(filled) == []
    with filled.writing() as connection:
        connection.execute(text(harm))
    found = find_faults(filled)
    assert found
    assert any(told in line for line in found), found


def test_rows_that_refer_to_nothing_are_told(store: Store, store_url: str) -> None:
    """Only by hand, or by damage: the database refuses such rows."""
    record_span(store, NORTH, span(0, 1), [], "1")
    if store.dialect == "sqlite":
        with closing(sqlite3.connect(make_url(store_url).database or "")) as careless:
            careless.execute("UPDATE span SET sensor_id = 99")
            careless.commit()
    else:
        with store.writing() as connection:
            connection.execute(text("ALTER TABLE span DROP CONSTRAINT fk_span_sensor_id_sensor"))
            connection.execute(text("UPDATE span SET sensor_id = 99"))
    assert "1 rows of span refer to a sensor that is not there" in find_faults(store)
