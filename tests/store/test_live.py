"""Live listening in the log: spans that grow, and spans that are given another date; on both databases."""

from __future__ import annotations

from dataclasses import replace

import pytest
from sqlalchemy import text
from tests.store.test_log import NORTH, S, logged, passage, span, stored_spans

from ginnel.errors import SpanRefusedError
from ginnel.store import (
    SpanChange,
    Store,
    extend_span,
    iter_passages,
    listened_until_us,
    record_span,
    redate_span,
    spans,
)
from ginnel.words import Passage, Sensor

HOUR_US = 3600 * S


def test_live_listening_extends_its_span(store: Store) -> None:
    assert extend_span(store, NORTH, span(0, 10), [], "1") == SpanChange()
    assert extend_span(store, NORTH, span(0, 20), [passage(10)], "1") == SpanChange(added=1)
    both = extend_span(store, NORTH, span(0, 30), [passage(10), passage(25)], "1")
    assert both == SpanChange(added=1, kept=1)
    assert extend_span(store, NORTH, span(0, 20), [], "1") == SpanChange()  # late news: the end stays
    assert stored_spans(store) == [(0, 30, "1")]
    assert logged(store) == [passage(10), passage(25)]
    # replay of the whole finds the same and changes nothing
    assert record_span(store, NORTH, span(0, 30), [passage(10), passage(25)], "1").already_stored


def test_live_listening_may_not_run_into_another_span(store: Store) -> None:
    record_span(store, NORTH, span(20, 60), [], "1")
    with pytest.raises(SpanRefusedError, match="overlaps a part"):
        extend_span(store, NORTH, span(0, 21), [passage(10)], "1")
    with pytest.raises(SpanRefusedError, match="overlaps a part"):
        extend_span(store, NORTH, span(20, 61), [], "2")
    assert logged(store) == []


def column(store: Store, name: str) -> list[object]:
    with store.reading() as connection:
        return list(connection.execute(text(f"SELECT {name} FROM span ORDER BY started_us")).scalars())


def test_what_was_dropped_and_how_the_clocks_drifted_is_kept_as_last_told(store: Store) -> None:
    extend_span(store, NORTH, span(0, 10), [], "1", dropped_samples=800)
    extend_span(store, NORTH, span(0, 20), [], "1", drift_ppm=-31.5, dropped_samples=900)
    extend_span(store, NORTH, span(0, 15), [], "1", drift_ppm=0.0)  # late news
    assert column(store, "drift_ppm") == [-31.5]
    assert column(store, "dropped_samples") == [900]


def test_listened_until_is_the_end_of_the_sensors_own_last_span(store: Store) -> None:
    assert listened_until_us(store, NORTH.name) is None
    record_span(store, NORTH, span(0, 60), [], "1")
    record_span(store, NORTH, span(100, 160), [], "1")
    record_span(store, Sensor(name="other"), span(0, 900), [], "1")
    extend_span(store, NORTH, replace(span(9000, 9060), clock_trusted=False), [], "1")  # who knows when
    assert listened_until_us(store, NORTH.name) == span(100, 160).ended_us


def shifted(one: Passage, by_us: int) -> Passage:
    return replace(
        one,
        started_us=one.started_us + by_us,
        crossed_us=one.crossed_us + by_us,
        ended_us=one.ended_us + by_us,
    )


@pytest.mark.parametrize("by_s", [15.0, 7200.0, -30.0])  # 15 s: onto where its neighbours were
def test_a_span_whose_date_was_wrong_moves_with_its_passages_and_is_trusted_then(
    store: Store, by_s: float
) -> None:
    before = [passage(-1000), passage(-985)]
    record_span(store, NORTH, span(-1010, -900), before, "1")
    untrusted = replace(span(0, 60), clock_trusted=False)
    found = [passage(10), passage(25), passage(40)]
    extend_span(store, NORTH, untrusted, found, "1")
    by_us = round(by_s * S)
    new_start_us = untrusted.started_us + by_us
    assert redate_span(store, NORTH.name, untrusted.started_us, new_start_us)
    assert logged(store) == before + [shifted(one, by_us) for one in found]
    moved = spans(store)[1].span
    assert (moved.started_us, moved.ended_us, moved.clock_trusted) == (
        new_start_us,
        untrusted.ended_us + by_us,
        True,
    )
    assert column(store, "redated_by_us") == [None, by_us]
    # again does no harm, and the span goes on growing under its new date
    assert not redate_span(store, NORTH.name, untrusted.started_us, new_start_us)
    grown = replace(moved, ended_us=moved.ended_us + 10 * S)
    assert extend_span(store, NORTH, grown, [shifted(passage(65), by_us)], "1") == SpanChange(added=1)
    assert len(list(iter_passages(store))) == 6
    # nor do both once more, as after a kill between storing and remembering that it was stored
    before_again = logged(store)
    if abs(by_s) < 60:
        with pytest.raises(SpanRefusedError):
            extend_span(store, NORTH, untrusted, found, "1")
    else:
        extend_span(store, NORTH, untrusted, found, "1")
        assert redate_span(store, NORTH.name, untrusted.started_us, new_start_us)
    assert logged(store) == before_again
    assert len(spans(store)) == 2


def test_the_hours_that_a_span_leaves_and_comes_to_are_rolled_up_again(store: Store) -> None:
    extend_span(store, NORTH, span(0, 60), [passage(10)], "1")
    with store.writing() as connection:
        connection.execute(text("DELETE FROM hour_stale"))
    redate_span(store, NORTH.name, span(0, 60).started_us, span(0, 60).started_us + 5 * HOUR_US)
    hour = span(0, 60).started_us // HOUR_US
    with store.reading() as connection:
        marked = connection.execute(text("SELECT hour FROM hour_stale ORDER BY hour")).scalars().all()
    assert marked == [hour, hour + 5]


def test_a_span_is_not_moved_onto_another(store: Store) -> None:
    extend_span(store, NORTH, span(0, 60), [passage(10)], "1")
    record_span(store, NORTH, span(100, 160), [passage(110)], "1")
    with pytest.raises(SpanRefusedError, match="overlaps a part"):
        redate_span(store, NORTH.name, span(0, 60).started_us, span(90, 150).started_us)
    assert stored_spans(store) == [(0, 60, "1"), (100, 160, "1")]
    assert logged(store) == [passage(10), passage(110)]


def test_there_is_nothing_to_move_where_nothing_was_stored(store: Store) -> None:
    assert not redate_span(store, "nobody", 0, 5)
    record_span(store, NORTH, span(0, 60), [], "1")
    assert not redate_span(store, NORTH.name, 0, 5)
