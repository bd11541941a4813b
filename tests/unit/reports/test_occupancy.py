"""Time occupied in the beam, and number inside a space: small logs reckoned by hand."""

from __future__ import annotations

import pytest
from tests.unit.reports.invented import (
    DUBLIN,
    HOUR,
    MINUTE,
    NORTH,
    SOUTH,
    A,
    R,
    S,
    U,
    at,
    heard,
    passed,
    spread,
)

from ginnel.reports import Every, inside, occupancy
from ginnel.store import Store
from ginnel.words import Door, Space, Story

NINE = at(2026, 3, 2, 9)
DAY = at(2026, 3, 2, 0)
SURE = {"recall": 1.0, "recall_se": 0.0, "direction_error": 0.0}


def test_two_at_once_occupy_the_beam_once(store: Store) -> None:
    together = [
        passed(NINE + 10 * MINUTE, stay_s=60),
        passed(NINE + 10 * MINUTE + 30 * S, R, stay_s=60),  # 30 s of it with the first
        passed(NINE + 20 * MINUTE, stay_s=6, story=Story.FIDGET),  # in the beam all the same
    ]
    heard(store, NORTH, NINE, NINE + 30 * MINUTE, together)
    first, second = occupancy(store, None, NINE, NINE + 2 * HOUR)
    assert first.occupied_s == pytest.approx(96)
    assert first.occupancy == pytest.approx(96 / 1800)  # of the time listened
    assert (first.coverage, first.listened_s) == (0.5, 1800)
    assert (second.occupied_s, second.occupancy, second.coverage) == (None, None, 0)


def test_a_presence_over_the_edge_is_shared_out(store: Store) -> None:
    heard(store, NORTH, NINE, NINE + 2 * HOUR, [passed(NINE + HOUR, stay_s=600)])
    rows = occupancy(store, None, NINE, NINE + 2 * HOUR)
    assert [row.occupied_s for row in rows] == [300, 300]


def test_a_crowd_never_occupies_more_than_all_of_the_time(store: Store) -> None:
    crowd = [passed(NINE + i * 5 * S, stay_s=240) for i in range(24, 696)]
    heard(store, NORTH, NINE, NINE + HOUR, crowd)
    (row,) = occupancy(store)
    assert row.occupancy is not None
    assert 0.99 < row.occupancy <= 1


def space(**error: float) -> Space:
    doors = (
        Door(sensor="north", entering=A, **error),
        Door(sensor="south", entering=R, **error),
    )
    return Space(name="north wing", empty_at_min=4 * 60, doors=doors)


def test_two_doors_bound_one_space(store: Store) -> None:
    heard(store, NORTH, DAY, DAY + 24 * HOUR, spread(NINE, NINE + HOUR, 30, (A,)))
    heard(store, SOUTH, DAY, DAY + 24 * HOUR, spread(NINE + HOUR, NINE + 2 * HOUR, 12, (A, R, A)))
    rows = inside(store, space(**SURE), NINE, NINE + 3 * HOUR, Every.HOUR, DUBLIN)
    # 30 in at the north door by ten; then 4 in and 8 out at the south one, where receding leads in
    assert [(row.entered, row.left, row.inside) for row in rows] == [(30, 0, 30), (34, 8, 26), (34, 8, 26)]
    assert {row.reset_us for row in rows} == {at(2026, 3, 2, 4)}
    assert all((row.low, row.high, row.caution) == (row.inside, row.inside, "") for row in rows)


def test_counting_starts_again_when_the_space_is_known_to_be_empty(store: Store) -> None:
    heard(store, NORTH, DAY, DAY + 24 * HOUR, [passed(DAY + 3 * HOUR), passed(DAY + 5 * HOUR)])
    heard(store, SOUTH, DAY, DAY + 24 * HOUR)
    heard(store, NORTH, DAY - 20 * HOUR, DAY)
    heard(store, SOUTH, DAY - 20 * HOUR, DAY)
    rows = inside(store, space(**SURE), DAY + 2 * HOUR, DAY + 6 * HOUR, Every.HOUR, DUBLIN)
    # what was left at the reset is still told: the drift of a day
    assert [row.inside for row in rows] == [0, 1, 0, 1]
    assert rows[1].reset_us == at(2026, 3, 1, 4)
    assert rows[2].reset_us == at(2026, 3, 2, 4)


def test_uncertainty_grows_with_the_flow_and_a_warning_comes_when_it_exceeds_the_answer(store: Store) -> None:
    day = [*spread(NINE, NINE + 3 * HOUR, 600, (A,)), *spread(NINE + 4 * HOUR, NINE + 7 * HOUR, 590, (R,))]
    heard(store, NORTH, DAY, DAY + 24 * HOUR, day)
    heard(store, SOUTH, DAY, DAY + 24 * HOUR)
    rows = inside(store, space(), NINE, NINE + 8 * HOUR, Every.HOUR, DUBLIN)
    widths = [row.high - row.low for row in rows if row.high is not None and row.low is not None]
    assert widths[0] < widths[2]
    noon = rows[2]
    assert noon.inside == pytest.approx(
        600 / 0.95, rel=0.001
    )  # nobody was counted out, so nobody was turned round
    assert noon.caution == ""
    evening = rows[-1]
    assert evening.inside is not None
    assert evening.high is not None
    assert evening.low == 0
    assert evening.high - evening.inside > evening.inside
    assert "larger than the number itself" in evening.caution


def test_more_out_than_in_says_so(store: Store) -> None:
    heard(store, NORTH, DAY, DAY + 24 * HOUR, spread(NINE, NINE + HOUR, 20, (R,)))
    heard(store, SOUTH, DAY, DAY + 24 * HOUR)
    *_, row = inside(store, space(**SURE), NINE, NINE + HOUR, Every.HOUR, DUBLIN)
    assert (row.inside, row.low, row.high) == (0, 0, 0)
    assert "more were counted out than in" in row.caution


def test_time_unheard_widens_the_limits_and_a_door_never_heard_has_no_answer(store: Store) -> None:
    heard(store, NORTH, at(2026, 3, 2, 4), NINE + HOUR, spread(NINE, NINE + HOUR, 30, (A,)))
    heard(store, SOUTH, NINE, NINE + HOUR, spread(NINE, NINE + HOUR, 10, (R, A)))
    rows = inside(store, space(**SURE), NINE - HOUR, NINE + HOUR, Every.HOUR, DUBLIN)
    before, after = rows
    assert (before.inside, before.low, before.caution) == (
        None,
        None,
        "a door was not listened to since the space was last empty",
    )
    # south was heard for one of six hours and saw 10: 5 times 11 more may have passed, all one way
    assert after.inside == 30
    assert after.low == 0
    assert after.high == pytest.approx(30 + 55)


def test_passages_of_unknown_direction_widen_the_limits(store: Store) -> None:
    heard(store, NORTH, DAY, DAY + 24 * HOUR, spread(NINE, NINE + HOUR, 40, (A, A, A, U)))
    heard(store, SOUTH, DAY, DAY + 24 * HOUR)
    (row,) = inside(store, space(**SURE), NINE, NINE + HOUR, Every.HOUR, DUBLIN)
    assert (row.inside, row.unknown) == (30, 10)
    # ten times one more or one less: standard deviation sqrt(10)
    assert row.high == pytest.approx(30 + 1.96 * 10**0.5, abs=0.01)


def test_the_reset_follows_the_sites_clock(store: Store) -> None:
    """29 March 2026 in Dublin: 4 o'clock summer time is 3 o'clock UTC."""
    day = at(2026, 3, 29, 0)
    heard(store, NORTH, day - 24 * HOUR, day + 24 * HOUR)
    heard(store, SOUTH, day - 24 * HOUR, day + 24 * HOUR)
    rows = inside(store, space(**SURE), day, day + 8 * HOUR, Every.HOUR, DUBLIN)
    assert rows[-1].reset_us == day + 3 * HOUR
    assert rows[0].reset_us == at(2026, 3, 28, 4)
