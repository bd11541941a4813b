"""Which fitted movers are passages: stories told about single movers and pairs of them."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np

from ginnel.passages.explained import Explained
from ginnel.passages.site import NEPERS_PER_DB, Site
from ginnel.passages.stops import STAYS_DB, ends_abruptly, leg_of, near_excess_db, stopped_leg
from ginnel.words import Story

#: Nats that make a passage. Gusts of simulated rain gave up to 117, walkers 10 dB over the noise 124 up.
_LEAST_SCORE = 110.0
#: A credible path: doors, curtains and hands stay below it.
_LEAST_PATH_M = 1.5
_LEAST_VEHICLE_PATH_M = 5.0
#: Where the beam still hears well, for mountings that look past the sensor line.
_WELL_HEARD = -10.0 * NEPERS_PER_DB
#: Two legs are one person turning if the speeds agree and little time lies between.
_SAME_SPEED, _TURN_S = 0.2, 5.0
#: Where a mover turns far from the sensor, both legs end at the same place within this.
_SAME_PLACE_M, _LIKE_LEVEL_DB, _FAR_TURN_S = 2.0, 6.0, 4.0
#: Legs of one who turns may seem to overlap by this much: frames are long.
_MEETING_S = -0.8
#: A bend this strong, against the body's strongest, is an end of it and no mere leftover.
_STRONG_PART = 0.2
#: Score of a piece, against the stronger mover's, below which it is a leftover: any, and a short one.
_FAINT_SHARE, _PIECE_SHARE = 0.12, 0.3
#: Legs and arms: mostly heard and crossing with their body, fainter, and slower or faster than it.
_LIMB_TOGETHER, _LIMB_S, _LIMB_DB, _LIMB_SPEED = 0.6, 1.5, 6.0, 0.25
#: The same mover from behind: crossing at the same place, at the same speed, this much fainter.
_BEHIND_OFFSETS, _BEHIND_DB = 1.0, 6.0
#: Slower than this, both ways at once: someone who stands and sways.
_LOITER_MPS = 0.6
#: Who walks slowly is explained half as well the other way round, who sways nearly as well either way.
_WAYLESS_SHARE = 0.6
#: Less than these nats between both ways: it may as well be the other one.
_UNDECIDED = 25.0


@dataclass(frozen=True, slots=True)
class Told:
    """A mover and its story."""

    one: Explained
    story: Story
    overlapping: bool


def tell(site: Site, movers: list[Explained]) -> list[Told]:
    """Stories of the movers of one stretch, in order of crossing."""
    bodies = _one_for_each_body(site, movers)
    stories = {id(one): _single_story(site, one) for one in bodies}
    for one in bodies:
        if any(_loiter_together(one, other) for other in bodies):
            stories[id(one)] = Story.FIDGET
    going = [one for one in bodies if stories[id(one)] is not Story.FIDGET]
    for first, second in _turning_pairs(site, going) if site.body.may_turn else ():
        stories[id(first)] = stories[id(second)] = Story.TURN_BACK
    return [
        Told(one, stories[id(one)], any(other is not one and _together(one, other) for other in bodies))
        for one in bodies
    ]


def _one_for_each_body(site: Site, movers: list[Explained]) -> list[Explained]:
    """Further bends of a body are merged with its strongest, and leftovers of others left out."""
    merged = [_merged(site, body) for body in _bodies(site, movers)]
    kept: list[Explained] = []
    for one in sorted(merged, key=lambda body: -body.fit.score):
        if not any(_is_leftover(site, one, other) for other in kept):
            kept.append(one)
    return _joined(site, sorted(kept, key=lambda one: one.mover.crossed_s))


def _bodies(site: Site, movers: list[Explained]) -> list[list[Explained]]:
    """Movers of one way whose crossings follow each other as the parts of one body do."""
    bodies: list[list[Explained]] = []
    for one in sorted(movers, key=lambda mover: (mover.mover.sign, mover.mover.crossed_s)):
        body = bodies[-1] if bodies and bodies[-1][0].mover.sign == one.mover.sign else None
        if body is not None and _is_part(site, one, body):
            body.append(one)
        else:
            bodies.append([one])
    return bodies


def _is_part(site: Site, one: Explained, body: list[Explained]) -> bool:
    strongest = max([one, *body], key=lambda part: part.fit.score)
    speed_mps = strongest.mover.speed_mps
    behind_last_m = (one.mover.crossed_s - body[-1].mover.crossed_s) * speed_mps
    behind_first_m = (one.mover.crossed_s - body[0].mover.crossed_s) * speed_mps
    return behind_last_m < site.body.same_within_m and behind_first_m < site.body.longest_m


def _merged(site: Site, body: list[Explained]) -> Explained:
    """The strongest part of a body; it crosses midway between its first and its last strong bend."""
    main = max(body, key=lambda part: part.fit.score)
    bends = [
        one.mover.crossed_s
        for one in body
        if one.fit.score > _STRONG_PART * main.fit.score
        and one.near_m <= site.body.bend_ratio * site.offset_m
    ]
    crossed_s = (min(bends) + max(bends)) / 2 if bends else main.mover.crossed_s
    mover = replace(main.mover, crossed_s=crossed_s)
    return replace(
        main,
        fit=replace(main.fit, mover=mover),
        first_frame=min(one.first_frame for one in body),
        last_frame=max(one.last_frame for one in body),
        near_m=min(one.near_m for one in body),
        far_m=max(one.far_m for one in body),
    )


def _is_leftover(site: Site, weak: Explained, strong: Explained) -> bool:
    """A short or faint piece that is only heard while a much stronger mover is."""
    path_m = weak.far_m - weak.near_m
    inside = strong.first_frame - 5 <= weak.first_frame and weak.last_frame <= strong.last_frame + 5
    if _is_limb(weak, strong) or _is_behind(site, weak, strong):
        return True
    share = weak.fit.score / strong.fit.score
    return inside and (share < _FAINT_SHARE or (share < _PIECE_SHARE and path_m < 2 * _least_path_m(site)))


def _is_limb(weak: Explained, strong: Explained) -> bool:
    """Whether a faint mover goes the same way at the same time as a strong one, but not at its speed."""
    together = min(weak.last_frame, strong.last_frame) - max(weak.first_frame, strong.first_frame)
    return (
        weak.mover.sign == strong.mover.sign
        and together > _LIMB_TOGETHER * (weak.last_frame - weak.first_frame)
        and abs(weak.mover.crossed_s - strong.mover.crossed_s) < _LIMB_S
        and weak.snr_db < strong.snr_db - _LIMB_DB
        and abs(math.log(weak.mean_speed_mps / strong.mean_speed_mps)) > _LIMB_SPEED
    )


def _is_behind(site: Site, weak: Explained, strong: Explained) -> bool:
    """Whether a faint mover is a strong one as the back of the beam hears it, going the other way."""
    apart_m = abs(weak.mover.crossed_s - strong.mover.crossed_s) * strong.mover.speed_mps
    return (
        weak.mover.sign != strong.mover.sign
        and apart_m < _BEHIND_OFFSETS * site.offset_m + site.body.length_m
        and weak.snr_db < strong.snr_db - _BEHIND_DB
        and abs(math.log(weak.mean_speed_mps / strong.mean_speed_mps)) < _SAME_SPEED
    )


def _joined(site: Site, movers: list[Explained]) -> list[Explained]:
    """Someone who stops and goes on is one: join two legs of one way that meet."""
    out: list[Explained] = []
    for one in movers:
        stopped = stopped_leg(site, [leg_of(0, other) for other in out], leg_of(0, one))
        earlier = next((other for i, other in enumerate(out) if i == stopped or _goes_on(other, one)), None)
        if earlier is None:
            out.append(one)
            continue
        # who approaches crosses in the last leg, who leaves in the first
        is_last = one.mover.sign > 0 and one.fit.score > _PIECE_SHARE * earlier.fit.score
        main, part = (one, earlier) if is_last else (earlier, one)
        out[out.index(earlier)] = replace(
            main,
            first_frame=min(main.first_frame, part.first_frame),
            last_frame=max(main.last_frame, part.last_frame),
            far_m=max(main.far_m, part.far_m),
        )
    return out


def _goes_on(earlier: Explained, later: Explained) -> bool:
    if earlier.mover.sign != later.mover.sign or earlier.last_frame > later.first_frame:
        return False
    if earlier.mover.sign > 0:
        return abs(earlier.near_m - later.far_m) < _SAME_PLACE_M and earlier.near_m > later.near_m + 1.0
    return abs(earlier.far_m - later.near_m) < _SAME_PLACE_M and later.far_m > earlier.far_m + 1.0


def _single_story(site: Site, one: Explained) -> Story:
    if one.fit.score < _LEAST_SCORE or one.far_m - one.near_m < _least_path_m(site) or _sways(one):
        return Story.FIDGET
    if one.near_m > _line_reach_m(site):
        return Story.TURN_BACK
    return Story.PASSAGE


def _sways(one: Explained) -> bool:
    """Whether a slow line does not tell its way: somebody stands there and moves about."""
    return one.mover.speed_mps < _LOITER_MPS and one.rival_score > _WAYLESS_SHARE * one.fit.score


def _least_path_m(site: Site) -> float:
    return _LEAST_VEHICLE_PATH_M if site.body.length_m > 1 else _LEAST_PATH_M


def _line_reach_m(site: Site) -> float:
    """How near to the sensor line a passage must have been heard."""
    x = np.linspace(0.1, 20.0, 200)
    well_heard = x[site.nominal_level(x) > _WELL_HEARD]
    nearest_m = float(well_heard.min()) if len(well_heard) else 0.0
    return max(site.offset_m, 1.5 * nearest_m)


def _together(one: Explained, other: Explained) -> bool:
    return one.first_frame <= other.last_frame and other.first_frame <= one.last_frame


def _loiter_together(one: Explained, other: Explained) -> bool:
    slow = max(one.mover.speed_mps, other.mover.speed_mps) < _LOITER_MPS
    return slow and one.mover.sign != other.mover.sign and _together(one, other)


def _turning_pairs(site: Site, movers: list[Explained]) -> list[tuple[Explained, Explained]]:
    """Pairs that are the two legs of one who turns, as many as possible, none in two pairs.

    Legs follow each other in time, so that pairing from the front leaves the fewest alone.
    """
    pairs: list[tuple[Explained, Explained]] = []
    left = sorted(movers, key=lambda one: one.first_frame)
    while left:
        first = left.pop(0)
        second = next((one for one in left if _turns(site, first, one)), None)
        if second is not None:
            left.remove(second)
            pairs.append((first, second))
    return pairs


def _turns(site: Site, first: Explained, second: Explained) -> bool:
    """Whether two movers are the two legs of one that turns, near the sensor or far from it."""
    a, b = first.mover, second.mover
    is_undecided = second.fit.score - second.rival_score < _UNDECIDED
    if a.sign == b.sign and not is_undecided:
        return False
    if abs(np.log(first.mean_speed_mps / second.mean_speed_mps)) > _SAME_SPEED:
        return False
    between_s = (second.first_frame - first.last_frame) / site.frame_rate_hz
    if a.sign > 0:  # the second leg of one who turned before the sensor line may show no bend
        stays_db = 0.5 * (near_excess_db(first) + near_excess_db(second))
        is_like = is_undecided or second.near_m > _line_reach_m(site) or stays_db > STAYS_DB
        return is_like and _MEETING_S < between_s < _TURN_S
    meets = abs(first.far_m - second.far_m) < _SAME_PLACE_M and _MEETING_S < between_s < _FAR_TURN_S
    is_like = _levels_apart_db(first, second) < _LIKE_LEVEL_DB
    return meets and is_like and ends_abruptly(first) and ends_abruptly(second)


def _levels_apart_db(first: Explained, second: Explained) -> float:
    """Difference of two movers' levels, dB, over the zones in which both were heard."""
    shared = np.minimum(np.maximum(first.zone_gain, 0), np.maximum(second.zone_gain, 0))
    if shared.sum() <= 0:
        return math.inf
    apart = float(shared @ (first.mover.level - second.mover.level)) / float(shared.sum())
    return abs(apart) / float(NEPERS_PER_DB)
