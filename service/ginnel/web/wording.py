"""How pages write numbers, speeds, times and dates: in the site's zone, by locale and chosen unit.

Inside, everything is SI and UTC; this is the one place where a page leaves them.
"""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, datetime
from zoneinfo import ZoneInfo

from babel import Locale
from babel.dates import format_date, format_skeleton, format_time
from babel.lists import format_list
from babel.numbers import format_decimal, format_percent

from ginnel.reports import Every
from ginnel.times import from_us
from ginnel.web.view import Show, View
from ginnel.words import Direction, Sensor

#: Units of speed that a page may show, as multiples of 1 m/s: 3600 / 1000, and 3600 / 1609.344 (the
#: international mile of 1959, exact).
PER_MPS = {"m/s": 1.0, "km/h": 3.6, "mph": 3600 / 1609.344}
BLANK = "\N{EN DASH}"
THIN = "\N{NARROW NO-BREAK SPACE}"


@dataclass(frozen=True, slots=True, kw_only=True)
class Wording:
    """A locale, a zone and a unit of speed."""

    locale: Locale
    zone: ZoneInfo
    units: str

    def number(self, value: float | None, decimals: int = 0) -> str:
        """Write a number with its decimals and grouping; a dash where there is none."""
        if value is None:
            return BLANK
        digits = "0" * decimals
        return str(format_decimal(value, format=f"#,##0.{digits}" if digits else "#,##0", locale=self.locale))

    def share(self, value: float | None, decimals: int = 0) -> str:
        """Write a share of 1 as per cent. What is nearly, but not quite, all or nothing says so."""
        if value is None:
            return BLANK
        pattern = self.locale.percent_formats[None].pattern
        pattern = pattern.replace("#,##0", "#,##0." + "0" * decimals if decimals else "#,##0")
        smallest = 10.0 ** -(decimals + 2)
        if 0 < value < smallest / 2:
            return f"<{THIN}{format_percent(smallest, pattern, locale=self.locale)}"
        if 1 - smallest / 2 <= value < 1:
            return f">{THIN}{format_percent(1 - smallest, pattern, locale=self.locale)}"
        return str(format_percent(value, pattern, locale=self.locale))

    def speed(self, value_mps: float | None, decimals: int | None = None) -> str:
        """Write a speed in the chosen unit, without its name."""
        if value_mps is None:
            return BLANK
        return self.number(
            value_mps * PER_MPS[self.units], self.speed_decimals if decimals is None else decimals
        )

    @property
    def speed_decimals(self) -> int:
        """Decimals that a speed is worth."""
        return 2 if self.units == "m/s" else 1

    def clock(self, moment_us: int, *, seconds: bool = False) -> str:
        """Write the time of day at the site."""
        hours = self.locale.time_formats["short"].pattern
        half_days = "a" in hours and self.locale.territory is not None  # plain "en" is read everywhere
        pattern = ("h:mm:ss a" if seconds else "h:mm a") if half_days else "HH:mm:ss" if seconds else "HH:mm"
        return str(format_time(self._local(moment_us), pattern, locale=self.locale))

    def day(self, day: date, *, weekday: bool = True, year: bool = True) -> str:
        """Write a date: Monday 2 March 2026."""
        skeleton = ("y" if year else "") + "MMMMd"
        text = self._skeleton(skeleton, day)
        return f"{format_date(day, 'EEEE', locale=self.locale)} {text}" if weekday else text

    def weekday(self, number: int, *, short: bool = False) -> str:
        """Name of a weekday, 0 is Monday."""
        return str(self.locale.days["stand-alone"]["abbreviated" if short else "wide"][number])

    def month(self, number: int) -> str:
        """Short name of a month, 1 is January."""
        return str(self.locale.months["stand-alone"]["abbreviated"][number])

    def day_of(self, moment_us: int, *, weekday: bool = True, year: bool = False) -> str:
        """Write the day of a moment."""
        return self.day(self._local(moment_us).date(), weekday=weekday, year=year)

    def month_of(self, moment_us: int) -> str:
        """Write the month of a moment: March 2026."""
        return self._skeleton("yMMMM", self._local(moment_us).date())

    def moment(self, moment_us: int) -> str:
        """Write day and time of a moment."""
        return f"{self.day_of(moment_us)}, {self.clock(moment_us)}"

    def iso(self, moment_us: int) -> str:
        """Write a moment for machines."""
        return self._local(moment_us).isoformat(timespec="seconds")

    def period(self, view: View) -> str:
        """Write what a view looks at: a day, week 10, a month, a year, or from when to when."""
        match view.show:
            case Show.DAY:
                return self.day(view.first)
            case Show.WEEK:
                year, week, _ = view.first.isocalendar()
                return f"Week {week} of {year}, {self.days(view.first, view.last)}"
            case Show.MONTH:
                return self._skeleton("yMMMM", view.first)
            case Show.YEAR:
                return f"{view.first.year}"
            case Show.RANGE:
                return self.days(view.first, view.last)

    def days(self, first: date, last: date) -> str:
        """Write two days and what lies between."""
        if first == last:
            return self.day(first)
        begin = self.day(first, weekday=False, year=first.year != last.year)
        if (first.year, first.month) == (last.year, last.month) and begin.startswith(str(first.day)):
            begin = str(first.day)
        return f"{begin} to {self.day(last, weekday=False)}"

    def duration(self, seconds: float) -> str:
        """Write a length of time in its two largest parts."""
        minutes, hours = round(seconds / 60), round(seconds / 3600)
        if seconds < 90:
            return f"{self.number(seconds)}{THIN}s"
        if minutes < 60:
            return f"{minutes}{THIN}min"
        if hours < 48:
            rest = f" {minutes % 60}{THIN}min" if minutes % 60 else ""
            return f"{minutes // 60}{THIN}h{rest}"
        rest = f" {hours % 24}{THIN}h" if hours % 24 else ""
        return f"{self.number(hours // 24)} days{rest}"

    def listed(self, parts: list[str]) -> str:
        """Join some words: a, b and c."""
        return str(format_list(parts, locale=self.locale))

    def _skeleton(self, skeleton: str, day: date) -> str:
        noon = datetime(day.year, day.month, day.day, 12, tzinfo=self.zone)
        return str(format_skeleton(skeleton, noon, tzinfo=self.zone, locale=self.locale))

    def _local(self, moment_us: int) -> datetime:
        return from_us(moment_us, self.zone)


def name_of(direction: Direction | None, sensor: Sensor) -> str:
    """Plain name of a direction at this sensor."""
    names = {
        Direction.APPROACHING: sensor.approaching_name,
        Direction.RECEDING: sensor.receding_name,
        Direction.UNKNOWN: "direction unknown",
        None: "both ways",
    }
    return names[direction]


def interval_name(view: View, every: Every, start_us: int, wording: Wording) -> str:
    """Name an interval of a view by its start."""
    if every is Every.HOUR:
        return wording.clock(start_us) if view.n_days == 1 else wording.moment(start_us)
    if every is Every.MONTH:
        return wording.month_of(start_us)
    day = wording.day_of(start_us, weekday=every is Every.DAY, year=view.n_days > 366)
    return f"week from {day}" if every is Every.WEEK else day
