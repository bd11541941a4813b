"""What a page looks at: one sensor and a stretch of the site's calendar, as it stands in the address.

``?sensor=north-corridor&show=week&on=2026-03-02`` is the ISO week that holds that day;
``show=range&on=2026-03-02&to=2026-03-20`` is both days and all between them. So every view is a URL.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from datetime import date, datetime, timedelta
from enum import StrEnum
from zoneinfo import ZoneInfo

from ginnel.reports import Every
from ginnel.times import to_us
from ginnel.words import Sensor

YEARS = range(1971, 2200)
MOST_DAYS = 3660
DAY = timedelta(days=1)


class Show(StrEnum):
    """How much of the calendar is looked at."""

    DAY = "day"
    WEEK = "week"
    MONTH = "month"
    YEAR = "year"
    RANGE = "range"


class ViewError(ValueError):
    """The address asks for something that no calendar has; one line says what."""


@dataclass(frozen=True, slots=True, kw_only=True)
class View:
    """One sensor and whole days of the site, ``first`` to ``last``, both included."""

    sensor: Sensor
    zone: ZoneInfo
    show: Show
    first: date
    last: date

    @property
    def start_us(self) -> int:
        """First moment of the view."""
        return day_start_us(self.first, self.zone)

    @property
    def end_us(self) -> int:
        """First moment after the view."""
        return day_start_us(self.last + DAY, self.zone)

    @property
    def n_days(self) -> int:
        """How many days of the calendar."""
        return (self.last - self.first).days + 1

    @property
    def every(self) -> Every:
        """Length of the intervals that such a view is cut into."""
        if self.n_days <= 8:
            return Every.HOUR
        if self.n_days <= 100:
            return Every.DAY
        return Every.WEEK if self.n_days <= 800 else Every.MONTH

    @property
    def query(self) -> dict[str, str]:
        """What stands in the address for this view."""
        asked = {"sensor": self.sensor.name, "show": self.show.value, "on": self.first.isoformat()}
        return asked | {"to": self.last.isoformat()} if self.show is Show.RANGE else asked

    def earlier(self) -> View | None:
        """Give the same length of time just before; None where the calendar ends."""
        return self._at(self.first - DAY, -self.n_days)

    def later(self) -> View | None:
        """Give the same length of time just after; None where the calendar ends."""
        return self._at(self.last + DAY, self.n_days)

    def shown_as(self, show: Show, on: date) -> View:
        """Give the day, week, month or year that holds a day."""
        first, last = bounds(show, on, self.last if show is Show.RANGE else None)
        return replace(self, show=show, first=first, last=last)

    def _at(self, day: date, shift_days: int) -> View | None:
        if self.show is not Show.RANGE:
            first, last = bounds(self.show, day)
        else:
            first, last = self.first + shift_days * DAY, self.last + shift_days * DAY
        if first.year not in YEARS or last.year not in YEARS:
            return None
        return replace(self, first=first, last=last)


def bounds(show: Show, on: date, to: date | None = None) -> tuple[date, date]:
    """First and last day of the day, week (ISO, from Monday), month, year or range that holds a day."""
    match show:
        case Show.DAY:
            return on, on
        case Show.WEEK:
            monday = on - timedelta(days=on.weekday())
            return monday, monday + 6 * DAY
        case Show.MONTH:
            first = on.replace(day=1)
            return first, (first + timedelta(days=31)).replace(day=1) - DAY
        case Show.YEAR:
            return on.replace(month=1, day=1), on.replace(month=12, day=31)
        case Show.RANGE:
            last = on if to is None else to
            return min(on, last), max(on, last)


def read_view(asked: Mapping[str, str], sensor: Sensor, zone: ZoneInfo, newest: date) -> View:
    """Read a view from the words of an address; ``newest`` is the day to show where none is named.

    Raises
    ------
    ViewError
        A word is not understood, or the time asked for is longer than ten years.
    """
    try:
        show = Show(asked.get("show", Show.DAY))
    except ValueError:
        known = ", ".join(Show)
        raise ViewError(f"show={asked['show']} is not understood: it is one of {known}") from None
    on = _day(asked.get("on"), newest)
    first, last = bounds(show, on, _day(asked.get("to"), on))
    if (last - first).days >= MOST_DAYS:
        raise ViewError("That is more than ten years: ask for less at a time.")
    return View(sensor=sensor, zone=zone, show=show, first=first, last=last)


def day_start_us(day: date, zone: ZoneInfo) -> int:
    """First moment of a day of the site."""
    return to_us(datetime(day.year, day.month, day.day, tzinfo=zone))


def _day(text: str | None, default: date) -> date:
    if not text:
        return default
    try:
        day = date.fromisoformat(text)
    except ValueError:
        raise ViewError(f"{text} is not a day such as 2026-03-02.") from None
    if day.year not in YEARS:
        raise ViewError(f"{text} is outside the years that a log can hold.")
    return day
