"""What recording spans does: first the rules of `record_span` one by one, then laws."""

from __future__ import annotations

from dataclasses import replace

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from ginnel.errors import StoreError
from ginnel.store import (
    SpanChange,
    Store,
    iter_passages,
    open_store,
    put_sensor,
    put_site,
    record_span,
    sensors,
    site,
    spans,
)
from ginnel.words import Direction, Flag, Mounting, MoverKind, Passage, Sensor, Site, Span, Story

S = 1_000_000
T0 = 1_772_442_000 * S  # 2026-03-02T09:00:00Z
NORTH = Sensor(name="north-corridor")


def passage(at_s: float, **changes: object) -> Passage:
    at_us = T0 + round(at_s * S)
    plain = Passage(
        started_us=at_us - 3 * S,
        crossed_us=at_us,
        ended_us=at_us + S,
        direction=Direction.APPROACHING,
        direction_confidence=0.987654,
        speed_mps=1.341234,
        speed_se_mps=0.012345,
        snr_db=17.125,
        mover=MoverKind.ON_FOOT,
        flags=frozenset({Flag.OVERLAPPING, Flag.CLIPPED}),
    )
    return replace(plain, **changes)  # type: ignore[arg-type] # any field


def span(start_s: float, end_s: float) -> Span:
    return Span(started_us=T0 + round(start_s * S), ended_us=T0 + round(end_s * S), sample_rate_hz=8000.0)


def logged(store: Store, sensor: str | None = None) -> list[Passage]:
    return [one.passage for one in iter_passages(store, sensor, with_uncounted=True)]


def stored_spans(store: Store) -> list[tuple[int, int, str]]:
    return [
        ((one.span.started_us - T0) // S, (one.span.ended_us - T0) // S, one.chain_version)
        for one in spans(store)
    ]


def test_a_recorded_span_reads_back_as_it_was(store: Store) -> None:
    passages = [
        passage(10),
        passage(
            20,
            story=Story.TURN_BACK,
            direction=Direction.UNKNOWN,
            direction_confidence=None,
            speed_mps=None,
            speed_se_mps=None,
            snr_db=-3.5,
            mover=None,
            flags=frozenset(),
        ),
        passage(30, story=Story.FIDGET, direction=Direction.RECEDING, mover=MoverKind.ON_WHEELS),
    ]
    change = record_span(store, NORTH, replace(span(0, 60), clock_trusted=False), passages, "1")
    assert change == SpanChange(added=3)
    assert logged(store) == passages
    (one,) = spans(store)
    assert one.span == replace(span(0, 60), clock_trusted=False)
    assert (one.sensor, one.mounting, one.chain_version) == ("north-corridor", Mounting(), "1")


def test_the_same_span_again_changes_nothing(store: Store) -> None:
    passages = [passage(10), passage(20)]
    record_span(store, NORTH, span(0, 60), passages, "1")
    again = record_span(store, NORTH, span(0, 60), reversed(passages), "1")
    assert again == SpanChange(kept=2, already_stored=True)
    assert logged(store) == passages


def test_the_same_empty_span_again_changes_nothing(store: Store) -> None:
    assert record_span(store, NORTH, span(0, 60), [], "1") == SpanChange()
    assert record_span(store, NORTH, span(0, 60), [], "1") == SpanChange(already_stored=True)
    assert stored_spans(store) == [(0, 60, "1")]


def test_a_span_within_a_longer_one_changes_nothing(store: Store) -> None:
    record_span(store, NORTH, span(0, 60), [passage(10), passage(40)], "1")
    within = record_span(store, NORTH, span(30, 60), [passage(40), passage(50)], "1")
    assert within == SpanChange(kept=1, already_stored=True)
    assert logged(store) == [passage(10), passage(40)]
    assert stored_spans(store) == [(0, 60, "1")]


def test_a_span_that_covers_others_replaces_them(store: Store) -> None:
    record_span(store, NORTH, span(0, 20), [passage(10)], "1")
    record_span(store, NORTH, span(30, 60), [passage(40), passage(50)], "1")
    record_span(store, NORTH, span(100, 120), [passage(110)], "1")
    change = record_span(store, NORTH, span(0, 60), [passage(10), passage(25), passage(50)], "1")
    assert change == SpanChange(added=1, removed=1, kept=2)
    assert logged(store) == [passage(10), passage(25), passage(50), passage(110)]
    assert stored_spans(store) == [(0, 60, "1"), (100, 120, "1")]


@pytest.mark.parametrize(
    ("sensor", "version"),
    [
        (NORTH, "2"),
        (replace(NORTH, mounting=Mounting(height_m=3.0)), "1"),
        (replace(NORTH, carrier_hz=24.125e9), "1"),
    ],
    ids=["version", "mounting", "carrier"],
)
def test_another_reading_replaces_a_spans_passages(store: Store, sensor: Sensor, version: str) -> None:
    record_span(store, NORTH, span(0, 60), [passage(10), passage(40)], "1")
    change = record_span(store, sensor, span(0, 60), [passage(10), passage(45)], version)
    assert change == SpanChange(added=2, removed=2)  # the row at 10 s now names another reading
    assert logged(store) == [passage(10), passage(45)]
    (one,) = spans(store)
    assert (one.mounting, one.chain_version) == (sensor.mounting, version)


def test_new_speed_bands_and_names_do_not_make_another_reading(store: Store) -> None:
    record_span(store, NORTH, span(0, 60), [passage(10)], "1")
    renamed = replace(NORTH, speed_bands_mps=(1.0, 2.0), approaching_name="in", receding_name="out")
    assert record_span(store, renamed, span(0, 60), [passage(10)], "1").already_stored
    assert sensors(store) == [renamed]


@pytest.mark.parametrize(
    ("start_s", "end_s", "version"),
    [(30, 90, "1"), (-30, 30, "1"), (30, 90, "2"), (10, 50, "2")],
    ids=["runs on", "begins before", "runs on, new version", "within, new version"],
)
def test_a_partial_overlap_is_refused_and_changes_nothing(
    store: Store, start_s: int, end_s: int, version: str
) -> None:
    record_span(store, NORTH, span(0, 60), [passage(20)], "1")
    with pytest.raises(
        StoreError, match=r"north-corridor: .* overlaps a part of what is stored, 2026-03-02T09:00"
    ):
        record_span(store, replace(NORTH, carrier_hz=10.587e9), span(start_s, end_s), [], version)
    assert logged(store) == [passage(20)]
    assert stored_spans(store) == [(0, 60, "1")]
    assert sensors(store) == [NORTH]  # the refused sensor's settings went with the rest


def test_spans_that_touch_do_not_overlap(store: Store) -> None:
    record_span(store, NORTH, span(0, 60), [passage(20)], "1")
    record_span(store, NORTH, span(60, 90), [passage(70)], "1")
    record_span(store, NORTH, span(-30, 0), [passage(-10)], "2")
    assert stored_spans(store) == [(-30, 0, "2"), (0, 60, "1"), (60, 90, "1")]
    assert logged(store) == [passage(-10), passage(20), passage(70)]


def test_replacing_a_span_leaves_a_neighbours_crossing_that_lies_in_it(store: Store) -> None:
    # A mover heard before the gap whose crossing is reckoned to lie after it.
    astray = passage(61, started_us=T0 + 55 * S, ended_us=T0 + 60 * S)
    record_span(store, NORTH, span(0, 60), [astray], "1")
    record_span(store, NORTH, span(60, 90), [passage(70)], "1")
    record_span(store, NORTH, span(60, 90), [passage(75)], "2")
    assert logged(store) == [astray, passage(75)]
    assert record_span(store, NORTH, span(0, 60), [astray], "1").already_stored


def test_a_crossing_that_a_neighbour_holds_is_refused(store: Store) -> None:
    astray = passage(61, started_us=T0 + 55 * S, ended_us=T0 + 60 * S)
    record_span(store, NORTH, span(0, 60), [astray], "1")
    with pytest.raises(StoreError, match="in a neighbouring span"):
        record_span(store, NORTH, span(60, 90), [passage(61, started_us=T0 + 60 * S)], "1")
    assert stored_spans(store) == [(0, 60, "1")]


def test_two_movers_that_cross_at_one_instant_are_both_kept(store: Store) -> None:
    twins = [passage(10), passage(10, direction=Direction.RECEDING), passage(10, speed_mps=2.0)]
    assert record_span(store, NORTH, span(0, 60), twins, "1") == SpanChange(added=3)
    assert [one.crossed_us - T0 for one in logged(store)] == [10 * S, 10 * S + 1, 10 * S + 2]
    assert record_span(store, NORTH, span(0, 60), twins[::-1], "1").already_stored


def test_hearing_that_sticks_out_by_rounding_is_cut_to_the_span(store: Store) -> None:
    stuck = passage(2, started_us=T0 - 200, ended_us=T0 + 60 * S + 300)
    record_span(store, NORTH, span(0, 60), [stuck], "1")
    assert logged(store) == [replace(stuck, started_us=T0, ended_us=T0 + 60 * S)]
    assert record_span(store, NORTH, span(0, 60), [stuck], "1").already_stored


@pytest.mark.parametrize(
    "astray",
    [
        passage(70),
        passage(20, started_us=T0 - 2 * S),
        passage(20, crossed_us=T0 + 2000 * S),
        passage(20, ended_us=T0 + 10 * S),
    ],
    ids=["after", "began before", "crosses far away", "ends before it starts"],
)
def test_a_passage_outside_its_span_is_refused(store: Store, astray: Passage) -> None:
    with pytest.raises(StoreError, match=r"north-corridor crossing at .* does not lie in the span"):
        record_span(store, NORTH, span(0, 60), [passage(5), astray], "1")
    assert logged(store) == []
    assert stored_spans(store) == []


def test_a_span_that_ends_before_it_starts_is_refused(store: Store) -> None:
    with pytest.raises(StoreError, match="ends before it starts"):
        record_span(store, NORTH, span(60, 0), [], "1")


def test_sensors_do_not_mind_each_other(store: Store) -> None:
    record_span(store, NORTH, span(0, 60), [passage(10)], "1")
    south = replace(NORTH, name="south-gate")
    assert record_span(store, south, span(30, 90), [passage(40)], "1").added == 1
    assert logged(store, "north-corridor") == [passage(10)]
    assert logged(store, "south-gate") == [passage(40)]


def test_measures_that_are_no_numbers_were_not_measured(store: Store) -> None:
    odd = passage(10, speed_se_mps=float("inf"), snr_db=float("nan"), speed_mps=1e9)
    record_span(store, NORTH, span(0, 60), [odd], "1")
    assert logged(store) == [replace(odd, speed_se_mps=None, snr_db=None, speed_mps=None)]


def test_site_and_sensors_are_known(store: Store) -> None:
    assert site(store) is None
    put_site(store, Site(name="Tannery annex", timezone="Europe/Dublin"))
    put_site(store, Site(name="Tannery", timezone="Europe/Dublin"))
    assert site(store) == Site(name="Tannery", timezone="Europe/Dublin")
    moved = replace(
        NORTH,
        highpass_hz=8.0,
        mounting=Mounting(beam_width_deg=(80.0, 40.0), since_us=T0),
    )
    put_sensor(store, NORTH)
    put_sensor(store, moved)
    put_sensor(store, replace(NORTH, name="annex"))
    assert sensors(store) == [replace(NORTH, name="annex"), moved]
    put_sensor(store, replace(moved, mounting=NORTH.mounting))
    assert sensors(store)[1].mounting == moved.mounting  # the later one holds


def test_a_store_open_for_reading_refuses_to_write(store: Store, store_url: str) -> None:
    record_span(store, NORTH, span(0, 60), [passage(10)], "1")
    with open_store(store_url, read_only=True) as reader:
        assert logged(reader) == [passage(10)]
        with pytest.raises(StoreError, match="open for reading only"):
            record_span(reader, NORTH, span(0, 60), [], "2")


second = st.integers(0, 11)


@settings(max_examples=10, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    steps=st.lists(
        st.tuples(second, second, st.sampled_from("12"), st.sets(second)).filter(lambda s: s[0] < s[1]),
        max_size=8,
    )
)
def test_whatever_is_recorded_spans_stay_disjoint_and_hold_all_passages(
    store: Store, steps: list[tuple[int, int, str, set[int]]]
) -> None:
    """A law over random histories: no time listened is ever lost, no passage is in two spans or none."""
    sensor = Sensor(name=f"sensor-{len(sensors(store))}")  # a sensor of its own for each history
    put_sensor(store, sensor)
    heard: set[int] = set()
    for start, end, version, crossings in steps:
        inside = [
            passage(at + 0.5, started_us=T0 + at * S, ended_us=T0 + (at + 1) * S)
            for at in sorted(crossings)
            if start <= at < end
        ]
        before = logged(store, sensor.name)
        try:
            change = record_span(store, sensor, span(start, end), inside, version)
        except StoreError:
            assert logged(store, sensor.name) == before
            continue
        heard |= set(range(start, end))
        after = logged(store, sensor.name)
        assert len(after) == len(before) + change.added - change.removed
        if not change.already_stored:
            assert [one for one in after if start * S <= one.started_us - T0 < end * S] == inside
        assert record_span(store, sensor, span(start, end), inside, version).already_stored
    kept = [one.span for one in spans(store, sensor.name)]
    seconds = [at for one in kept for at in range((one.started_us - T0) // S, (one.ended_us - T0) // S)]
    assert len(seconds) == len(set(seconds))
    assert set(seconds) == heard
    assert all((one.started_us - T0) // S in heard for one in logged(store, sensor.name))
