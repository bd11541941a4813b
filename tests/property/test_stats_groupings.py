"""Every grouping in time and every percentile, against pandas: random events, zones and clock changes."""

from __future__ import annotations

from zoneinfo import ZoneInfo

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from ginnel.reports import Every, cut
from ginnel.reports.calendar import calendar
from ginnel.stats import band_counts, counts_in, mean_with_limits, quantiles, summarise_speeds
from ginnel.stats.headways import headways_s
from ginnel.stats.pace import pace, share_over
from ginnel.times import from_us

S = 1_000_000
DAY = 86_400 * S
ZONES = st.sampled_from(
    ["UTC", "Europe/Dublin", "America/New_York", "Pacific/Auckland", "America/Santiago", "Asia/Kolkata"]
)
FIRST = st.integers(1_700_000_000, 1_860_000_000).map(lambda second: second * S)
SHORT = {Every.FIVE_MINUTES: "5min", Every.QUARTER_HOUR: "15min", Every.HOUR: "h"}


@st.composite
def events(draw: st.DrawFn) -> np.ndarray[tuple[int], np.dtype[np.int64]]:
    """Times over some months, many of them in one day and some on the hour."""
    first_us = draw(FIRST)
    spread_us = draw(st.sampled_from([DAY, 40 * DAY, 200 * DAY]))
    offsets = draw(st.lists(st.integers(0, spread_us), min_size=1, max_size=60))
    on_the_hour = draw(st.booleans())
    times = first_us + np.array(offsets, np.int64)
    return times - times % (3600 * S) if on_the_hour else times


def local(times_us: np.ndarray[tuple[int], np.dtype[np.int64]], zone: str) -> pd.Series:
    return pd.Series(pd.to_datetime(times_us, unit="us", utc=True)).dt.tz_convert(zone)


def found(
    times_us: np.ndarray[tuple[int], np.dtype[np.int64]], every: Every, zone: str
) -> dict[pd.Timestamp, int]:
    edges_us = cut(int(times_us.min()), int(times_us.max()) + 1, every, ZoneInfo(zone))
    counts = counts_in(times_us, edges_us)
    assert counts.sum() == len(times_us)
    starts = [pd.Timestamp(from_us(int(edge), ZoneInfo(zone))) for edge in edges_us[:-1]]
    return {start: int(n) for start, n in zip(starts, counts, strict=True) if n}


@settings(deadline=None, max_examples=60)
@given(events(), ZONES)
def test_days_weeks_and_months_are_those_of_pandas(
    times_us: np.ndarray[tuple[int], np.dtype[np.int64]], zone: str
) -> None:
    at = local(times_us, zone)
    by_day = {start.date(): n for start, n in found(times_us, Every.DAY, zone).items()}
    assert by_day == at.groupby(at.dt.date).size().to_dict()
    iso = at.dt.isocalendar()
    by_week = {tuple(start.isocalendar())[:2]: n for start, n in found(times_us, Every.WEEK, zone).items()}
    assert by_week == at.groupby([iso["year"], iso["week"]]).size().to_dict()
    by_month = {(start.year, start.month): n for start, n in found(times_us, Every.MONTH, zone).items()}
    assert by_month == at.groupby([at.dt.year, at.dt.month]).size().to_dict()


@settings(deadline=None, max_examples=40)
@given(events(), ZONES, st.sampled_from(list(SHORT)))
def test_hours_and_parts_of_them_are_those_of_pandas(
    times_us: np.ndarray[tuple[int], np.dtype[np.int64]], zone: str, every: Every
) -> None:
    """Clock changes here are by whole hours, so steps of the local clock are steps of a fixed offset too."""
    at = local(times_us, zone)
    offset = at.map(lambda moment: moment.utcoffset())
    steps = (at.dt.tz_convert("UTC") + offset).dt.floor(SHORT[every]) - offset
    expected = steps.groupby(steps).size()
    got = {start.tz_convert("UTC"): n for start, n in found(times_us, every, zone).items()}
    assert got == {start: int(n) for start, n in expected.items()}


@settings(deadline=None)
@given(events(), ZONES)
def test_the_calendar_is_that_of_pandas(
    times_us: np.ndarray[tuple[int], np.dtype[np.int64]], zone: str
) -> None:
    at, ours = local(times_us, zone).dt, calendar(times_us, ZoneInfo(zone))
    for mine, theirs in (
        (ours.year, at.year),
        (ours.month, at.month),
        (ours.weekday, at.day_of_week),
        (ours.hour, at.hour),
    ):
        np.testing.assert_array_equal(mine, theirs)


SPEEDS = st.lists(st.one_of(st.just(np.nan), st.floats(0.1, 60)), min_size=1, max_size=60)


@given(SPEEDS)
def test_summaries_are_those_of_pandas(values: list[float]) -> None:
    series, ours = pd.Series(values), summarise_speeds(np.array(values))
    assert ours.n == series.count()
    if ours.n == 0:
        return
    assert ours.mean_mps == pytest.approx(series.mean(), rel=1e-12)
    assert ours.space_mean_mps == pytest.approx(1 / (1 / series).mean(), rel=1e-12)
    if ours.n > 1:
        assert ours.sd_mps == pytest.approx(series.std(), rel=1e-9, abs=1e-12)
    percentiles = (ours.p15_mps, ours.p50_mps, ours.p85_mps, ours.p95_mps)
    assert percentiles == pytest.approx(series.quantile([0.15, 0.5, 0.85, 0.95]).tolist(), rel=1e-12)


@given(
    st.lists(st.floats(0.1, 60), min_size=1, max_size=60), st.lists(st.floats(0, 1), min_size=1, max_size=5)
)
def test_any_percentile_is_that_of_pandas(values: list[float], probabilities: list[float]) -> None:
    expected = pd.Series(values).quantile(probabilities).tolist()
    assert quantiles(np.array(values), probabilities) == pytest.approx(expected, rel=1e-12)


@given(SPEEDS, st.lists(st.integers(1, 59), min_size=1, max_size=5, unique=True).map(sorted))
def test_bands_are_those_of_pandas(values: list[float], edges: list[int]) -> None:
    cut_up = pd.cut(pd.Series(values), [-np.inf, *edges, np.inf], right=False)
    expected = cut_up.value_counts(sort=False).tolist()
    assert band_counts(np.array(values), [float(edge) for edge in edges]).tolist() == expected


@given(SPEEDS, st.floats(0.5, 30))
def test_the_pace_beats_every_other_range(values: list[float], width: float) -> None:
    measured = np.array([value for value in values if np.isfinite(value)])
    best = pace(np.array(values), width)
    if best is None:
        assert not len(measured)
        return
    assert best.n == max(int(np.sum((measured >= low) & (measured < low + width))) for low in measured)
    assert best.share == best.n / len(measured)
    assert best.low_mps in measured


@given(SPEEDS, st.floats(0, 60))
def test_the_share_over_a_limit_is_that_of_pandas(values: list[float], limit: float) -> None:
    known = pd.Series(values).dropna()
    assert share_over(np.array(values), limit) == (None if known.empty else float((known > limit).mean()))


@settings(deadline=None)  # the first example imports scipy
@given(st.lists(st.one_of(st.just(np.nan), st.integers(0, 1000).map(float)), min_size=1, max_size=30))
def test_means_of_days_are_those_of_pandas(values: list[float]) -> None:
    series, ours = pd.Series(values), mean_with_limits(np.array(values))
    assert (ours is None) == (series.count() == 0)
    if ours is None:
        return
    assert ours.n == series.count()
    assert ours.mean == pytest.approx(series.mean(), rel=1e-12)
    if ours.dispersion is not None:
        assert ours.dispersion.ratio == pytest.approx(series.var() / series.mean(), rel=1e-9)


@given(st.lists(st.integers(0, 10**9), min_size=1, max_size=40))
def test_headways_of_one_stretch_are_differences(times: list[int]) -> None:
    ordered = np.sort(np.array(times, np.int64))
    got = headways_s(ordered, np.array([0]), np.array([10**9 + 1]))
    np.testing.assert_allclose(got, pd.Series(ordered).diff().dropna() / 1e6)
