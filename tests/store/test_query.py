"""Reading the log: bounds, order, choice of sensors, arrays, memory."""

from __future__ import annotations

import tracemalloc
from dataclasses import replace

import numpy as np
import pytest
from sqlalchemy import text

from ginnel.errors import StoreError
from ginnel.store import (
    Store,
    extent_us,
    iter_passages,
    latest_passages,
    passage_arrays,
    put_sensor,
    record_span,
    spans,
)
from ginnel.words import Direction, Passage, Sensor, Span, Story

S = 1_000_000
T0 = 1_772_442_000 * S
NORTH = Sensor(name="north")
SOUTH = Sensor(name="south")


def passage(at_s: int, direction: Direction = Direction.APPROACHING, **changes: object) -> Passage:
    plain = Passage(
        started_us=T0 + at_s * S,
        crossed_us=T0 + at_s * S,
        ended_us=T0 + at_s * S,
        direction=direction,
        direction_confidence=None,
        speed_mps=1.5,
        speed_se_mps=None,
        snr_db=None,
    )
    return replace(plain, **changes)  # type: ignore[arg-type] # any field


def span(start_s: int, end_s: int) -> Span:
    return Span(started_us=T0 + start_s * S, ended_us=T0 + end_s * S, sample_rate_hz=8000.0)


@pytest.fixture
def filled(store: Store) -> Store:
    record_span(
        store,
        NORTH,
        span(0, 100),
        [
            passage(10),
            passage(20, Direction.RECEDING, speed_mps=None),
            passage(25, story=Story.FIDGET),
            passage(30, Direction.UNKNOWN),
        ],
        "1",
    )
    record_span(store, SOUTH, span(0, 50), [passage(15), passage(30)], "2")
    record_span(store, SOUTH, span(60, 90), [passage(70, story=Story.TURN_BACK)], "2")
    return store


def crossings(store: Store, *args: object, **more: object) -> list[tuple[str, int]]:
    found = iter_passages(store, *args, **more)  # type: ignore[arg-type] # as each test gives them
    return [(one.sensor, (one.passage.crossed_us - T0) // S) for one in found]


def test_passages_of_all_sensors_come_in_order_of_crossing(filled: Store) -> None:
    in_order = [("north", 10), ("south", 15), ("north", 20), ("north", 30), ("south", 30)]
    assert crossings(filled) == in_order
    with_rest = [*in_order[:3], ("north", 25), *in_order[3:], ("south", 70)]
    assert crossings(filled, with_uncounted=True) == with_rest


def test_bounds_are_half_open(filled: Store) -> None:
    assert crossings(filled, "north", T0 + 10 * S, T0 + 20 * S) == [("north", 10)]
    assert crossings(filled, "north", T0 + 10 * S + 1, T0 + 20 * S + 1) == [("north", 20)]


def test_some_sensors_can_be_chosen(filled: Store) -> None:
    assert crossings(filled, ["south"]) == [("south", 15), ("south", 30)]
    assert crossings(filled, ["south", "north"]) == crossings(filled)
    assert crossings(filled, []) == []


def test_an_unknown_sensor_is_named_with_those_known(filled: Store) -> None:
    with pytest.raises(StoreError, match="no sensor 'west'; it knows: north, south"):
        list(iter_passages(filled, "west"))


def test_an_empty_store_has_nothing(store: Store) -> None:
    assert list(iter_passages(store)) == []
    assert spans(store) == []
    assert extent_us(store) is None
    assert latest_passages(store, 3) == []
    with pytest.raises(StoreError, match="it knows: none yet"):
        passage_arrays(store, "north")


def test_latest_passages_come_latest_first(filled: Store) -> None:
    found = [(one.sensor, (one.passage.crossed_us - T0) // S) for one in latest_passages(filled, 3)]
    assert sorted(found[:2]) == [("north", 30), ("south", 30)]
    assert found[2] == ("north", 20)
    assert len(latest_passages(filled, 50)) == 5
    assert [one.sensor for one in latest_passages(filled, 1, "south")] == ["south"]


def test_an_iterator_left_early_lets_the_store_go(filled: Store) -> None:
    begun = iter_passages(filled)
    assert next(begun).passage_id == f"north-{T0 + 10 * S}"
    begun.close()
    assert record_span(filled, SOUTH, span(200, 300), [], "2").added == 0


def test_a_reader_keeps_its_view_while_another_writes(filled: Store) -> None:
    begun = iter_passages(filled, "north")
    next(begun)
    record_span(filled, NORTH, span(0, 100), [passage(99)], "3")
    assert [one.passage.crossed_us for one in begun] == [T0 + 20 * S, T0 + 30 * S]
    assert crossings(filled, "north") == [("north", 99)]


def test_spans_are_those_that_share_time(filled: Store) -> None:
    assert [one.sensor for one in spans(filled)] == ["north", "south", "south"]
    assert [one.span for one in spans(filled, "south", T0 + 50 * S, T0 + 60 * S)] == []
    assert [one.span for one in spans(filled, "south", T0 + 49 * S, T0 + 61 * S)] == [
        span(0, 50),
        span(60, 90),
    ]


def test_extent_covers_spans_and_crossings(filled: Store) -> None:
    assert extent_us(filled) == (T0, T0 + 100 * S)
    assert extent_us(filled, "south") == (T0, T0 + 90 * S)
    late = passage(398, crossed_us=T0 + 410 * S)
    record_span(filled, SOUTH, span(300, 400), [late], "2")
    assert extent_us(filled, ["south", "north"]) == (T0, T0 + 410 * S + 1)


def test_arrays_hold_what_counts(filled: Store) -> None:
    arrays = passage_arrays(filled, "north")
    assert arrays.crossed_us.tolist() == [T0 + 10 * S, T0 + 20 * S, T0 + 30 * S]
    np.testing.assert_array_equal(arrays.speed_mps, [1.5, np.nan, 1.5])
    assert arrays.of(Direction.RECEDING).crossed_us.tolist() == [T0 + 20 * S]
    assert arrays.of(Direction.UNKNOWN).speed_mps.tolist() == [1.5]
    assert arrays.of(None) is arrays
    assert passage_arrays(filled, "north", T0 + 40 * S).crossed_us.shape == (0,)
    put_sensor(filled, Sensor(name="new"))
    assert passage_arrays(filled, "new").crossed_us.dtype == np.int64


def test_memory_does_not_grow_with_the_number_of_passages(store: Store) -> None:
    n = 6_000
    record_span(store, NORTH, span(0, n), [passage(i) for i in range(n)], "1")
    sum(1 for _ in iter_passages(store))  # what is loaded once is not what is measured
    tracemalloc.start()
    assert sum(1 for _ in iter_passages(store)) == n
    peak = tracemalloc.get_traced_memory()[1]
    tracemalloc.stop()
    assert peak < 1.2e6  # all of them at once are about 1.9 MB


def test_postgresql_hands_out_rows_piece_by_piece(store: Store) -> None:
    """Memory that the driver takes for rows is not Python's, so ask the server how it is being read."""
    if store.dialect != "postgresql":
        pytest.skip("SQLite has no other way")
    record_span(store, NORTH, span(0, 100), [passage(10), passage(20)], "1")
    begun = iter_passages(store)
    next(begun)
    with store.reading() as connection:
        activity = text("SELECT query FROM pg_stat_activity WHERE datname = current_database()")
        queries = connection.execute(activity).scalars().all()
    begun.close()
    assert any(query.startswith("FETCH") for query in queries), queries
