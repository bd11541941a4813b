"""How full: the share of time that somebody was in the beam, and how many are in a space."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from ginnel import reports
from ginnel.reports import InsideRow, OccupancyRow
from ginnel.store import Store
from ginnel.web.view import View
from ginnel.words import Space

#: Presences are not rolled up, so a longer view would have to read millions of passages.
MOST_DAYS = 100
#: How many are inside is a question of hours; a week of it is still a picture.
MOST_DAYS_INSIDE = 8


@dataclass(frozen=True, slots=True, kw_only=True)
class Inside:
    """How many are in one space, along the view."""

    space: Space
    rows: tuple[InsideRow, ...]

    @property
    def highest(self) -> InsideRow | None:
        """Find when there were most."""
        known = [row for row in self.rows if row.inside is not None]
        return max(known, key=lambda row: row.inside or 0.0, default=None)

    @property
    def caution(self) -> str:
        """Why not to trust it at its end, where the doubt is largest; empty: nothing against it."""
        return self.rows[-1].caution if self.rows else ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Full:
    """Everything that the page and its charts show."""

    view: View
    every: reports.Every
    is_too_long: bool
    rows: tuple[OccupancyRow, ...]
    spaces: tuple[Inside, ...]  # those that the sensor is a door of

    @property
    def occupied_s(self) -> float:
        """Seconds in which somebody was in the beam."""
        return sum(row.occupied_s or 0.0 for row in self.rows)

    @property
    def listened_s(self) -> float:
        """Seconds listened."""
        return sum(row.listened_s for row in self.rows)

    @property
    def share(self) -> float | None:
        """Share of the time listened in which somebody was in the beam."""
        return self.occupied_s / self.listened_s if self.listened_s else None

    @property
    def fullest(self) -> OccupancyRow | None:
        """Find the interval with the highest share."""
        known = [row for row in self.rows if row.occupancy is not None and row.coverage > 0.5]
        return max(known, key=lambda row: row.occupancy or 0.0, default=None)


def look(store: Store, view: View, spaces: Sequence[Space], now_us: int) -> Full:
    """Ask the reports how full it was; of what is still to come nothing is said."""
    sensor = view.sensor.name
    too_long = view.n_days > MOST_DAYS
    rows: tuple[OccupancyRow, ...] = ()
    if not too_long:
        rows = reports.occupancy(store, [sensor], view.start_us, view.end_us, view.every, view.zone.key)
    behind = [space for space in spaces if any(door.sensor == sensor for door in space.doors)]
    return Full(
        view=view,
        every=view.every,
        is_too_long=too_long,
        rows=rows,
        spaces=tuple(_inside(store, view, space, now_us) for space in behind)
        if view.n_days <= MOST_DAYS_INSIDE
        else (),
    )


def _inside(store: Store, view: View, space: Space, now_us: int) -> Inside:
    every = reports.Every.QUARTER_HOUR if view.n_days == 1 else reports.Every.HOUR
    end_us = int(np.clip(now_us, view.start_us, view.end_us))
    return Inside(space=space, rows=reports.inside(store, space, view.start_us, end_us, every, view.zone))
