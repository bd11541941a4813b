"""The scoreboard's own arithmetic, against cases worked by hand; a scoreboard that is wrong helps nobody."""

from __future__ import annotations

from functools import partial

import numpy as np
import pytest
from tests.accuracy import people, places
from tests.accuracy.board import ROWS, at_most, false_rate, share, table
from tests.accuracy.calibration import direction_bins, standard_scores
from tests.accuracy.cases import Case
from tests.accuracy.hardness import Hardened
from tests.accuracy.scoring import Outcome, compare, match

from ginnel import sim
from ginnel.words import US_PER_S, Direction, Passage, Story

TOWARDS, AWAY = Direction.APPROACHING, Direction.RECEDING


def found(
    at_s: float, direction: Direction = TOWARDS, speed_mps: float = 1.3, confidence: float = 0.9
) -> Passage:
    return Passage(
        started_us=round((at_s - 8.0) * US_PER_S),
        crossed_us=round(at_s * US_PER_S),
        ended_us=round(at_s * US_PER_S),
        direction=direction,
        direction_confidence=confidence,
        speed_mps=speed_mps,
        speed_se_mps=0.05,
        snr_db=20.0,
    )


def case_of(*movers: sim.Mover, learnt_s: float = 0.0) -> Case:
    return places.corridor_case(movers, 120.0, seed=0, learnt_s=learnt_s)


def walks_at(crossed_s: float, direction: Direction = TOWARDS) -> sim.Mover:
    return sim.walker(crossed_s=crossed_s, speed_mps=1.3, direction=direction)


def test_as_many_pairs_as_can_be_and_each_once() -> None:
    # 10 could take 12, but then 14.5 has nobody within 3 s.
    pairs = match(np.array([10.0, 14.5]), np.array([12.0, 7.5]), [TOWARDS, TOWARDS], [TOWARDS, TOWARDS])
    assert pairs == {0: 1, 1: 0}


def test_nothing_is_a_pair_beyond_three_seconds() -> None:
    assert match(np.array([10.0]), np.array([13.1]), [TOWARDS], [TOWARDS]) == {}


def test_of_two_who_cross_each_other_each_gets_the_passage_of_its_way() -> None:
    assert match(np.array([10.0, 10.2]), np.array([10.0, 10.2]), [TOWARDS, AWAY], [AWAY, TOWARDS]) == {
        0: 1,
        1: 0,
    }


def test_a_case_is_counted_out_by_hand() -> None:
    case = case_of(walks_at(30.0), walks_at(60.0, AWAY), walks_at(90.0))
    outcome = compare(
        case, [found(30.5), found(32.0), found(61.0, TOWARDS, 1.43), found(110.0, AWAY, confidence=0.6)]
    )
    assert (outcome.n_true, outcome.n_found, len(outcome.pairs)) == (3, 4, 2)
    assert outcome.missed_s == pytest.approx([90.0])
    assert outcome.false_s == pytest.approx([32.0, 110.0])
    assert outcome.n_doubles == 1
    assert outcome.directions() == (1, 1, 0)
    assert outcome.speed_errors_percent() == pytest.approx([0.0, 10.0])
    assert standard_scores(outcome.pairs) == pytest.approx([0.0, 2.6])
    assert [(one.n, one.right) for one in direction_bins(outcome.pairs)] == [
        (0, 0),
        (0, 0),
        (2, 1),
        (0, 0),
        (0, 0),
    ]


def test_what_crosses_while_the_site_is_learnt_is_neither_found_nor_missed_nor_false() -> None:
    outcome = compare(case_of(walks_at(30.0), walks_at(60.0), learnt_s=45.0), [found(60.0), found(33.5)])
    assert (len(outcome.pairs), outcome.missed_s, outcome.false_s) == (1, (), ())
    assert outcome.listened_s == pytest.approx(120.0 + places.EDGE_S - 45.0)


def test_who_walks_through_a_hole_need_not_be_found() -> None:
    case = case_of(walks_at(30.0), walks_at(60.0))
    holed = Case(scene=case.scene, told=case.told, holes_s=((55.0, 75.0),))
    assert compare(holed, [found(30.0)]).missed_s == ()
    assert compare(holed, []).missed_s == pytest.approx([30.0])


def test_a_turn_back_that_is_counted_is_false_one_that_is_logged_is_not() -> None:
    case = case_of(sim.turner(started_s=30.0))
    counted = found(40.0)
    logged = Passage(
        **{name: getattr(counted, name) for name in counted.__slots__} | {"story": Story.TURN_BACK}
    )
    assert compare(case, [counted]).n_others_counted == 1
    assert compare(case, [logged]).n_others_counted == 0
    assert compare(case, [logged]).n_others == 1


def test_outcomes_add_up() -> None:
    one = compare(case_of(walks_at(30.0)), [found(30.0)])
    both = one + compare(case_of(walks_at(30.0)), [])
    assert (both.n_true, len(both.pairs), both.missed_s) == (2, 1, (30.0,))
    assert one + Outcome() == one


def test_a_verdict_is_sure_only_if_the_interval_excludes_the_other() -> None:
    # Wilson at 95 %: 20 of 20 gives 0.839 to 1 (Brown, Cai, DasGupta 2001, formula 4, by hand).
    assert str(share(20, 20, 0.99)).endswith("met?")
    assert str(share(20, 20, 0.83)).endswith(" met")
    assert str(share(10, 20, 0.99)).endswith("**missed**")
    assert str(at_most(-3.0, 2.0)).endswith("**missed**")
    # No event in n hours: below 3 / n an hour at 95 %. 72 hours exclude one a day, 71 do not.
    assert str(false_rate(Outcome(listened_s=72 * 3600.0), 1.0)).endswith(" met")
    assert str(false_rate(Outcome(listened_s=71 * 3600.0), 1.0)).endswith("met?")


def test_every_row_has_its_own_title_and_a_line_in_the_table() -> None:
    titles = [row.title for row in ROWS]
    assert len(set(titles)) == len(titles)
    lines = table([(row, Outcome()) for row in ROWS]).splitlines()
    assert len({line.count(" | ") for line in lines[1:]} | {lines[0].count(" | ")}) == 1


def test_a_hard_scene_differs_from_what_is_told_and_comes_from_its_seed() -> None:
    make = Hardened(partial(people.singles, snr_db=(20.0, 20.0), n=2))
    one, again, other = make(1), make(1), make(2)
    told, true = one.told.mounting, one.scene.sensor.mounting
    assert told.height_m != true.height_m
    assert told.offset_m != true.offset_m
    assert told.tilt_deg != true.tilt_deg
    assert abs(one.scene.sensor.carrier_hz / one.told.carrier_hz - 1) <= 25e6 / 10.525e9
    samples = [next(case.scene.blocks(20_000)) for case in (one, again, other)]
    assert np.array_equal(samples[0], samples[1])
    assert not np.array_equal(samples[0], samples[2])
