"""Counting and listening time in intervals, against slow obvious versions."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.stats import counts_in, union_us_in

times = st.lists(st.integers(-5, 40), max_size=30)
edges = st.lists(st.integers(0, 30), max_size=8, unique=True).map(sorted)


def ints(values: list[int]) -> np.ndarray[tuple[int], np.dtype[np.int64]]:
    return np.array(values, np.int64)


def test_an_event_on_an_edge_belongs_to_the_interval_that_begins_there() -> None:
    assert counts_in(ints([0, 9, 10, 19, 20, -1]), ints([0, 10, 20])).tolist() == [2, 2]


@given(times, edges)
def test_counting_agrees_with_counting_by_hand(moments: list[int], cuts: list[int]) -> None:
    by_hand = [sum(low <= moment < high for moment in moments) for low, high in pairwise(cuts)]
    assert counts_in(ints(moments), ints(cuts)).tolist() == by_hand


@given(times, edges)
def test_counting_agrees_with_numpy(moments: list[int], cuts: list[int]) -> None:
    # numpy's histogram closes its last bin above, so what lies on that edge is taken away first
    inside = [moment for moment in moments if cuts and moment < cuts[-1]]
    if len(cuts) > 1:
        assert counts_in(ints(moments), ints(cuts)).tolist() == np.histogram(inside, cuts)[0].tolist()


@given(times, times, edges)
def test_counts_of_parts_add_up(one: list[int], other: list[int], cuts: list[int]) -> None:
    both = counts_in(ints(one), ints(cuts)) + counts_in(ints(other), ints(cuts))
    np.testing.assert_array_equal(counts_in(ints(one + other), ints(cuts)), both)


def test_microseconds_are_exact() -> None:
    noon = 1_772_442_000_000_000
    assert counts_in(ints([noon - 1, noon]), ints([noon - 10, noon, noon + 1])).tolist() == [1, 1]


@given(st.lists(st.tuples(st.integers(-5, 35), st.integers(0, 12)), max_size=6), edges)
def test_listening_agrees_with_second_by_second(spans: list[tuple[int, int]], cuts: list[int]) -> None:
    """Spans in any order, overlapping, empty, outside: each moment heard counts once."""
    heard = {moment for start, length in spans for moment in range(start, start + length)}
    by_hand = [sum(low <= moment < high for moment in heard) for low, high in pairwise(cuts)]
    starts, ends = [start for start, _ in spans], [start + length for start, length in spans]
    assert union_us_in(ints(cuts), ints(starts), ints(ends)).tolist() == by_hand


def test_descending_edges_are_refused() -> None:
    with pytest.raises(ValueError, match="must not descend"):
        counts_in(ints([]), ints([2, 1]))
    with pytest.raises(ValueError, match="must not descend"):
        union_us_in(ints([2, 1]), ints([0]), ints([1]))
