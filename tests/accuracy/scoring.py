"""A case through the chain, and what came out of it against the truth: one to one, by time.

A found passage and a true one are a pair if their crossings lie within `WITHIN_S`. Of all pairings the
one with most pairs, and of those the one with the smallest sum of differences in time is taken (an
assignment problem, solved by scipy). A wrong direction weighs as `_WRONG_WAY_S` of difference, so that of
two people who cross each other at one moment each is paired with the passage of their own way, if any.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from scipy.optimize import linear_sum_assignment
from tests.accuracy.cases import Case

from ginnel.chain import Chain
from ginnel.sim.movers import Mover, TrueMover, true_mover
from ginnel.words import US_PER_S, Direction, Flag, FloatArray, MoverKind, Passage, SampleArray, Story

WITHIN_S = 3.0
_WRONG_WAY_S = 0.5
_FORBIDDEN_S = 1e6
_MOVING_MPS = 0.1
_BLOCK_SAMPLES = 1 << 16


@dataclass(frozen=True, kw_only=True)
class Pair:
    """A true passage and the one found for it."""

    true_direction: Direction
    true_speed_mps: float  # the mover's own, over the time in which it was heard
    true_kind: MoverKind
    found: Passage

    @property
    def speed_error_percent(self) -> float | None:
        """Error of the speed, in per cent of the true one."""
        if self.found.speed_mps is None:
            return None
        return 100.0 * (self.found.speed_mps / self.true_speed_mps - 1.0)


@dataclass(frozen=True, kw_only=True)
class Outcome:
    """What one or several cases gave.

    ``n_others`` are movers who did not pass, ``n_others_counted`` those of them within whose time a false
    passage lies. ``missed_s`` and ``false_s`` are moments in the case, to look at. ``quarters`` are counts
    of 15 minutes (true, found), the last four fields what the log and the truth hold for such sums, matched
    or not. ``n_unsettled`` are pairs flagged so.
    """

    pairs: tuple[Pair, ...] = ()
    missed_s: tuple[float, ...] = ()
    false_s: tuple[float, ...] = ()
    n_doubles: int = 0
    n_others: int = 0
    n_others_counted: int = 0
    n_unsettled: int = 0
    listened_s: float = 0.0
    quarters: tuple[tuple[int, int], ...] = ()
    true_ways: tuple[Direction, ...] = ()
    found_ways: tuple[Direction, ...] = ()
    true_speeds_mps: tuple[float, ...] = ()
    found_speeds_mps: tuple[float, ...] = ()

    def __add__(self, other: Outcome) -> Outcome:
        """Both together."""
        return Outcome(
            **{name: getattr(self, name) + getattr(other, name) for name in self.__dataclass_fields__}
        )

    @property
    def n_true(self) -> int:
        """True passages that were to be found."""
        return len(self.pairs) + len(self.missed_s)

    @property
    def n_found(self) -> int:
        """Passages found, right or false."""
        return len(self.pairs) + len(self.false_s)

    def directions(self) -> tuple[int, int, int]:
        """Pairs whose direction is right, wrong, unknown."""
        right = sum(pair.found.direction is pair.true_direction for pair in self.pairs)
        unknown = sum(pair.found.direction is Direction.UNKNOWN for pair in self.pairs)
        return right, len(self.pairs) - right - unknown, unknown

    def speed_errors_percent(self) -> FloatArray:
        """Errors of all speeds that were given."""
        errors = [pair.speed_error_percent for pair in self.pairs]
        return np.array([error for error in errors if error is not None])


def find(case: Case) -> list[Passage]:
    """What the chain makes of a case, told the sensor as it is believed to be. A chain a span."""
    found: list[Passage] = []
    for begin_s, blocks in _spans(case):
        chain = Chain(case.told, case.scene.sample_rate_hz, round(begin_s * US_PER_S))
        for block in blocks:
            found += chain.push(block)
        found += chain.finish()
    return found


def _spans(case: Case) -> Iterator[tuple[float, Iterator[SampleArray]]]:
    if not case.holes_s:
        yield 0.0, case.scene.blocks(_BLOCK_SAMPLES)
        return
    samples = case.scene.samples()
    for begin_s, end_s in case.spans_s:
        first, last = (round(at_s * case.scene.sample_rate_hz) for at_s in (begin_s, end_s))
        yield begin_s, iter((samples[first:last],))


def score(case: Case) -> Outcome:
    """Find the passages of a case and compare them with its truth."""
    return compare(case, find(case))


def compare(case: Case, found: list[Passage]) -> Outcome:
    """Compare what was found in a case with its truth."""
    scene = case.scene
    told = [
        (mover, true)
        for mover in scene.movers
        if (true := true_mover(mover, duration_s=scene.duration_s, ends_at_sensor=scene.ends_at_sensor))
    ]
    passed = [(mover, true) for mover, true in told if true.crossed_s is not None]
    counted = [one for one in found if one.story is Story.PASSAGE]
    crossed_s = np.array([_crossed_s(true) for _, true in passed])
    found_s = np.array([one.crossed_us / US_PER_S for one in counted])
    partner = match(
        crossed_s,
        found_s,
        [true.direction for _, true in passed],
        [one.direction for one in counted],
    )
    pairs, missed_s = [], []
    for number, (mover, true) in enumerate(passed):
        at = partner.get(number)
        if not _is_scored(case, true):
            continue
        if at is None:
            missed_s.append(_crossed_s(true))
            continue
        pairs.append(
            Pair(
                true_direction=true.direction,
                true_speed_mps=_speed_while_heard_mps(mover, true, counted[at], scene.ends_at_sensor),
                true_kind=true.kind,
                found=counted[at],
            )
        )
    taken = set(partner.values())
    free_s = [at_s for number, at_s in enumerate(found_s) if number not in taken and at_s >= case.learnt_s]
    matched_s = crossed_s[sorted(partner)] if partner else np.array([])
    doubles = sum(bool((np.abs(matched_s - at_s) <= WITHIN_S).any()) for at_s in free_s)
    late = [one for one in counted if one.crossed_us / US_PER_S >= case.learnt_s]
    others = [true for _, true in told if true.crossed_s is None]
    return Outcome(
        pairs=tuple(pairs),
        missed_s=tuple(missed_s),
        false_s=tuple(float(at_s) for at_s in free_s),
        n_doubles=doubles,
        n_others=len(others),
        n_others_counted=sum(
            any(true.started_s <= at_s <= true.ended_s + WITHIN_S for at_s in free_s) for true in others
        ),
        n_unsettled=sum(Flag.UNSETTLED in pair.found.flags for pair in pairs),
        listened_s=sum(end_s - begin_s for begin_s, end_s in case.spans_s) - case.learnt_s,
        quarters=_quarters(case, crossed_s, found_s),
        true_ways=tuple(true.direction for _, true in passed if _is_scored(case, true)),
        found_ways=tuple(one.direction for one in late if one.direction is not Direction.UNKNOWN),
        true_speeds_mps=tuple(true.mean_speed_mps for _, true in passed if _is_scored(case, true)),
        found_speeds_mps=tuple(one.speed_mps for one in late if one.speed_mps is not None),
    )


def match(
    true_s: FloatArray, found_s: FloatArray, true_ways: list[Direction], found_ways: list[Direction]
) -> dict[int, int]:
    """Pair true and found crossings: number of the true one to number of the found one."""
    if not len(true_s) or not len(found_s):
        return {}
    apart_s = np.abs(true_s[:, None] - found_s[None, :])
    wrong = np.array([[one is not other for other in found_ways] for one in true_ways])
    cost = np.where(apart_s <= WITHIN_S, apart_s + _WRONG_WAY_S * wrong, _FORBIDDEN_S)
    rows, columns = linear_sum_assignment(cost)
    return {
        int(row): int(column)
        for row, column in zip(rows, columns, strict=True)
        if apart_s[row, column] <= WITHIN_S
    }


def _crossed_s(true: TrueMover) -> float:
    assert true.crossed_s is not None
    return true.crossed_s


def _is_scored(case: Case, true: TrueMover) -> bool:
    """Whether a passage must be found: after the learning, and not cut by an edge or a hole."""
    heard = any(begin_s < true.started_s and true.ended_s < end_s for begin_s, end_s in case.spans_s)
    return heard and not true.cut and _crossed_s(true) >= case.learnt_s


def _speed_while_heard_mps(mover: Mover, true: TrueMover, found: Passage, ends_at_sensor: bool) -> float:
    """The mover's own mean speed along the path while it was heard, standing left out."""
    begin_s = max(true.started_s, found.started_us / US_PER_S)
    end_s = min(true.ended_s, found.ended_us / US_PER_S)
    if end_s - begin_s < 0.5:
        return true.mean_speed_mps
    times_s = np.arange(begin_s, end_s, 0.02)
    spline = mover.path.spline()
    speeds_mps = np.abs(spline(times_s, 1)[:, 0])
    counts = speeds_mps > _MOVING_MPS
    if ends_at_sensor:
        counts &= spline(times_s)[:, 0] > 0
    return float(speeds_mps[counts].mean()) if counts.any() else true.mean_speed_mps


def _quarters(case: Case, true_s: FloatArray, found_s: FloatArray) -> tuple[tuple[int, int], ...]:
    edges_s = np.arange(case.learnt_s, case.scene.duration_s + 1.0, 900.0)
    if len(edges_s) < 2:
        return ()
    true_n, found_n = (np.histogram(at_s, edges_s)[0] for at_s in (true_s, found_s))
    return tuple((int(a), int(b)) for a, b in zip(true_n, found_n, strict=True))
