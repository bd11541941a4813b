"""What there is to ask about: the site, its sensors, and when they were heard."""

from __future__ import annotations

from dataclasses import dataclass

from ginnel import store as log
from ginnel.reports.facts import site
from ginnel.store import Store
from ginnel.words import Sensor, Site


@dataclass(frozen=True, slots=True, kw_only=True)
class Stretch:
    """A stretch of time, [started_us, ended_us), in which a sensor was listening."""

    started_us: int
    ended_us: int


@dataclass(frozen=True, slots=True, kw_only=True)
class Overview:
    """The site and the sensors of a store."""

    site: Site
    sensors: tuple[Sensor, ...]


def overview(store: Store) -> Overview:
    """Tell whose log it is; a store without a site is at an unnamed one in UTC."""
    return Overview(site=site(store), sensors=tuple(log.sensors(store)))


def extent_us(store: Store, sensor: str | None = None) -> tuple[int, int] | None:
    """From the first to the last moment known of a sensor (of all), half-open; None when empty."""
    return log.extent_us(store, sensor)


def heard(store: Store, sensor: str, start_us: int, end_us: int) -> tuple[Stretch, ...]:
    """Stretches of [start_us, end_us) in which a sensor listened, in order, those that touch joined."""
    joined: list[Stretch] = []
    for logged in log.spans(store, sensor, start_us, end_us):
        begin_us, stop_us = max(logged.span.started_us, start_us), min(logged.span.ended_us, end_us)
        if begin_us >= stop_us:
            continue
        if joined and begin_us <= joined[-1].ended_us:
            begin_us = joined[-1].started_us
            stop_us = max(stop_us, joined.pop().ended_us)
        joined.append(Stretch(started_us=begin_us, ended_us=stop_us))
    return tuple(joined)


def unheard(store: Store, sensor: str, start_us: int, end_us: int) -> tuple[Stretch, ...]:
    """Stretches of [start_us, end_us) in which a sensor did not listen, in order."""
    edges = [start_us]
    for stretch in heard(store, sensor, start_us, end_us):
        edges += [stretch.started_us, stretch.ended_us]
    edges.append(end_us)
    return tuple(
        Stretch(started_us=a, ended_us=b) for a, b in zip(edges[::2], edges[1::2], strict=True) if b > a
    )
