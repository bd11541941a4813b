"""Checks on hourly counts that others made, labelled with date and hour of a local clock.

Such series are to be compared with the log, and they have faults of their own: days that begin at six, clock
changes that were not followed, dead sensors stored as zeros. None is mended here: each is told of.
"""

from __future__ import annotations

from collections.abc import Collection, Iterator
from dataclasses import dataclass
from datetime import UTC, date, datetime, time, tzinfo
from enum import StrEnum

import numpy as np

from ginnel.reports.intervals import offset_changes, offset_us
from ginnel.stats.counts import IntArray
from ginnel.stats.labels import clock_hours, first_hour_of_days, profile_shift
from ginnel.stats.unusual import silent_runs, usual_but_for_silence
from ginnel.stats.volumes import group_means
from ginnel.times import to_us
from ginnel.words import US_PER_S, FloatArray

_HOUR_US = 3600 * US_PER_S
_DAY_H = 24
#: Days on both sides of a clock change whose profiles are compared.
_PROFILE_DAYS = 21
#: A moved profile must fit so much better: share of the correlation that was missing.
_CLEARLY_BETTER = 0.5


class LabelFault(StrEnum):
    """What is wrong with labels or counts."""

    LATE_DAY = "day begins late"
    DOUBLED = "doubled hours"
    ABSENT = "absent hours"
    SKIPPED_HOUR = "skipped hour has a row"
    FOLDED_HOUR = "repeated hour has one row"
    SHIFTED = "hours moved after a clock change"
    SILENT = "long silence"


@dataclass(frozen=True, slots=True, kw_only=True)
class LabelFinding:
    """One fault, from which label on, in how many hours, and the reason in a sentence."""

    kind: LabelFault
    day: date  # of the clock, not of the label
    hour: int
    n_hours: int
    reason: str


def check_labels(day: IntArray, hour: IntArray, count: FloatArray, zone: tzinfo) -> tuple[LabelFinding, ...]:
    """Look for faults in one hourly series, by time.

    Parameters
    ----------
    day : array, shape (n,), ordinal of the labelled date (see datetime.date.toordinal), in the file's order
    hour : array, shape (n,), 0 to 23, labelled hour of the local clock
    count : array, shape (n,); NaN: empty
    zone : whose clock it is
    """
    if not len(day):
        return ()
    first_hour = first_hour_of_days(day, hour)
    clock = clock_hours(day, hour, first_hour)
    found = list(_order_faults(clock, first_hour, zone))
    found += _clock_change_faults(clock, count, zone)
    found += _silences(clock, count)
    return tuple(sorted(found, key=lambda one: (one.day, one.hour, one.kind)))


def _order_faults(clock: IntArray, first_hour: int, zone: tzinfo) -> Iterator[LabelFinding]:
    if first_hour:
        yield _finding(
            LabelFault.LATE_DAY,
            int(clock[0]),
            len(clock),
            f"days begin at {first_hour}:00: hours 0 to {first_hour - 1} belong to the day after their label",
        )
    changes = _clock_changes(clock, zone)
    present, n = np.unique(clock, return_counts=True)
    repeated = [at for at, is_forward in changes if not is_forward]
    for at, n_rows in zip(present.tolist(), n.tolist(), strict=True):
        if n_rows > 1 + (at in repeated):
            yield _finding(LabelFault.DOUBLED, at, 1, f"{n_rows} rows have this label")
    skipped = [at for at, is_forward in changes if is_forward]
    absent = np.setdiff1d(np.arange(present[0], present[-1] + 1), [*present.tolist(), *skipped])
    for run in np.split(absent, np.flatnonzero(np.diff(absent) > 1) + 1):
        if len(run):
            yield _finding(LabelFault.ABSENT, int(run[0]), len(run), f"no row for {len(run)} h")


def _clock_change_faults(clock: IntArray, count: FloatArray, zone: tzinfo) -> Iterator[LabelFinding]:
    changes = _clock_changes(clock, zone)
    for at, is_forward in changes:
        rows = np.flatnonzero(clock == at)
        if not is_forward:
            if len(rows) == 1:
                yield _finding(
                    LabelFault.FOLDED_HOUR,
                    at,
                    1,
                    "the clock showed this hour twice, there is one row for both",
                )
            continue
        if not len(rows):
            continue
        moved = list(_moved(clock, count, at))
        reason = "the clock skipped this hour, but a 0 is stored for it"
        if moved or np.any(count[rows] != 0):
            reason = "the clock skipped this hour, but it has a row: the labels did not follow the clock"
        yield _finding(LabelFault.SKIPPED_HOUR, at, 1, reason)
        yield from moved


def _moved(clock: IntArray, count: FloatArray, at: int) -> Iterator[LabelFinding]:
    """Whether hours come early or late on the days after a clock change, and on how many of them."""
    before = _profile(clock, count, range(at // _DAY_H - _PROFILE_DAYS, at // _DAY_H))
    moved: list[int] = []
    for day in range(at // _DAY_H + 1, at // _DAY_H + _PROFILE_DAYS):
        if not _is_weekday(day):
            continue
        shift = profile_shift(before, _profile(clock, count, [day]))
        if shift is None or shift.hours == 0:
            break
        moved.append(day)
    shift = profile_shift(before, _profile(clock, count, moved))
    if shift is not None and shift.hours and 1 - shift.correlation < _CLEARLY_BETTER * (1 - shift.unmoved):
        yield _finding(
            LabelFault.SHIFTED,
            at,
            (moved[-1] + 1) * _DAY_H - at,
            f"what came at 12 comes at {12 + shift.hours}: moved back, the weekdays follow the weeks before "
            f"with a correlation of {shift.correlation:.4f}, as they stand with {shift.unmoved:.4f}",
        )


def _profile(clock: IntArray, count: FloatArray, days: Collection[int]) -> FloatArray:
    """Mean count of each hour of the clock on the weekdays among some days."""
    chosen = np.isin(clock // _DAY_H, [day for day in days if _is_weekday(day)])
    return group_means(count[chosen], clock[chosen] % _DAY_H, _DAY_H)[0]


def _silences(clock: IntArray, count: FloatArray) -> Iterator[LabelFinding]:
    usual = usual_but_for_silence(count, clock % (7 * _DAY_H), 7 * _DAY_H)
    for run in silent_runs(count, usual):
        if run.n >= _DAY_H:
            yield _finding(
                LabelFault.SILENT,
                int(clock[run.first]),
                run.n,
                f"0 for {run.n} h in which {run.expected:.0f} are usual: "
                "a dead sensor, unless the place was closed",
            )


def _clock_changes(clock: IntArray, zone: tzinfo) -> list[tuple[int, bool]]:
    """Clock hours that the zone skips (True) or shows twice (False) in the time of the labels."""
    first_us, last_us = (_utc_us(int(at), zone) for at in (clock.min(), clock.max() + 1))
    changes = []
    for change_us in offset_changes(first_us, last_us, zone):
        before_us, after_us = (offset_us(change_us + step, zone) for step in (-1, 0))
        local_us = change_us + min(before_us, after_us)
        epoch_h = date(1970, 1, 1).toordinal() * _DAY_H
        changes.append((epoch_h + local_us // _HOUR_US, after_us > before_us))
    return changes


def _utc_us(clock_hour: int, zone: tzinfo) -> int:
    day, hour = divmod(clock_hour, _DAY_H)
    return to_us(datetime.combine(date.fromordinal(day), time(hour), tzinfo=zone).astimezone(UTC))


def _is_weekday(day: int) -> bool:
    return date.fromordinal(day).weekday() < 5


def _finding(kind: LabelFault, at: int, n_hours: int, reason: str) -> LabelFinding:
    day, hour = divmod(at, _DAY_H)
    return LabelFinding(kind=kind, day=date.fromordinal(day), hour=hour, n_hours=n_hours, reason=reason)
