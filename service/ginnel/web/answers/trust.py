"""How far to trust: coverage and its gaps, and with what the log was made."""

from __future__ import annotations

from dataclasses import dataclass

from ginnel import reports
from ginnel.reports import overview as about
from ginnel.reports.conditions import conditions_during, health_course
from ginnel.reports.flow import Flow, Total
from ginnel.reports.flow import flow as flow_of
from ginnel.reports.flow import total as total_of
from ginnel.store import Store
from ginnel.web.view import View
from ginnel.words import US_PER_S, Condition, HealthSample

#: Pages list at most so many gaps, the longest ones.
MOST_GAPS = 50
#: What does not fit is looked for in so many days at most; it is held against the twelve weeks before.
MOST_DAYS_ODD = 100
HISTORY_US = 12 * 7 * 86_400 * US_PER_S


@dataclass(frozen=True, slots=True, kw_only=True)
class Trust:
    """Everything that the page and its charts show."""

    view: View
    every: reports.Every
    flow: Flow
    total: Total
    gaps: tuple[about.Stretch, ...]  # the longest ones, in order of time
    n_gaps: int
    facts: reports.SensorFacts
    troubles: tuple[Condition, ...]
    course: tuple[HealthSample, ...]  # single minutes at even steps

    @property
    def coverage(self) -> tuple[tuple[int, int, float], ...]:
        """Start, end and coverage of each interval."""
        edges_us, coverage = self.flow.edges_us, self.flow.coverage
        return tuple(
            (int(edges_us[i]), int(edges_us[i + 1]), float(coverage[i])) for i in range(len(coverage))
        )


def look(store: Store, view: View, now_us: int) -> Trust:
    """Ask how much of the time somebody listened; what is still to come is no gap."""
    sensor, end_us = view.sensor.name, min(view.end_us, max(now_us, view.start_us))
    edges_us = reports.cut(view.start_us, view.end_us, view.every, view.zone)
    found = flow_of(store, sensor, edges_us)
    gaps = about.unheard(store, sensor, view.start_us, end_us)
    longest = sorted(gaps, key=lambda gap: gap.started_us - gap.ended_us)[:MOST_GAPS]
    (facts,) = reports.sensor_facts(store, [sensor])
    return Trust(
        view=view,
        every=view.every,
        flow=found,
        total=total_of(found, now_us),
        gaps=tuple(sorted(longest, key=lambda gap: gap.started_us)),
        n_gaps=len(gaps),
        facts=facts,
        troubles=conditions_during(store, sensor, view.start_us, view.end_us),
        course=tuple(
            one for one in health_course(store, sensor, view.start_us, view.end_us) if one is not None
        ),
    )


def oddities(store: Store, view: View, now_us: int) -> tuple[reports.Finding, ...]:
    """Hours that do not fit the twelve weeks before and the view itself; none where too much is asked for."""
    end_us = min(view.end_us, max(now_us, view.start_us))
    if view.start_us >= end_us or view.n_days > MOST_DAYS_ODD:
        return ()
    first_us = view.start_us - HISTORY_US
    hours = flow_of(store, view.sensor.name, reports.cut(first_us, end_us, reports.Every.HOUR, view.zone))
    found = reports.unusual_of(view.sensor.name, hours, view.zone)
    return tuple(one for one in found if one.end_us > view.start_us)
