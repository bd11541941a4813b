"""Faults put into a log with a weekly pattern, and found; a sound log has none."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from tests.unit.reports.invented import DUBLIN, HOUR, NORTH, A, R, at, heard, passed

from ginnel.reports import Oddity, unusual
from ginnel.store import Store
from ginnel.words import Passage

START = at(2026, 4, 6, 0)  # a Monday, in summer time
DAY = 24 * HOUR
WEEKS = 10
LAST_WEEK = START + (WEEKS - 1) * 7 * DAY

Fault = Callable[[int, list[Passage]], list[Passage]]


def fill(store: Store, fault: Fault | None = None, snr_db: Callable[[int], float] | None = None) -> None:
    """Twelve an hour between 8 and 18, half each way; a fault may change each day's passages."""
    rng = np.random.default_rng(23)
    log: list[Passage] = []
    for i in range(WEEKS * 7):
        day = START + i * DAY
        times = np.sort(rng.integers(day + 8 * HOUR, day + 18 * HOUR, rng.poisson(120))).tolist()
        ways = rng.choice([A, R], len(times)).tolist()
        level = None if snr_db is None else snr_db(i) + rng.normal()
        passages = [passed(t, way, snr_db=level) for t, way in zip(times, ways, strict=True)]
        log += fault(day, passages) if fault else passages
    heard(store, NORTH, START, START + WEEKS * 7 * DAY, log)


def test_a_sound_log_has_nothing_unusual(store: Store) -> None:
    fill(store, snr_db=lambda day: 20.0)
    assert unusual(store, "north", LAST_WEEK, LAST_WEEK + 7 * DAY, DUBLIN) == ()


def test_a_crowd_is_told_of(store: Store) -> None:
    at_noon = LAST_WEEK + 2 * DAY + 12 * HOUR

    def crowd(day: int, passages: list[Passage]) -> list[Passage]:
        extra = [passed(at_noon + i * 20_000_000) for i in range(150)]
        return (
            sorted([*passages, *extra], key=lambda one: one.crossed_us)
            if day == LAST_WEEK + 2 * DAY
            else passages
        )

    fill(store, crowd)
    (found,) = unusual(store, "north", LAST_WEEK, LAST_WEEK + 7 * DAY, DUBLIN)
    assert (found.kind, found.start_us, found.end_us) == (Oddity.BUSY, at_noon, at_noon + HOUR)
    assert found.observed > 150
    assert found.expected == pytest.approx(12, abs=3)
    assert "far more than they vary" in found.reason


def test_a_deaf_day_is_told_of_once_as_silence(store: Store) -> None:
    deaf = LAST_WEEK + 3 * DAY
    fill(store, lambda day, passages: [] if day == deaf else passages)
    (found,) = unusual(store, "north", LAST_WEEK, LAST_WEEK + 7 * DAY, DUBLIN)
    assert found.kind is Oddity.SILENT
    assert found.start_us < deaf + 8 * HOUR
    assert found.end_us >= deaf + DAY
    assert found.expected == pytest.approx(120, rel=0.15)


def test_a_direction_gone_missing_is_told_of(store: Store) -> None:
    def one_way(day: int, passages: list[Passage]) -> list[Passage]:
        return [passed(one.crossed_us, A) for one in passages] if day >= LAST_WEEK + 4 * DAY else passages

    fill(store, one_way)
    (found,) = unusual(store, "north", LAST_WEEK, LAST_WEEK + 7 * DAY, DUBLIN)
    assert (found.kind, found.direction) == (Oddity.ONE_WAY, R)
    assert (found.start_us, found.end_us) == (LAST_WEEK + 4 * DAY, LAST_WEEK + 7 * DAY)
    assert "receding, which 50% usually are" in found.reason


def test_hearing_that_fades_is_told_of(store: Store) -> None:
    fill(store, snr_db=lambda day: 20 - 0.08 * day)  # 5.5 dB in ten weeks
    (found,) = unusual(store, "north", LAST_WEEK, LAST_WEEK + 7 * DAY, DUBLIN)
    assert found.kind is Oddity.FADING
    assert found.expected - found.observed == pytest.approx(0.08 * 69, abs=0.7)
    assert "weaker than 69 days before" in found.reason


def test_time_unheard_is_no_silence(store: Store) -> None:
    fill(store)
    later = START + (WEEKS * 7 + 10) * DAY
    heard(store, NORTH, later, later + HOUR)
    assert unusual(store, "north", LAST_WEEK, later + HOUR, DUBLIN) == ()
