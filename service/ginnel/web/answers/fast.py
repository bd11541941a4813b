"""How fast: the distribution of speeds, its percentiles and pace, by direction, by hour and over weeks."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise

from ginnel import reports
from ginnel.reports.speed_profile import (
    SpeedProfile,
    clock_hours,
    profiles_of,
    read_speeds,
    speeds_along,
)
from ginnel.stats import SpeedSummary
from ginnel.store import Store
from ginnel.web.view import View
from ginnel.words import Direction

#: Fewer speeds than this have no 85th percentile worth drawing.
FEW = 10
#: Width of the pace and of the bars, m/s, for feet and for roads (there 10 mph, as is the custom).
FOOT = (0.5, 0.1)
ROAD = (4.4704, 1.0)


@dataclass(frozen=True, slots=True, kw_only=True)
class Moment:
    """Speeds of one interval, both ways together."""

    start_us: int
    end_us: int
    summary: SpeedSummary


@dataclass(frozen=True, slots=True, kw_only=True)
class Fast:
    """Everything that the page and its charts show."""

    view: View
    every: reports.Every
    bin_mps: float
    pace_width_mps: float
    limit_mps: float | None
    profiles: tuple[SpeedProfile, ...]  # of each direction, and of all last
    along: tuple[Moment, ...]
    by_hour: tuple[SpeedSummary, ...]  # of the 24 hours of the clock

    @property
    def all(self) -> SpeedProfile:
        """All directions together."""
        return self.profiles[-1]

    @property
    def directions(self) -> tuple[Direction, ...]:
        """Directions that have speeds to show."""
        return tuple(one.direction for one in self.profiles if one.direction is not None)


def look(store: Store, view: View, limit_mps: float | None) -> Fast:
    """Ask the reports how fast they went."""
    pace_width_mps, bin_mps = FOOT if view.sensor.max_speed_mps <= 10 else ROAD
    hours = read_speeds(store, view.sensor.name, view.start_us, view.end_us, view.zone)
    edges_us = reports.cut(view.start_us, view.end_us, view.every, view.zone)
    return Fast(
        view=view,
        every=view.every,
        bin_mps=bin_mps,
        pace_width_mps=pace_width_mps,
        limit_mps=limit_mps,
        profiles=profiles_of(hours, bin_mps=bin_mps, pace_width_mps=pace_width_mps, limit_mps=limit_mps),
        along=tuple(
            Moment(start_us=start_us, end_us=end_us, summary=summary)
            for (start_us, end_us), summary in zip(
                pairwise(edges_us.tolist()), speeds_along(hours, edges_us), strict=True
            )
        ),
        by_hour=clock_hours(hours, view.zone),
    )
