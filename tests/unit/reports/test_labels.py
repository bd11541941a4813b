"""Faults put into labelled counts, and found; sound labels have none. Real ones: tests/open_data."""

from __future__ import annotations

from datetime import date, datetime
from zoneinfo import ZoneInfo

import numpy as np
import pytest

from ginnel.reports.intervals import Every, cut
from ginnel.reports.labels import LabelFault, LabelFinding, check_labels
from ginnel.times import from_us, to_us

DUBLIN = ZoneInfo("Europe/Dublin")
PROFILE = np.array([1, 1, 1, 1, 2, 5, 20, 60, 90, 40, 30, 50, 70, 60, 40, 50, 80, 99, 60, 30, 20, 9, 4, 2])


class Labels:
    """Hourly counts of 2026 in Dublin as a sound counter labels them: 23 and 25 hours on two days."""

    def __init__(self) -> None:
        start, end = (to_us(datetime(2026, *day, tzinfo=DUBLIN)) for day in ((2, 1), (11, 30)))
        local = [from_us(int(edge), DUBLIN) for edge in cut(start, end, Every.HOUR, DUBLIN)[:-1]]
        self.day = np.array([at.toordinal() for at in local])
        self.hour = np.array([at.hour for at in local])
        weekly = np.array([1.0 if at.weekday() < 5 else 0.3 for at in local])
        self.count = np.random.default_rng(4).poisson(PROFILE[self.hour] * weekly).astype(float)

    def found(self) -> list[LabelFinding]:
        return list(check_labels(self.day, self.hour, self.count, DUBLIN))

    def row(self, day: date, hour: int) -> int:
        return int(np.flatnonzero((self.day == day.toordinal()) & (self.hour == hour))[0])

    def without(self, row: int) -> None:
        self.day, self.hour, self.count = (np.delete(a, row) for a in (self.day, self.hour, self.count))


@pytest.fixture
def labels() -> Labels:
    return Labels()


def test_sound_labels_have_no_fault(labels: Labels) -> None:
    assert labels.found() == []


def test_days_that_begin_at_six(labels: Labels) -> None:
    early = labels.hour < 6
    labels.day = labels.day - early
    # the file begins with a few hours of the day before, as a file may
    (one,) = labels.found()
    assert one.kind is LabelFault.LATE_DAY
    assert "0 to 5 belong to the day after their label" in one.reason


def test_a_zero_for_an_hour_that_the_clock_skipped(labels: Labels) -> None:
    row = labels.row(date(2026, 3, 29), 2)
    labels.day = np.insert(labels.day, row, date(2026, 3, 29).toordinal())
    labels.hour, labels.count = np.insert(labels.hour, row, 1), np.insert(labels.count, row, 0)
    (one,) = labels.found()
    assert (one.kind, one.day, one.hour) == (LabelFault.SKIPPED_HOUR, date(2026, 3, 29), 1)
    assert "a 0 is stored" in one.reason


def test_an_hour_shown_twice_with_one_row(labels: Labels) -> None:
    labels.without(labels.row(date(2026, 10, 25), 1))
    (one,) = labels.found()
    assert (one.kind, one.day, one.hour) == (LabelFault.FOLDED_HOUR, date(2026, 10, 25), 1)


def test_labels_that_run_on_through_the_clock_change(labels: Labels) -> None:
    """From the change on every label is an hour behind the clock, for two weeks."""
    first, last = labels.row(date(2026, 3, 29), 2), labels.row(date(2026, 4, 11), 5)
    moved = labels.hour[first:last] - 1
    labels.day[first:last] -= moved < 0
    labels.hour[first:last] = moved % 24
    found = {one.kind: one for one in labels.found()}
    assert set(found) == {LabelFault.SKIPPED_HOUR, LabelFault.SHIFTED, LabelFault.ABSENT}
    assert "did not follow the clock" in found[LabelFault.SKIPPED_HOUR].reason
    assert "what came at 12 comes at 11" in found[LabelFault.SHIFTED].reason
    assert found[LabelFault.SHIFTED].n_hours == 12 * 24 + 23  # to Friday, 10 April
    assert (found[LabelFault.ABSENT].day, found[LabelFault.ABSENT].hour) == (date(2026, 4, 11), 4)


def test_absent_and_doubled_rows(labels: Labels) -> None:
    labels.without(labels.row(date(2026, 5, 5), 7))
    labels.hour[labels.row(date(2026, 6, 6), 9)] = 8
    found = [(one.kind, one.day, one.hour) for one in labels.found()]
    assert found == [
        (LabelFault.ABSENT, date(2026, 5, 5), 7),
        (LabelFault.DOUBLED, date(2026, 6, 6), 8),
        (LabelFault.ABSENT, date(2026, 6, 6), 9),
    ]


def test_a_dead_week_stored_as_zeros(labels: Labels) -> None:
    first, last = labels.row(date(2026, 7, 6), 12), labels.row(date(2026, 7, 13), 12)
    labels.count[first - 1] = labels.count[last] = 3
    labels.count[first:last] = 0
    (one,) = labels.found()
    assert (one.kind, one.day, one.hour, one.n_hours) == (LabelFault.SILENT, date(2026, 7, 6), 12, 168)


def test_nothing_has_no_fault() -> None:
    nothing = np.empty(0, np.int64)
    assert check_labels(nothing, nothing, np.empty(0), DUBLIN) == ()
