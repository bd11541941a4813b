"""Eight weeks before the captured day, drawn from an invented weekly pattern.

With a gap, a clock change, a fault and some health in them, so that each page has something to show. Nothing
of it was measured, and the log says so: see `DRAWN`.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from datetime import date, datetime, timedelta
from itertools import pairwise
from zoneinfo import ZoneInfo

import numpy as np

from ginnel import store as log
from ginnel.config import Settings
from ginnel.demo.captured import STARTED_US
from ginnel.store import LoggedHealth, Store
from ginnel.times import from_us, to_us
from ginnel.words import (
    US_PER_S,
    Condition,
    Direction,
    Flag,
    HealthSample,
    Passage,
    Sensor,
    Severity,
    Span,
)

#: Stands where the version of the chain would.
DRAWN = "drawn from an invented weekly pattern, not measured"
WEEKS = 8
#: Nobody crosses so close to the edge of an hour: a passage lies in its span as a whole.
EDGE_US = 5 * US_PER_S
HOUR_US = 3600 * US_PER_S
HEALTH_EVERY_US = HOUR_US // 4

#: Passages an hour on a weekday, from midnight on; those who come in, and those who leave.
COMING = (0, 0, 0, 0, 0, 1, 6, 34, 62, 30, 16, 14, 15, 34, 20, 14, 10, 7, 4, 2, 1, 0, 0, 0)
LEAVING = (0, 0, 0, 0, 0, 0, 1, 3, 7, 10, 12, 14, 38, 18, 14, 18, 36, 60, 25, 8, 4, 2, 0, 0)
#: Monday to Sunday, against that weekday.
WEEKDAYS = (1.0, 1.08, 1.05, 1.02, 0.86, 0.28, 0.06)
#: Share of that, mean speed in m/s.
SENSORS = {"north-corridor": (1.0, 1.34), "yard-gate": (0.45, 1.22)}

#: Nobody listened: a power cut at both sensors.
GAP = (datetime(2026, 4, 8, 14, 10), datetime(2026, 4, 9, 9, 35))  # noqa: DTZ001 (the site's own clock)
#: The corridor's module lost its supply: it was listened to, and nothing was heard.
FAULT_SENSOR = "north-corridor"
FAULT = (datetime(2026, 3, 17, 11, 2), datetime(2026, 3, 17, 16, 40))  # noqa: DTZ001


@dataclass(frozen=True, slots=True, kw_only=True)
class _Moments:
    """What happened, on the time line."""

    first_us: int
    last_us: int
    gap_us: tuple[int, int]
    fault_us: tuple[int, int]


def draw_weeks(settings: Settings) -> None:
    """Write the drawn weeks into the demo's store; doing it again changes nothing."""
    zone = ZoneInfo(settings.site.timezone)
    captured = from_us(STARTED_US, zone).date()
    moments = _Moments(
        first_us=_start_us(captured - timedelta(weeks=WEEKS), zone),
        last_us=_start_us(captured, zone),
        gap_us=_both(GAP, zone),
        fault_us=_both(FAULT, zone),
    )
    with log.open_store(settings.store.url) as store:
        for number, config in enumerate(settings.sensor):
            _draw_sensor(store, config.to_sensor(), moments, zone, np.random.default_rng(number))
        log.put_conditions(store, _conditions(moments))
        log.roll_up_hours(store, moments.last_us)


def _draw_sensor(
    store: Store, sensor: Sensor, moments: _Moments, zone: ZoneInfo, chance: np.random.Generator
) -> None:
    share, mean_mps = SENSORS[sensor.name]
    for start_us, end_us in _heard(moments):
        passages = [
            one
            for one in _passages(start_us, end_us, share, mean_mps, zone, chance)
            if sensor.name != FAULT_SENSOR or not moments.fault_us[0] <= one.crossed_us < moments.fault_us[1]
        ]
        span = Span(started_us=start_us, ended_us=end_us, sample_rate_hz=8000.0)
        log.record_span(store, sensor, span, passages, DRAWN)
    log.put_health(store, _health(sensor, moments, zone, chance))


def _heard(moments: _Moments) -> tuple[tuple[int, int], tuple[int, int]]:
    return (moments.first_us, moments.gap_us[0]), (moments.gap_us[1], moments.last_us)


def _passages(
    start_us: int, end_us: int, share: float, mean_mps: float, zone: ZoneInfo, chance: np.random.Generator
) -> Iterator[Passage]:
    """Draw passages hour by hour, at random within each."""
    first_us = start_us - start_us % HOUR_US + HOUR_US
    edges_us = [start_us, *range(first_us, end_us, HOUR_US), end_us]
    for hour_us, next_us in pairwise(edges_us):
        local = from_us(hour_us, zone)
        size = share * WEEKDAYS[local.weekday()] * (next_us - hour_us) / HOUR_US
        for way, pattern in ((Direction.APPROACHING, COMING), (Direction.RECEDING, LEAVING)):
            n = int(chance.poisson(size * pattern[local.hour]))
            crossed_us = chance.integers(
                hour_us + 4 * US_PER_S, max(next_us - 4 * US_PER_S, hour_us + 5 * US_PER_S), n
            )
            speed_mps = mean_mps * np.exp(chance.normal(0.0, 0.17, n))
            doubt = chance.random((3, n))
            for i in range(n):
                yield _passage(int(crossed_us[i]), way, float(speed_mps[i]), doubt[:, i])


def _passage(crossed_us: int, way: Direction, speed_mps: float, doubt: np.ndarray) -> Passage:
    half_us = int(3.2 / speed_mps * US_PER_S)
    unknown = doubt[0] < 0.012
    overlapping = doubt[1] < 0.05
    return Passage(
        started_us=crossed_us - half_us,
        crossed_us=crossed_us,
        ended_us=crossed_us + half_us,
        direction=Direction.UNKNOWN if unknown else way,
        direction_confidence=None if unknown else float(0.9 + 0.1 * doubt[2]),
        speed_mps=speed_mps,
        speed_se_mps=0.02 + 0.04 * float(doubt[2]),
        snr_db=12.0 + 14.0 * float(doubt[2]),
        flags=frozenset({Flag.OVERLAPPING}) if overlapping else frozenset(),
    )


def _health(
    sensor: Sensor, moments: _Moments, zone: ZoneInfo, chance: np.random.Generator
) -> Iterator[LoggedHealth]:
    """Draw readings: busier hours are louder, lamps burn by day, a module without supply is quiet."""
    for start_us, end_us in _heard(moments):
        for at_us in range(start_us + HEALTH_EVERY_US, end_us, HEALTH_EVERY_US):
            local = from_us(at_us, zone)
            busy = (COMING[local.hour] + LEAVING[local.hour]) * WEEKDAYS[local.weekday()] / 100
            dead = sensor.name == FAULT_SENSOR and moments.fault_us[0] <= at_us < moments.fault_us[1]
            noise = -96.0 + float(chance.normal(0, 0.4)) - (14.0 if dead else 0.0)
            lit = 7 <= local.hour < 19
            yield LoggedHealth(
                sensor=sensor.name,
                sample=HealthSample(
                    at_us=at_us,
                    listened_s=60.0,
                    level_dbfs=noise + 38.0 + (0.0 if dead else 9.0 * busy) + float(chance.normal(0, 0.8)),
                    noise_dbfs_hz=noise,
                    hum_db=6.0 + float(chance.normal(0, 0.7)),
                    lamp_db=(11.0 if lit and not dead else 3.0) + float(chance.normal(0, 0.8)),
                    lamp_mps=1.42,
                    clipped_share=0.0,
                ),
            )


def _conditions(moments: _Moments) -> list[Condition]:
    begun_us, over_us = moments.fault_us
    return [
        Condition(
            kind="quieter-than-usual",
            sensor=FAULT_SENSOR,
            severity=Severity.WARNING,
            raised_us=begun_us + 10 * 60 * US_PER_S,
            cleared_us=over_us + 5 * 60 * US_PER_S,
            sentence=f"{FAULT_SENSOR}: its noise is 14 dB weaker than last week, as if the module were off.",
            advice="A module without power, a loose cable or a changed gain sounds like this.",
        )
    ]


def _start_us(day: date, zone: ZoneInfo) -> int:
    return to_us(datetime(day.year, day.month, day.day, tzinfo=zone))


def _both(clock: tuple[datetime, datetime], zone: ZoneInfo) -> tuple[int, int]:
    return to_us(clock[0].replace(tzinfo=zone)), to_us(clock[1].replace(tzinfo=zone))
