"""Activity: what begins, ends and cuts a stretch, on counts of detections made up frame by frame.

20 frames a second, 40 watched bins, one false detection in 10,000 cells: 0.04 expected in half a second.
"""

from __future__ import annotations

import math
from itertools import pairwise

import numpy as np
import pytest
import scipy.stats

from ginnel.doppler.frontend import SpectrumBatch
from ginnel.passages.activity import ActivityStage, Stretch

FRAMES_PER_S = 20


def stretches(n_detected: list[int] | np.ndarray[tuple[int], np.dtype[np.int64]]) -> list[Stretch]:
    counts = np.asarray(n_detected)
    power = np.arange(len(counts), dtype=np.float32)[:, None]
    stage = ActivityStage(FRAMES_PER_S, 1e-4, 40)
    out: list[Stretch] = []
    for first in range(0, len(counts), 32):
        rows = slice(first, first + 32)
        out += stage.push(
            SpectrumBatch(first, power[rows], np.ones(1, np.float32), counts[rows], counts[rows] > 90)
        )
    return out + stage.finish()


def seconds(*parts: tuple[float, int]) -> np.ndarray[tuple[int], np.dtype[np.int64]]:
    """Counts a frame: so many seconds of so many."""
    return np.concatenate([np.full(round(length * FRAMES_PER_S), count) for length, count in parts])


def bounds_s(stretch: Stretch) -> tuple[float, float]:
    first = stretch.first_frame_idx / FRAMES_PER_S
    return first, first + len(stretch.power) / FRAMES_PER_S


def test_quiet_gives_no_stretch() -> None:
    assert stretches(seconds((100, 0))) == []
    assert stretches([]) == []


def test_chance_detections_give_no_stretch_in_an_hour() -> None:
    # 1e-5 a window of half a second, 7200 of them: 7 percent.
    counts = np.random.default_rng(1).binomial(40, 1e-4, 3600 * FRAMES_PER_S)
    assert stretches(counts) == []


def test_so_many_detections_are_asked_for_as_chance_never_brings() -> None:
    # scipy's Poisson tail: 0.04 expected, fewer than 1e-5 of three; P(>= 3) = 1.03e-5, of four 1e-7.
    expected = 10 * 40 * 1e-4
    needed = int(scipy.stats.poisson.isf(1e-5, expected)) + 1
    assert needed == 4
    few = seconds((30, 0), (0.05, needed - 1), (30, 0))
    enough = seconds((30, 0), (0.05, needed), (30, 0))
    assert (len(stretches(few)), len(stretches(enough))) == (0, 1)


def test_a_stretch_has_three_seconds_before_and_one_and_a_half_behind() -> None:
    (stretch,) = stretches(seconds((30, 0), (5, 10), (30, 0)))
    # Half a second of window and three of lead; the window still sees the last detections for half a second.
    assert bounds_s(stretch) == pytest.approx((26.5, 36.95), abs=0.11)
    assert (stretch.own_first, stretch.own_last) == (-math.inf, math.inf)
    assert stretch.power[:, 0].tolist() == list(
        range(stretch.first_frame_idx, stretch.first_frame_idx + len(stretch.power))
    )


def test_two_seconds_of_quiet_part_two_stretches_and_less_do_not() -> None:
    assert len(stretches(seconds((30, 0), (3, 10), (1.5, 0), (3, 10), (30, 0)))) == 1
    assert len(stretches(seconds((30, 0), (3, 10), (3.0, 0), (3, 10), (30, 0)))) == 2


def test_stretches_share_no_frames_unless_one_was_cut() -> None:
    first, second = stretches(seconds((30, 0), (3, 10), (3.0, 0), (3, 10), (30, 0)))
    assert bounds_s(first)[1] <= bounds_s(second)[0] + 1e-9


def test_a_stretch_at_the_spans_edges_ends_with_the_span() -> None:
    (stretch,) = stretches(seconds((4, 10)))
    assert bounds_s(stretch) == pytest.approx((0.0, 4.0))


def test_activity_without_end_is_cut_into_pieces_that_own_every_moment_once() -> None:
    counts = seconds((10, 0), (150, 10), (10, 0))
    pieces = stretches(counts)
    assert len(pieces) >= 4
    assert pieces[0].own_first == -math.inf
    assert pieces[-1].own_last == math.inf
    for before, after in pairwise(pieces):
        assert before.own_last == after.own_first
        # Both see eight seconds beyond the cut.
        assert bounds_s(before)[1] == pytest.approx(before.own_last / FRAMES_PER_S + 8.0)
        assert bounds_s(after)[0] == pytest.approx(after.own_first / FRAMES_PER_S - 8.0)
    assert max(bounds_s(piece)[1] - bounds_s(piece)[0] for piece in pieces) < 60


def test_the_cut_falls_into_the_quietest_moment() -> None:
    counts = seconds((10, 0), (25, 10), (1.0, 1), (60, 10), (10, 0))
    first = stretches(counts)[0]
    assert first.own_last / FRAMES_PER_S == pytest.approx(35.75, abs=0.5)


def test_clipping_is_carried_along() -> None:
    (stretch,) = stretches(seconds((30, 0), (2, 10), (0.1, 99), (2, 10), (30, 0)))
    assert np.count_nonzero(stretch.is_clipped) == 2
    assert np.nonzero(stretch.is_clipped)[0][0] + stretch.first_frame_idx == 32 * FRAMES_PER_S


def test_memory_does_not_grow_in_quiet() -> None:
    stage = ActivityStage(FRAMES_PER_S, 1e-4, 40)
    for first in range(0, 32 * 500, 32):
        zeros = np.zeros(32, np.int64)
        stage.push(
            SpectrumBatch(first, np.zeros((32, 1), np.float32), np.ones(1, np.float32), zeros, zeros > 0)
        )
    assert len(stage._batches) < 6


def test_settled_time_grows_and_stays_behind_what_may_still_come() -> None:
    counts = seconds((20, 0), (100, 10), (5, 0), (3, 10), (20, 0))
    stage = ActivityStage(FRAMES_PER_S, 1e-4, 40)
    settled = -math.inf
    for first in range(0, len(counts), 32):
        rows = counts[first : first + 32]
        zeros = np.zeros((len(rows), 1), np.float32)
        for stretch in stage.push(SpectrumBatch(first, zeros, np.ones(1, np.float32), rows, rows > 90)):
            assert max(stretch.first_frame_idx, stretch.own_first) >= settled
        assert settled <= stage.settled_frame_idx <= first + 32
        settled = stage.settled_frame_idx
