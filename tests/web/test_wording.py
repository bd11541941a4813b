"""How numbers, speeds and times are written. Forms of locales are those of Unicode's CLDR, through Babel."""

from __future__ import annotations

from datetime import UTC, date, datetime
from zoneinfo import ZoneInfo

import pytest
from babel import Locale

from ginnel.reports import Every
from ginnel.times import to_us
from ginnel.web.view import Show, View
from ginnel.web.wording import PER_MPS, Wording, interval_name
from ginnel.words import Sensor

THIN = "\N{NARROW NO-BREAK SPACE}"


def wording(locale: str = "en_IE", units: str = "m/s") -> Wording:
    return Wording(locale=Locale.parse(locale), zone=ZoneInfo("Europe/Dublin"), units=units)


def test_units_of_speed_are_exact() -> None:
    # 1 mi/h = 0.44704 m/s exactly (NIST SP 811, appendix B.8); 1 m/s = 3.6 km/h by definition
    assert PER_MPS["mph"] * 0.44704 == pytest.approx(1, rel=1e-15)
    assert PER_MPS["km/h"] == 3.6


@pytest.mark.parametrize(
    ("units", "text"), [("m/s", "13.41"), ("km/h", "48.3"), ("mph", "30.0")], ids=["SI", "metric", "miles"]
)
def test_thirty_miles_an_hour_in_each_unit(units: str, text: str) -> None:
    assert wording(units=units).speed(30 * 0.44704) == text


def test_numbers_follow_the_locale() -> None:
    assert wording().number(12345.6, 1) == "12,345.6"
    assert wording("de").number(12345.6, 1) == "12.345,6"
    assert wording().number(None) == "\N{EN DASH}"


def test_what_is_nearly_all_or_nothing_is_neither() -> None:
    assert wording().share(1.0) == "100%"
    assert wording().share(0.9999) == f">{THIN}99%"
    assert wording().share(0.0) == "0%"
    assert wording().share(0.0001) == f"<{THIN}1%"
    assert wording().share(0.1234, 1) == "12.3%"
    assert wording("de").share(0.1234, 1) == "12,3\N{NO-BREAK SPACE}%"


def test_times_are_the_sites() -> None:
    summer = to_us(datetime(2026, 7, 1, 12, 0, 5, tzinfo=UTC))
    assert wording().clock(summer) == "13:00"
    assert wording().clock(summer, seconds=True) == "13:00:05"
    assert wording("en_US").clock(summer).replace(THIN, " ") == "1:00 PM"
    assert wording().moment(summer) == "Wednesday 1 July, 13:00"
    assert wording().iso(summer) == "2026-07-01T13:00:05+01:00"


def test_an_interval_is_named_as_a_person_would() -> None:
    zone = ZoneInfo("Europe/Dublin")
    years = View(
        sensor=Sensor(name="lane"),
        zone=zone,
        show=Show.RANGE,
        first=date(2023, 1, 1),
        last=date(2026, 7, 31),
    )
    july = to_us(datetime(2026, 7, 1, tzinfo=zone))
    assert interval_name(years, Every.MONTH, july, wording()) == "July 2026"
    assert interval_name(years, Every.MONTH, july, wording("de")) == "Juli 2026"
    assert interval_name(years, Every.WEEK, july, wording()) == "week from 1 July 2026"
    assert interval_name(years, Every.HOUR, july, wording()) == "Wednesday 1 July, 00:00"


def test_days_are_told_once() -> None:
    assert wording().days(date(2026, 4, 6), date(2026, 4, 12)) == "6 to 12 April 2026"
    assert wording().days(date(2026, 3, 30), date(2026, 4, 5)) == "30 March to 5 April 2026"
    assert wording().days(date(2025, 12, 29), date(2026, 1, 4)) == "29 December 2025 to 4 January 2026"


@pytest.mark.parametrize(
    ("seconds", "text"),
    [(45, "45 s"), (600, "10 min"), (5400, "1 h 30 min"), (7200, "2 h"), (200_000, "2 days 8 h")],
)
def test_durations_have_two_parts_at_most(seconds: float, text: str) -> None:
    assert wording().duration(seconds).replace(THIN, " ") == text
