"""Five years of one busy sensor in a store, written quickly: the same every time."""

from __future__ import annotations

import sqlite3
from datetime import UTC, datetime
from pathlib import Path

import numpy as np

from ginnel.store import open_store, put_site, record_span, roll_up_hours
from ginnel.store.codes import DIRECTION_CODES
from ginnel.times import to_us
from ginnel.words import US_PER_S, Direction, Sensor, Site, Span

SENSOR = Sensor(name="quay", approaching_name="in", receding_name="out")
START_US = to_us(datetime(2021, 1, 4, tzinfo=UTC))
DAYS = 5 * 365
HOUR_US = 3600 * US_PER_S
DAY_US = 24 * HOUR_US
_AT_ONCE = 500_000
_COLUMNS = (
    "sensor_id, crossed_us, started_us, ended_us, reading_id, story, direction, mover, flags, "
    "direction_confidence_ppm, speed_umps, speed_se_umps, snr_mdb"
)


def build(folder: Path, n_passages: int) -> str:
    """Make the store and its roll-ups; gives its URL. Made already, it is used again."""
    file = folder / f"years-{n_passages}.db"
    url = f"sqlite:///{file}"
    if (folder / f"{file.name}.done").exists():
        return url
    with open_store(url, create=True) as store:
        put_site(store, Site(name="Quay", timezone="Europe/Dublin"))
        # the first span brings sensor and reading; the others are like it
        record_span(store, SENSOR, _span(0), [], "bench")
        _fill(file, n_passages)
        roll_up_hours(store, START_US + DAYS * DAY_US)
    (folder / f"{file.name}.done").touch()
    return url


def _span(day: int) -> Span:
    """A day without its last ten minutes: five years have that many gaps."""
    start_us = START_US + day * DAY_US
    return Span(started_us=start_us, ended_us=start_us + DAY_US - 600 * US_PER_S, sample_rate_hz=8000.0)


def _fill(file: Path, n_passages: int) -> None:
    chance = np.random.default_rng(5)
    by_hour = np.array(
        [1, 1, 1, 1, 1, 4, 20, 60, 90, 60, 50, 50, 60, 60, 50, 50, 70, 90, 60, 30, 20, 10, 5, 2.0]
    )
    hours = chance.choice(24, n_passages, p=by_hour / by_hour.sum())
    at_us = chance.integers(10 * US_PER_S, 3590 * US_PER_S, n_passages)
    days = chance.integers(0, DAYS, n_passages)
    crossed_us = np.unique(START_US + days * DAY_US + hours * 3600 * US_PER_S + at_us)
    n = len(crossed_us)
    codes = np.array([DIRECTION_CODES[way] for way in (Direction.APPROACHING, Direction.RECEDING)])
    ways = codes[chance.integers(0, 2, n)]
    speed_umps = (1.3e6 * np.exp(chance.normal(0, 0.18, n))).astype(np.int64)
    connection = sqlite3.connect(file)
    connection.execute("PRAGMA synchronous = OFF")
    spans = [(_span(day).started_us, _span(day).ended_us) for day in range(1, DAYS)]
    connection.executemany(
        "INSERT INTO span (sensor_id, reading_id, started_us, ended_us, sample_rate_hz, clock_trusted)"
        " VALUES (1, 1, ?, ?, 8000.0, 1)",
        spans,
    )
    mark = "INSERT OR IGNORE INTO hour_stale (sensor_id, hour) VALUES (1, ?)"
    for first in range(0, n, _AT_ONCE):
        part = slice(first, first + _AT_ONCE)
        rows = (
            (1, at, at - 2_000_000, at + 2_000_000, 1, 0, way, None, 0, 950_000, speed, 30_000, 18_000)
            for at, way, speed in zip(
                crossed_us[part].tolist(), ways[part].tolist(), speed_umps[part].tolist(), strict=True
            )
        )
        connection.executemany(f"INSERT INTO passage ({_COLUMNS}) VALUES ({','.join('?' * 13)})", rows)
    connection.executemany(mark, [(START_US // HOUR_US + hour,) for hour in range(24 * DAYS)])
    connection.commit()
    connection.close()
