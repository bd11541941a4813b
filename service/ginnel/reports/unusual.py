"""What does not fit: hours far outside their history, silence, a direction missing, hearing that fades."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import timedelta, tzinfo
from enum import StrEnum

import numpy as np
from numpy.typing import NDArray

from ginnel import store as log
from ginnel.reports.calendar import calendar
from ginnel.reports.flow import Flow, flow
from ginnel.reports.intervals import Every, cut
from ginnel.reports.volumes import by_day, complete
from ginnel.stats.unusual import (
    against_history,
    chance_of_none,
    runs,
    silent_runs,
    trend,
    usual_but_for_silence,
)
from ginnel.store import Store
from ginnel.times import from_us, to_us
from ginnel.words import Direction, FloatArray

HISTORY_WEEKS = 12
#: Standard deviations: by chance alone once in about 15 years of hours.
FAR = 4.5
#: So unlikely is the silence of a direction before it is told of.
UNLIKELY = 1e-6
#: Loss of level over the stretch and its history before it is told of, and its probability by chance.
FADED_DB = 3.0
_FADED_P = 1e-3
_HOURS_A_WEEK = 7 * 24


class Oddity(StrEnum):
    """What kind of thing does not fit."""

    BUSY = "busy"  # far more than usual for the hours of the week
    QUIET = "quiet"  # far fewer
    SILENT = "silent"  # nobody for a time in which many are usual
    ONE_WAY = "one way"  # a direction has gone missing
    FADING = "fading"  # passages are heard weaker and weaker


@dataclass(frozen=True, slots=True, kw_only=True)
class Finding:
    """One thing that does not fit, with the reason in a sentence."""

    kind: Oddity
    sensor: str
    start_us: int
    end_us: int
    direction: Direction | None
    observed: float
    expected: float
    reason: str


def unusual(store: Store, sensor: str, start_us: int, end_us: int, zone: tzinfo) -> tuple[Finding, ...]:
    """What does not fit in [start_us, end_us), held against the twelve weeks before and itself; by time."""
    since_us = to_us(from_us(start_us, zone) - timedelta(weeks=HISTORY_WEEKS))
    hours = flow(store, sensor, cut(since_us, end_us, Every.HOUR, zone))
    found = [one for one in unusual_of(sensor, hours, zone) if one.end_us > start_us]
    found += _fading(store, sensor, cut(since_us, end_us, Every.DAY, zone).tolist())
    return tuple(sorted(found, key=lambda one: (one.start_us, one.kind)))


def unusual_of(name: str, hours: Flow, zone: tzinfo) -> tuple[Finding, ...]:
    """What does not fit in hours of a sensor or counted by others, held against each other; by time."""
    local = calendar(hours.edges_us[:-1], zone)
    group = local.weekday * 24 + local.hour
    counts = complete(hours)
    found = [*_silent(name, hours, counts, group), *_one_way(name, by_day(hours, zone))]
    for one in found:
        if one.kind is Oddity.SILENT:  # told once: not as quiet hours too
            counts[_within(hours, one)] = np.nan
    found += _far_off(name, hours, counts, group)
    return tuple(sorted(found, key=lambda one: (one.start_us, one.kind)))


def _far_off(name: str, hours: Flow, counts: FloatArray, group: NDArray[np.int64]) -> Iterator[Finding]:
    history = against_history(counts, group, _HOURS_A_WEEK)
    for kind, is_far, word in (
        (Oddity.BUSY, history.surprise >= FAR, "more"),
        (Oddity.QUIET, history.surprise <= -FAR, "fewer"),
    ):
        for first, last in runs(is_far):
            observed = float(np.sum(counts[first:last]))
            expected = float(np.sum(history.median[first:last]))
            yield Finding(
                kind=kind,
                sensor=name,
                start_us=int(hours.edges_us[first]),
                end_us=int(hours.edges_us[last]),
                direction=None,
                observed=observed,
                expected=expected,
                reason=f"{observed:.0f} passed where {expected:.0f} are usual for these hours of the week, "
                f"far {word} than they vary",
            )


def _silent(name: str, hours: Flow, counts: FloatArray, group: NDArray[np.int64]) -> Iterator[Finding]:
    for run in silent_runs(counts, usual_but_for_silence(counts, group, _HOURS_A_WEEK)):
        yield Finding(
            kind=Oddity.SILENT,
            sensor=name,
            start_us=int(hours.edges_us[run.first]),
            end_us=int(hours.edges_us[run.first + run.n]),
            direction=None,
            observed=0.0,
            expected=run.expected,
            reason=f"nobody for {run.n} h in which {run.expected:.0f} are usual: "
            "a dead sensor, unless the place was closed",
        )


def _one_way(name: str, days: Flow) -> Iterator[Finding]:
    ways = {way: days.counts.get(way) for way in (Direction.APPROACHING, Direction.RECEDING)}
    both = np.sum([count for count in ways.values() if count is not None], axis=0)
    for way, count in ways.items():
        if count is None or not np.any(count > 0):
            continue  # a place that never has this direction
        some = count > 0
        share = float(count[some].sum() / both[some].sum())
        missing = (count == 0) & (chance_of_none(both, min(share, 1 - 1e-9)) < UNLIKELY)
        for first, last in runs(missing):
            passed = float(both[first:last].sum())
            yield Finding(
                kind=Oddity.ONE_WAY,
                sensor=name,
                start_us=int(days.edges_us[first]),
                end_us=int(days.edges_us[last]),
                direction=way,
                observed=0.0,
                expected=passed * share,
                reason=f"none of {passed:.0f} passages was {way.value}, which {share:.0%} usually are",
            )


def _fading(store: Store, sensor: str, edges_us: list[int]) -> Iterator[Finding]:
    """Trend of each day's median level over noise."""
    snr_db = np.full(len(edges_us) - 1, np.nan)
    for i in range(len(snr_db)):
        columns = log.iter_passage_columns(store, sensor, edges_us[i], edges_us[i + 1])
        levels = np.concatenate([np.empty(0), *(passages.snr_db for passages in columns)])
        if np.any(np.isfinite(levels)):
            snr_db[i] = np.nanmedian(levels)
    known = np.flatnonzero(np.isfinite(snr_db))
    line = trend(np.arange(len(snr_db), dtype=float), snr_db)
    if line is None or line.p_value > _FADED_P:
        return
    n_days = int(known[-1] - known[0])
    change_db = line.slope * n_days
    if change_db > -FADED_DB:
        return
    yield Finding(
        kind=Oddity.FADING,
        sensor=sensor,
        start_us=edges_us[int(known[0])],
        end_us=edges_us[int(known[-1]) + 1],
        direction=None,
        observed=float(snr_db[known[-1]]),
        expected=float(snr_db[known[-1]]) - change_db,
        reason=f"passages are heard {-change_db:.1f} dB weaker than {n_days} days before: "
        "dirt or water on the sensor, a mounting that moved, or a failing module",
    )


def _within(hours: Flow, one: Finding) -> NDArray[np.bool_]:
    return (hours.edges_us[:-1] >= one.start_us) & (hours.edges_us[:-1] < one.end_us)
