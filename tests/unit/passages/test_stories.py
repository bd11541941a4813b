"""Stories: passages, turn-backs, fidgeting, stop and go, one body for several bends.

Movers are made up with just what tells a story; frames are of 1/20 s or so.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from ginnel.doppler.frames import plan_frames
from ginnel.passages.explained import Explained
from ginnel.passages.fit import Fit
from ginnel.passages.mover import Mover
from ginnel.passages.site import N_ZONES, NEPERS_PER_DB, Site
from ginnel.passages.stories import Told, tell
from ginnel.words import Mounting, Sensor, Story

FEET = Sensor(name="s", mounting=Mounting(height_m=2.4, tilt_deg=15.0))
ROAD = Sensor(
    name="r",
    carrier_hz=24.125e9,
    min_speed_mps=2.0,
    max_speed_mps=30.0,
    mounting=Mounting(height_m=1.0, offset_m=4.0),
)
PATH = Site(FEET, plan_frames(FEET, 8000.0))
STREET = Site(ROAD, plan_frames(ROAD, 44100.0))


def leg(
    crossed_s: float,
    *,
    sign: int = 1,
    speed_mps: float = 1.3,
    near_m: float = 0.2,
    far_m: float = 8.0,
    score: float = 300.0,
    level_db: float = 20.0,
    near_excess_db: float = 0.0,
    lost_far: float = 0.0,
    site: Site = PATH,
) -> Explained:
    """A mover heard from ``far_m`` to ``near_m`` (approaching) or back."""
    level_by_zone_db = np.full(N_ZONES, level_db)
    level_by_zone_db[0] += near_excess_db
    mover = Mover(
        crossed_s=crossed_s,
        speed_mps=speed_mps,
        sign=sign,
        offset_m=site.offset_m,
        level=level_by_zone_db * NEPERS_PER_DB,
    )
    ends_s = sorted((crossed_s - sign * far_m / speed_mps, crossed_s - sign * near_m / speed_mps))
    return Explained(
        fit=Fit(mover, score, np.eye(3 + 2 * N_ZONES) * 1e-4),
        rival_score=score - 200.0,
        first_frame=round(ends_s[0] * site.frame_rate_hz),
        last_frame=round(ends_s[1] * site.frame_rate_hz),
        near_m=near_m,
        far_m=far_m,
        lost_near=0.0,
        lost_far=lost_far,
        snr_db=15.0,
        mean_speed_mps=speed_mps,
        zone_gain=np.full(N_ZONES, score / N_ZONES),
        claim=np.zeros((1, 1)),
    )


def stories(told: list[Told]) -> list[Story]:
    return [one.story for one in told]


@pytest.mark.parametrize("sign", [1, -1])
def test_who_walks_through_is_a_passage(sign: int) -> None:
    (told,) = tell(PATH, [leg(20.0, sign=sign)])
    assert told.story is Story.PASSAGE
    assert not told.overlapping


def test_nobody_is_nothing() -> None:
    assert tell(PATH, []) == []


def test_who_covers_less_than_a_metre_and_a_half_fidgets() -> None:
    assert stories(tell(PATH, [leg(20.0, near_m=0.3, far_m=1.7)])) == [Story.FIDGET]
    assert stories(tell(PATH, [leg(20.0, near_m=0.3, far_m=1.9)])) == [Story.PASSAGE]


def test_who_was_never_heard_near_the_sensor_is_no_passage() -> None:
    assert stories(tell(PATH, [leg(20.0, near_m=4.0, far_m=9.0)])) == [Story.TURN_BACK]


def test_who_nears_and_then_leaves_alike_has_turned_back() -> None:
    # Crossing at 20 s in appearance, turned 1 m before the sensor line, in full view, and away again.
    found = tell(PATH, [leg(20.0, near_excess_db=5.0), leg(20.5, sign=-1, near_excess_db=5.0)])
    assert stories(found) == [Story.TURN_BACK, Story.TURN_BACK]


def test_who_leaves_again_without_having_come_near_has_turned_back() -> None:
    found = tell(PATH, [leg(20.0), leg(17.5, sign=-1, near_m=4.0, far_m=9.0)])
    assert stories(found) == [Story.TURN_BACK, Story.TURN_BACK]


def test_two_who_meet_beside_the_sensor_are_two_passages() -> None:
    # Both leave the beam there, however alike they are.
    assert stories(tell(PATH, [leg(20.0), leg(20.5, sign=-1)])) == [Story.PASSAGE] * 2
    faster = leg(20.5, sign=-1, speed_mps=1.8, near_excess_db=5.0)
    assert stories(tell(PATH, [leg(20.0, near_excess_db=5.0), faster])) == [Story.PASSAGE] * 2


def test_two_who_go_one_way_one_after_the_other_are_two_passages() -> None:
    first, second = leg(20.0), leg(27.5)
    assert 0 < second.first_frame - first.last_frame < 5 * PATH.frame_rate_hz
    assert stories(tell(PATH, [first, second])) == [Story.PASSAGE] * 2


def test_who_comes_back_after_ten_seconds_is_two_passages() -> None:
    assert stories(tell(PATH, [leg(20.0), leg(30.5, sign=-1)])) == [Story.PASSAGE] * 2


def test_a_turn_back_leaves_the_next_walker_alone() -> None:
    found = tell(
        PATH,
        [
            leg(20.0, near_excess_db=5.0),
            leg(20.5, sign=-1, near_excess_db=5.0),
            leg(45.0, sign=-1, level_db=14.0),
        ],
    )
    assert stories(found) == [Story.TURN_BACK, Story.TURN_BACK, Story.PASSAGE]


def test_who_stops_on_the_way_and_goes_on_is_one() -> None:
    # From 9 m to 5 m, a halt, and from 5 m through.
    first = leg(20.0, near_m=5.0, far_m=9.0)
    second = leg(26.0, near_m=0.2, far_m=5.0)
    assert first.last_frame < second.first_frame
    (told,) = tell(PATH, [first, second])
    assert told.story is Story.PASSAGE
    assert told.one.mover.crossed_s == 26.0
    assert (told.one.first_frame, told.one.last_frame) == (first.first_frame, second.last_frame)


def test_who_brakes_stops_and_goes_on_is_one_though_braking_looks_like_a_bend() -> None:
    # The first leg seems to cross at the stop, 5 m before the sensor; the second comes up out of nothing.
    first = leg(20.0, near_excess_db=5.0)
    second = leg(30.0, far_m=5.0, lost_far=-80.0)
    (told,) = tell(PATH, [first, second])
    assert (told.story, told.one.mover.crossed_s) == (Story.PASSAGE, 30.0)


def test_who_stops_on_the_way_out_crossed_before_the_stop() -> None:
    first = leg(20.0, sign=-1, far_m=6.0, lost_far=-80.0)
    second = leg(30.0, sign=-1, level_db=12.0)
    (told,) = tell(PATH, [first, second])
    assert (told.story, told.one.mover.crossed_s) == (Story.PASSAGE, 20.0)


def test_who_vanishes_is_not_continued_by_the_next_who_passes() -> None:
    found = tell(PATH, [leg(20.0, sign=-1, far_m=6.0, lost_far=-80.0), leg(30.0, sign=-1)])
    assert stories(found) == [Story.PASSAGE] * 2


def test_who_sways_slowly_either_way_fidgets_and_who_walks_slowly_passes() -> None:
    slow = leg(20.0, speed_mps=0.4)
    assert stories(tell(PATH, [replace(slow, rival_score=0.8 * slow.fit.score)])) == [Story.FIDGET]
    assert stories(tell(PATH, [replace(slow, rival_score=0.5 * slow.fit.score)])) == [Story.PASSAGE]


def test_who_follows_at_two_seconds_is_another() -> None:
    found = tell(PATH, [leg(20.0), leg(22.0)])
    assert stories(found) == [Story.PASSAGE] * 2
    assert all(told.overlapping for told in found)


def test_two_bends_within_half_a_metre_are_one_body() -> None:
    (told,) = tell(PATH, [leg(20.0), leg(20.3, score=200.0)])
    assert told.one.mover.crossed_s == pytest.approx(20.15)  # midway between two strong bends


def test_front_and_rear_of_a_bus_are_one_vehicle() -> None:
    # 10 m at 12 m/s.
    front = leg(20.0, speed_mps=12.0, far_m=60.0, near_m=0.5, site=STREET)
    rear = leg(20.83, speed_mps=12.0, far_m=60.0, near_m=0.5, score=250.0, site=STREET)
    (told,) = tell(STREET, [front, rear])
    assert told.one.mover.crossed_s == pytest.approx(20.4, abs=0.05)


def test_two_cars_two_seconds_apart_are_two() -> None:
    cars = [leg(t, speed_mps=12.0, far_m=60.0, near_m=0.5, site=STREET) for t in (20.0, 22.0)]
    assert stories(tell(STREET, cars)) == [Story.PASSAGE] * 2


def test_vehicles_one_each_way_are_two_whatever_the_time_between() -> None:
    cars = [
        leg(20.0, speed_mps=12.0, far_m=60.0, site=STREET),
        leg(20.1, sign=-1, speed_mps=9.0, far_m=60.0, site=STREET),
    ]
    assert len(tell(STREET, cars)) == 2


def test_faint_leftovers_of_a_strong_mover_are_left_out() -> None:
    strong = leg(20.0, score=2000.0)
    leftover = leg(18.5, speed_mps=0.8, near_m=0.5, far_m=2.5, score=60.0)
    assert strong.first_frame < leftover.first_frame
    assert len(tell(PATH, [strong, leftover])) == 1
    # The same piece on its own is somebody.
    assert len(tell(PATH, [leftover])) == 1


def test_who_sways_both_ways_at_once_fidgets() -> None:
    swaying = [leg(20.0, speed_mps=0.4, far_m=2.5), leg(19.0, sign=-1, speed_mps=0.45, far_m=2.5)]
    assert set(stories(tell(PATH, swaying))) == {Story.FIDGET}


def test_stories_come_in_order_of_crossing_and_do_not_depend_on_the_order_asked() -> None:
    movers = [leg(30.0), leg(10.0, speed_mps=1.0), leg(20.0, sign=-1, level_db=12.0)]
    found = tell(PATH, movers)
    assert [told.one.mover.crossed_s for told in found] == [10.0, 20.0, 30.0]
    again = tell(PATH, [replace(one) for one in reversed(movers)])
    assert stories(again) == stories(found)
