"""What is usual, the typical week, and joining intervals: counted by hand."""

from __future__ import annotations

from collections.abc import Iterator
from datetime import datetime, timedelta
from pathlib import Path
from zoneinfo import ZoneInfo

import numpy as np
import pytest

from ginnel.reports import Every, cut
from ginnel.reports.flow import flow, joined, total, typical_week, usual
from ginnel.store import Store, open_store, record_span
from ginnel.times import to_us
from ginnel.words import US_PER_S, Direction, Passage, Sensor, Span

DUBLIN = ZoneInfo("Europe/Dublin")
LANE = Sensor(name="lane")
MONDAY = datetime(2026, 3, 9, 8, tzinfo=DUBLIN)  # the clock changes between the third and the fourth
#: Passages between 8 and 9 on six Mondays in a row; the last one is the one that is asked about.
COUNTS = (3, 4, 4, 5, 9, 7)


@pytest.fixture
def lane(tmp_path: Path) -> Iterator[Store]:
    with open_store(f"sqlite:///{tmp_path}/lane.db", create=True) as store:
        for week, count in enumerate(COUNTS):
            start_us = to_us(MONDAY + timedelta(weeks=week))
            passages = [_passage(start_us + (60 + minute) * US_PER_S) for minute in range(count)]
            span = Span(started_us=start_us, ended_us=start_us + 3600 * US_PER_S, sample_rate_hz=8000.0)
            record_span(store, LANE, span, passages, "test")
        yield store


def _passage(at_us: int) -> Passage:
    return Passage(
        started_us=at_us,
        crossed_us=at_us,
        ended_us=at_us + 1,
        direction=Direction.APPROACHING,
        direction_confidence=0.9,
        speed_mps=1.0,
        speed_se_mps=0.1,
        snr_db=20.0,
    )


def day_edges(week: int) -> np.ndarray:
    day = (MONDAY + timedelta(weeks=week)).replace(hour=0)
    return cut(to_us(day), to_us(day + timedelta(days=1)), Every.HOUR, DUBLIN)


def test_usual_is_the_median_of_like_hours_of_the_clock(lane: Store) -> None:
    found = usual(lane, "lane", day_edges(5), Every.HOUR, DUBLIN)
    # 3, 4, 4, 5 and 9 at eight by the clock, whatever the offset; by hand: on roots the median is 2, the
    # deviations 0.27, 0, 0, 0.24 and 1, so their median 0.24; times 1.4826 is 0.35, less than 1/2
    assert found[None].median[8] == pytest.approx(4.0)
    assert found[None].low[8] == pytest.approx(1.0)
    assert found[None].high[8] == pytest.approx(9.0)
    assert found[Direction.RECEDING].median[8] == 0
    assert np.isnan(found[None].median[9]), "nobody listened at nine"


def test_with_fewer_than_four_like_hours_nothing_is_usual(lane: Store) -> None:
    assert np.isnan(usual(lane, "lane", day_edges(3), Every.HOUR, DUBLIN)[None].median[8])
    assert np.isfinite(usual(lane, "lane", day_edges(4), Every.HOUR, DUBLIN)[None].median[8])


def test_weeks_have_no_usual(lane: Store) -> None:
    edges_us = cut(int(day_edges(5)[0]), int(day_edges(5)[-1]), Every.WEEK, DUBLIN)
    assert np.isnan(usual(lane, "lane", edges_us, Every.WEEK, DUBLIN)[None].median).all()


def test_the_typical_week_is_what_was_counted_over_hours_heard(lane: Store) -> None:
    found = typical_week(lane, "lane", int(day_edges(0)[0]), int(day_edges(5)[-1]), DUBLIN)
    assert found.rate[0, 8] == pytest.approx(sum(COUNTS) / 6)
    assert found.listened_h[0, 8] == 6
    assert np.isfinite(found.rate).sum() == 1


def test_joined_hours_are_the_days_themselves(lane: Store) -> None:
    start_us, end_us = int(day_edges(0)[0]), int(day_edges(5)[-1])
    hours = flow(lane, "lane", cut(start_us, end_us, Every.HOUR, DUBLIN))
    days_us = cut(start_us, end_us, Every.DAY, DUBLIN)
    by_hand, own = flow(lane, "lane", days_us), joined(hours, days_us)
    np.testing.assert_array_equal(own.both, by_hand.both)
    np.testing.assert_array_equal(own.listened_us, by_hand.listened_us)
    assert total(own).both == sum(COUNTS)


def test_what_is_still_to_come_is_no_gap_in_the_coverage(lane: Store) -> None:
    today = flow(lane, "lane", day_edges(0))
    ten = to_us(MONDAY.replace(hour=10))
    assert total(today).coverage == pytest.approx(1 / 24)
    assert total(today, ten).coverage == pytest.approx(1 / 10), "one hour of ten"
    assert total(today, ten + 7 * 24 * 3600 * US_PER_S).coverage == pytest.approx(1 / 24), "a day gone by"
    assert total(today, to_us(MONDAY) - 9 * 3600 * US_PER_S).coverage == 1.0, "never above all"
    assert total(flow(lane, "lane", day_edges(9)), ten).coverage == 0.0, "a day to come"


def test_half_hour_zones_are_counted_from_the_passages(lane: Store) -> None:
    kolkata = ZoneInfo("Asia/Kolkata")  # 5:30 ahead of UTC
    first = datetime(2026, 3, 9, tzinfo=kolkata)
    edges_us = cut(to_us(first), to_us(first + timedelta(days=1)), Every.HOUR, kolkata)
    found = flow(lane, "lane", edges_us)
    assert found.both.tolist() == [0] * 13 + [3] + [0] * 10, "08:00 in Dublin is 13:30 there"
    assert found.listened_us[13] == found.listened_us[14] == 1800 * US_PER_S
