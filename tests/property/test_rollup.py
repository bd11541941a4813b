"""Laws of roll-ups: merging parts is rolling up the whole; what is told agrees with the speeds themselves.

Means and percentiles are checked against numpy's and scipy's of the same speeds.
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import stats

from ginnel.store.rollup import BIN_MPS, Rollup, merge, roll_up

# micrometres a second as the passage table holds them: 32 bits, -1 for a speed not measured
speeds = st.lists(st.one_of(st.just(-1), st.integers(0, 12_000_000), st.integers(0, 2**31 - 1)), max_size=40)


def rolled(values: list[int]) -> Rollup:
    return roll_up(np.array(values, np.int64))


@given(st.lists(speeds, max_size=5))
def test_merging_parts_is_rolling_up_the_whole(parts: list[list[int]]) -> None:
    assert merge([rolled(part) for part in parts]) == rolled([value for part in parts for value in part])


@given(speeds, speeds, speeds)
def test_merging_needs_no_order(a: list[int], b: list[int], c: list[int]) -> None:
    one, two, three = rolled(a), rolled(b), rolled(c)
    assert merge([merge([one, two]), three]) == merge([three, merge([two, one])])


@given(speeds)
def test_nothing_is_lost_in_the_histogram(values: list[int]) -> None:
    rollup = rolled(values)
    assert rollup.count == len(values)
    assert len(rollup.speed_mps()) == rollup.measured == sum(value >= 0 for value in values)


walking = st.lists(st.integers(200_000, 5_000_000), min_size=2, max_size=60)


@given(walking)
def test_what_is_told_agrees_with_the_speeds(values: list[int]) -> None:
    rollup, speed_mps = rolled(values), np.array(values) / 1e6
    assert rollup.mean_mps == pytest.approx(np.mean(speed_mps), abs=0.5e-3)
    assert rollup.space_mean_mps == pytest.approx(stats.hmean(speed_mps), rel=1e-5)
    # whole millimetres a second: each deviation is off by at most one
    assert rollup.sd_mps == pytest.approx(np.std(speed_mps, ddof=1), abs=1.5e-3)
    told = np.quantile(rollup.speed_mps(), [0.15, 0.5, 0.85, 0.95])
    assert told == pytest.approx(np.quantile(speed_mps, [0.15, 0.5, 0.85, 0.95]), abs=BIN_MPS / 2 + 1e-9)


def test_sums_by_hand() -> None:
    """1.000, 1.500 and 2.000 m/s and one not measured; 1/v is 1, 2/3 and 1/2 s/m."""
    rollup = rolled([1_000_000, -1, 2_000_000, 1_500_000])
    assert (rollup.count, rollup.measured) == (4, 3)
    assert (rollup.speed_sum_mmps, rollup.speed_square_sum_mm2ps2) == (4500, 7_250_000)
    assert rollup.slowness_sum_uspm == 1_000_000 + 666_666 + 500_000
    assert rollup.speed_mps().tolist() == pytest.approx([1.005, 1.505, 2.005])
    assert rollup.sd_mps == pytest.approx(0.5)


def test_equal_speeds_have_no_spread() -> None:
    assert rolled([1_340_499] * 7).sd_mps == 0.0


def test_no_passages_tell_nothing() -> None:
    assert rolled([]) == Rollup() == merge([])
    assert (Rollup().mean_mps, Rollup().space_mean_mps, rolled([5]).sd_mps) == (None, None, None)
    assert len(rolled([-1]).speed_mps()) == 0


def test_standing_still_counts_with_the_slowest() -> None:
    assert rolled([0]).slowness_sum_uspm == 10**12
