"""How busy: counts by interval and direction, what is usual, and the busiest hours of the week."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel import reports
from ginnel.reports import overview as about
from ginnel.reports.flow import Flow, Total, TypicalWeek, Usual, joined, typical_week_of
from ginnel.reports.flow import flow as flow_of
from ginnel.reports.flow import total as total_of
from ginnel.reports.flow import usual as usual_of
from ginnel.store import Store
from ginnel.web.view import View
from ginnel.words import Direction


@dataclass(frozen=True, slots=True, kw_only=True)
class Interval:
    """One bar; what is None was not listened to, or has no usual."""

    start_us: int
    end_us: int
    counts: dict[Direction, int | None]
    both: int | None
    coverage: float
    usual: dict[Direction | None, float | None]  # None is both ways
    usual_low: float | None  # both ways
    usual_high: float | None


@dataclass(frozen=True, slots=True, kw_only=True)
class Busy:
    """Everything that the page and its charts show."""

    view: View
    every: reports.Every
    intervals: tuple[Interval, ...]
    total: Total
    gaps: tuple[about.Stretch, ...]
    week: TypicalWeek | None  # None: less than a week is looked at

    @property
    def directions(self) -> tuple[Direction, ...]:
        """Directions to show: approaching, receding, and unknown where there is any."""
        return tuple(self.total.counts)

    @property
    def busiest(self) -> Interval | None:
        """Find the interval with the highest count; None where nobody passed."""
        heard = [interval for interval in self.intervals if interval.both]
        return max(heard, key=lambda interval: interval.both or 0, default=None)

    @property
    def compared(self) -> tuple[int, float] | None:
        """What was counted, and what is usual, in the intervals in which both are known."""
        usual = [interval.usual[None] for interval in self.intervals]
        pairs = [
            (interval.both, level)
            for interval, level in zip(self.intervals, usual, strict=True)
            if interval.both is not None and level is not None
        ]
        if not pairs or sum(level for _, level in pairs) <= 0:
            return None
        return sum(both for both, _ in pairs), sum(level for _, level in pairs)


def look(store: Store, view: View, now_us: int) -> Busy:
    """Ask the reports how busy it was; what is still to come is no gap."""
    sensor, every = view.sensor.name, view.every
    edges_us = reports.cut(view.start_us, view.end_us, every, view.zone)
    # the hours are read once; whatever is shown is made of them
    hour_edges_us = reports.cut(int(edges_us[0]), int(edges_us[-1]), reports.Every.HOUR, view.zone)
    hours = flow_of(store, sensor, hour_edges_us)
    own = joined(hours, reports.cut(view.start_us, view.end_us, reports.Every.HOUR, view.zone))
    return Busy(
        view=view,
        every=every,
        intervals=_intervals(joined(hours, edges_us), usual_of(store, sensor, edges_us, every, view.zone)),
        total=total_of(own, now_us),
        gaps=about.unheard(store, sensor, view.start_us, min(view.end_us, max(now_us, view.start_us))),
        week=typical_week_of(own, view.zone) if view.n_days >= 7 else None,
    )


def _intervals(found: Flow, usual: dict[Direction | None, Usual]) -> tuple[Interval, ...]:
    both, known, coverage = found.both, found.is_known, found.coverage
    return tuple(
        Interval(
            start_us=int(found.edges_us[i]),
            end_us=int(found.edges_us[i + 1]),
            counts={way: int(count[i]) if known[i] else None for way, count in found.counts.items()},
            both=int(both[i]) if known[i] else None,
            coverage=float(coverage[i]),
            usual={way: _known(one.median[i]) for way, one in usual.items()},
            usual_low=_known(usual[None].low[i]),
            usual_high=_known(usual[None].high[i]),
        )
        for i in range(len(both))
    )


def _known(value: float) -> float | None:
    return float(value) if np.isfinite(value) else None
