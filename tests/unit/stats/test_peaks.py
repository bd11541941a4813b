"""The busiest hour and its factor, against a published example and pandas."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.stats.peaks import busiest_window, peak_hour_factor


def test_peak_hour_factor_of_a_published_example() -> None:
    # quarters of 900, 1000, 1200, 850: 3950 / 4800, printed as 0.82
    assert peak_hour_factor(np.array([900.0, 1000, 1200, 850])) == pytest.approx(0.8229, abs=5e-5)


def test_peak_hour_factor_at_its_bounds() -> None:
    # by definition: 1 where quarters are alike, 1/4 where all pass in one
    assert peak_hour_factor(np.full(4, 7.0)) == 1
    assert peak_hour_factor(np.array([0.0, 0, 9, 0])) == 0.25
    assert peak_hour_factor(np.zeros(4)) is None
    assert peak_hour_factor(np.array([1.0, np.nan, 1, 1])) is None
    with pytest.raises(ValueError, match="4 quarters, not 3"):
        peak_hour_factor(np.ones(3))


quarters = st.lists(st.one_of(st.just(np.nan), st.integers(0, 50).map(float)), max_size=40)


@given(quarters, st.integers(1, 6))
def test_busiest_window_is_that_of_a_rolling_sum(counts: list[float], n: int) -> None:
    rolling = pd.Series(counts, dtype=float).rolling(n).sum()
    found = busiest_window(np.array(counts), n)
    if not rolling.notna().any():
        assert found is None
        return
    assert found is not None
    assert (found.first, found.n) == (int(rolling.argmax()) - n + 1, n)
    assert found.volume == rolling.max()


def test_a_window_has_a_length() -> None:
    with pytest.raises(ValueError, match="at least 1"):
        busiest_window(np.ones(3), 0)
