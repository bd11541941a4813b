"""Records of the Traffic Monitoring Guide, taken apart by column and compared with the log.

Columns: the 2013 and 2016 editions' field notes as reprinted in a public library that reads such files (the
source has them from 1). Codes of days and directions: from memory.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
import pytest
from pydantic import ValidationError

from ginnel.config import StationSettings
from ginnel.errors import ConfigError
from ginnel.export import Question
from ginnel.export.tmg import speed_records, volume_records
from ginnel.store import Store, put_site, record_span
from ginnel.words import Direction, Passage, Sensor, Site, Span

S = 1_000_000
HOUR = 3600 * S
MPH = 0.44704  # m/s, exact
MONDAY = 1_772_427_600 * S  # 2026-03-02T00:00 in New York
STATION = StationSettings(
    state="36", station="4001", functional_class="7U", approaching=1, receding=5, lane=0
)
ROAD = Sensor(name="road", max_speed_mps=60.0)

VOLUME = {  # first and last column
    "type": (1, 1),
    "state": (2, 3),
    "functional_class": (4, 5),
    "station": (6, 11),
    "direction": (12, 12),
    "lane": (13, 13),
    "year": (14, 17),
    "month": (18, 19),
    "day": (20, 21),
    "weekday": (22, 22),
    "restrictions": (143, 143),
} | {f"hour_{h:02d}": (23 + 5 * h, 27 + 5 * h) for h in range(24)}
SPEED = {
    "type": (1, 1),
    "state": (2, 3),
    "station": (4, 9),
    "direction": (10, 10),
    "lane": (11, 11),
    "year": (12, 15),
    "month": (16, 17),
    "day": (18, 19),
    "hour": (20, 21),
    "interval": (22, 22),
    "first_bin": (23, 23),
    "n_bins": (24, 25),
    "total": (26, 30),
} | {f"bin_{b:02d}": (31 + 5 * b, 35 + 5 * b) for b in range(15)}


def parsed(line: str, columns: dict[str, tuple[int, int]]) -> dict[str, str]:
    assert len(line) == max(last for _, last in columns.values())
    return {name: line[first - 1 : last] for name, (first, last) in columns.items()}


def passage(crossed_us: int, direction: Direction, speed_mps: float | None) -> Passage:
    return Passage(
        started_us=crossed_us,
        crossed_us=crossed_us,
        ended_us=crossed_us,
        direction=direction,
        direction_confidence=None if direction is Direction.UNKNOWN else 0.9,
        speed_mps=speed_mps,
        speed_se_mps=None,
        snr_db=None,
    )


def record(store: Store, start_us: int, end_us: int, passages: Sequence[Passage] = ()) -> None:
    span = Span(started_us=start_us, ended_us=end_us, sample_rate_hz=8000.0)
    record_span(store, ROAD, span, list(passages), "1")


@pytest.fixture
def road(store: Store) -> Store:
    put_site(store, Site(name="Mill road", timezone="America/New_York"))
    return store


def test_volumes_read_back_by_column(road: Store) -> None:
    rng = np.random.default_rng(1)
    wanted = rng.integers(0, 60, (2, 24))
    passages = [
        passage(MONDAY + hour * HOUR + n * S + way, direction, 15.0)
        for way, direction in enumerate((Direction.APPROACHING, Direction.RECEDING))
        for hour in range(24)
        for n in range(wanted[way, hour])
    ]
    record(road, MONDAY, MONDAY + 24 * HOUR, passages)
    records = volume_records(road, Question(), {"road": STATION})
    found = [parsed(line, VOLUME) for line in records.lines]
    assert [one["direction"] for one in found] == ["1", "5"]
    for way, one in enumerate(found):
        assert [int(one[f"hour_{hour:02d}"]) for hour in range(24)] == wanted[way].tolist()
        assert (one["type"], one["state"], one["functional_class"], one["station"]) == (
            "3",
            "36",
            "7U",
            "004001",
        )
        assert (one["year"], one["month"], one["day"], one["weekday"]) == ("2026", "03", "02", "2")
        assert (one["lane"], one["restrictions"]) == ("0", "0")


def test_an_hour_that_was_not_heard_in_full_is_blank_not_zero(road: Store) -> None:
    record(road, MONDAY + HOUR, MONDAY + 2 * HOUR)
    record(road, MONDAY + 3 * HOUR, MONDAY + 3 * HOUR + HOUR // 2)
    record(road, MONDAY + 48 * HOUR, MONDAY + 48 * HOUR + 60 * S)  # a day without one full hour
    lines = volume_records(road, Question(), {"road": STATION}).lines
    assert len(lines) == 2
    hours = parsed(lines[0], VOLUME)
    assert [hours[f"hour_{hour:02d}"] for hour in range(4)] == ["     ", "00000", "     ", "     "]


def test_the_hour_that_the_clock_shows_twice_goes_into_its_one_place(road: Store) -> None:
    # New York, 1 November 2026: 01:00 comes twice; and 8 March has no 02:00
    autumn, spring = 1_793_505_600 * S, 1_772_946_000 * S
    for midnight, n_hours in ((autumn, 25), (spring, 23)):
        passages = [passage(midnight + h * HOUR + S, Direction.APPROACHING, 15.0) for h in range(n_hours)]
        record(road, midnight, midnight + n_hours * HOUR, passages)
    days = [parsed(line, VOLUME) for line in volume_records(road, Question(), {"road": STATION}).lines]
    by_date = {one["month"] + one["day"]: one for one in days if one["direction"] == "1"}
    assert [by_date["1101"][f"hour_{hour:02d}"] for hour in range(4)] == ["00001", "00002", "00001", "00001"]
    assert [by_date["0308"][f"hour_{hour:02d}"] for hour in range(4)] == ["00001", "00001", "     ", "00001"]
    assert by_date["1101"]["weekday"] == by_date["0308"]["weekday"] == "1"  # Sundays


def test_speeds_read_back_by_column(road: Store) -> None:
    """Bins are closed above: 20 mph is in the first, and a hair more in the second."""
    speeds = [5, 20, 20.001, 25, 25.001, 44, 85, 85.001, 120]
    passages = [
        passage(MONDAY + n * S, Direction.RECEDING, round(mph * MPH, 6)) for n, mph in enumerate(speeds)
    ]
    passages += [
        passage(MONDAY + 100 * S, Direction.RECEDING, None),
        passage(MONDAY + 101 * S, Direction.UNKNOWN, 15.0),
    ]
    record(road, MONDAY, MONDAY + HOUR, passages)
    record(road, MONDAY + HOUR, MONDAY + HOUR + HOUR // 2)
    records = speed_records(road, Question(), {"road": STATION})
    assert records.n_without_direction == 1
    north, south = (parsed(line, SPEED) for line in records.lines)
    assert int(north["total"]) == 0
    assert south["total"] == "00010"  # the one without a speed is in the total only
    bins = [int(south[f"bin_{b:02d}"]) for b in range(15)]
    assert bins == [2, 2, 1, 0, 0, 1, 0, 0, 0, 0, 0, 0, 0, 1, 2]
    assert (south["type"], south["station"], south["direction"], south["n_bins"]) == (
        "T",
        "004001",
        "5",
        "15",
    )
    assert (south["year"], south["month"], south["day"], south["hour"]) == ("2026", "03", "02", "00")
    assert (south["interval"], south["first_bin"]) == (" ", " ")


def test_a_sensor_without_a_station_is_refused_clearly(road: Store) -> None:
    record(road, MONDAY, MONDAY + HOUR)
    for records in (volume_records, speed_records):
        with pytest.raises(
            ConfigError, match=r"road has no \[sensor.station\] in the settings: tmg needs its state"
        ):
            records(road, Question(), {})


def test_unknown_directions_are_told(road: Store) -> None:
    record(road, MONDAY, MONDAY + HOUR, [passage(MONDAY + S, Direction.UNKNOWN, 15.0)])
    assert volume_records(road, Question(), {"road": STATION}).n_without_direction == 1


@pytest.mark.parametrize(
    "change", [{"state": "NY"}, {"station": "1234567"}, {"approaching": 9}, {"receding": 1}, {"lane": 10}]
)
def test_what_fits_no_column_is_refused(change: dict[str, object]) -> None:
    with pytest.raises(ValidationError):
        StationSettings.model_validate(STATION.model_dump() | change)


def test_records_of_an_empty_log_are_none(road: Store) -> None:
    assert volume_records(road, Question(), {}).lines == ()
    assert speed_records(road, Question(), {}).lines == ()
