"""Reading the log: words and arrays, in order of time."""

from __future__ import annotations

import heapq
import json
from collections.abc import Collection, Generator, Iterator, Sequence
from contextlib import ExitStack
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray
from sqlalchemy import Connection, Row, Select, func, select

from ginnel.errors import StoreError
from ginnel.store.codes import DIRECTION_CODES, MILLIONTHS, STORY_CODES, PassageCodes, decode
from ginnel.store.engine import Store
from ginnel.store.tables import MountingRow, PassageRow, ReadingRow, SensorRow, SiteRow, SpanRow
from ginnel.words import Aspect, Channels, Direction, FloatArray, Mounting, Passage, Sensor, Site, Span, Story

_ROWS_AT_ONCE = 2000
_PASSAGE_COLUMNS = (*PassageCodes._fields, "reading_id")


@dataclass(frozen=True, slots=True, kw_only=True)
class LoggedPassage:
    """A passage with the sensor, mounting and version of the chain that found it."""

    sensor: str
    passage: Passage
    mounting: Mounting
    chain_version: str

    @property
    def passage_id(self) -> str:
        """Name of the passage for ever: its sensor and the microsecond of its crossing."""
        return f"{self.sensor}-{self.passage.crossed_us}"


@dataclass(frozen=True, slots=True, kw_only=True)
class LoggedSpan:
    """A span with its sensor, mounting and version of the chain."""

    sensor: str
    span: Span
    mounting: Mounting
    chain_version: str


@dataclass(frozen=True, slots=True, kw_only=True)
class PassageArrays:
    """Passages that count as columns, in order of crossing; all arrays of shape (n,)."""

    crossed_us: NDArray[np.int64]
    direction: NDArray[np.int8]  # codes; see `of`
    speed_mps: FloatArray  # NaN where not measured

    def of(self, direction: Direction | None) -> PassageArrays:
        """Those of one direction; all where it is None."""
        if direction is None:
            return self
        chosen = self.direction == DIRECTION_CODES[direction]
        return PassageArrays(
            crossed_us=self.crossed_us[chosen],
            direction=self.direction[chosen],
            speed_mps=self.speed_mps[chosen],
        )


def site(store: Store) -> Site | None:
    """Get the site, None while it has no name."""
    with store.reading() as connection:
        row = connection.execute(select(SiteRow.name, SiteRow.timezone)).one_or_none()
    return None if row is None else Site(name=row.name, timezone=row.timezone)


def sensors(store: Store) -> list[Sensor]:
    """All sensors by name, each with its latest mounting."""
    with store.reading() as connection:
        rows = connection.execute(select(*SensorRow.__table__.columns).order_by(SensorRow.name)).all()
        latest: dict[int, Row[Any]] = {}
        mountings = connection.execute(select(*MountingRow.__table__.columns).order_by(MountingRow.id))
        for row in mountings:
            old = latest.get(row.sensor_id)
            if old is None or (row.since_us or 0) >= (old.since_us or 0):
                latest[row.sensor_id] = row
    return [_sensor(row, _mounting(latest[row.id]) if row.id in latest else Mounting()) for row in rows]


def spans(
    store: Store, sensor: str | None = None, start_us: int | None = None, end_us: int | None = None
) -> list[LoggedSpan]:
    """Spans that share time with [start_us, end_us), whole, by sensor and start."""
    query = (
        select(
            SensorRow.name.label("sensor"),
            SpanRow.reading_id,
            SpanRow.started_us,
            SpanRow.ended_us,
            SpanRow.sample_rate_hz,
            SpanRow.clock_trusted,
        )
        .join(SensorRow, SensorRow.id == SpanRow.sensor_id)
        .order_by(SensorRow.name, SpanRow.started_us)
    )
    if start_us is not None:
        query = query.where(SpanRow.ended_us > start_us)
    if end_us is not None:
        query = query.where(SpanRow.started_us < end_us)
    with store.reading() as connection:
        if sensor is not None:
            query = query.where(SpanRow.sensor_id == known_sensors(connection, sensor)[0][0])
        readings = _readings(connection)
        return [
            LoggedSpan(
                sensor=row.sensor,
                span=Span(
                    started_us=row.started_us,
                    ended_us=row.ended_us,
                    sample_rate_hz=row.sample_rate_hz,
                    clock_trusted=row.clock_trusted,
                ),
                mounting=readings[row.reading_id][0],
                chain_version=readings[row.reading_id][1],
            )
            for row in connection.execute(query)
        ]


def extent_us(store: Store, sensor: str | Collection[str] | None = None) -> tuple[int, int] | None:
    """Find the first and the last moment the log knows anything of, half-open; None when empty."""
    bounds: list[tuple[int, int]] = []
    with store.reading() as connection:
        for sensor_id, _ in known_sensors(connection, sensor):
            # one end at a time, so that the key leads to it; both at once would walk through all passages
            for first, last, own in (
                (SpanRow.started_us, SpanRow.ended_us, SpanRow.sensor_id == sensor_id),
                (PassageRow.crossed_us, PassageRow.crossed_us, PassageRow.sensor_id == sensor_id),
            ):
                start_us = connection.execute(select(func.min(first)).where(own)).scalar_one()
                end_us = connection.execute(select(func.max(last)).where(own)).scalar_one()
                if start_us is not None:
                    bounds.append((start_us, end_us if last is SpanRow.ended_us else end_us + 1))
    if not bounds:
        return None
    return min(first for first, _ in bounds), max(last for _, last in bounds)


def iter_passages(
    store: Store,
    sensor: str | Collection[str] | None = None,
    start_us: int | None = None,
    end_us: int | None = None,
    *,
    with_uncounted: bool = False,
) -> Generator[LoggedPassage]:
    """Passages of a sensor, of some or of all, in order of crossing, in constant memory.

    Given are those that cross in [start_us, end_us) and count, with turn-backs and fidgeting only if
    asked for. A view of the store stays open until the iterator ends or is closed.
    """
    with store.reading() as connection, ExitStack() as stack:
        readings = _readings(connection)
        streams = []
        for sensor_id, name in known_sensors(connection, sensor):
            query = passage_query(_PASSAGE_COLUMNS, sensor_id, start_us, end_us, with_uncounted)
            rows = connection.execution_options(yield_per=_ROWS_AT_ONCE).execute(query)
            stack.callback(rows.close)
            streams.append(_logged(rows, name, readings))
        yield from heapq.merge(*streams, key=lambda logged: logged.passage.crossed_us)


def latest_passages(
    store: Store, n: int, sensor: str | None = None, *, with_uncounted: bool = False
) -> list[LoggedPassage]:
    """Get the last n passages, the latest first."""
    found: list[LoggedPassage] = []
    with store.reading() as connection:
        readings = _readings(connection)
        for sensor_id, name in known_sensors(connection, sensor):
            query = passage_query(_PASSAGE_COLUMNS, sensor_id, None, None, with_uncounted)
            query = query.order_by(None).order_by(PassageRow.crossed_us.desc()).limit(n)
            found += _logged(connection.execute(query), name, readings)
    return sorted(found, key=lambda logged: -logged.passage.crossed_us)[:n]


def passage_arrays(
    store: Store, sensor: str, start_us: int | None = None, end_us: int | None = None
) -> PassageArrays:
    """Passages of one sensor that count and cross in [start_us, end_us), as columns.

    About 20 bytes a passage: a busy year of one sensor is some tens of megabytes.
    """
    with store.reading() as connection:
        ((sensor_id, _),) = known_sensors(connection, sensor)
        query = passage_query(("crossed_us", "direction", "speed_umps"), sensor_id, start_us, end_us, False)
        rows = connection.execution_options(yield_per=10 * _ROWS_AT_ONCE).execute(query)
        pieces = [
            np.array([(-1 if value is None else value) for row in part for value in row], np.int64).reshape(
                -1, 3
            )
            for part in rows.partitions()
        ]
    table = np.concatenate([np.empty((0, 3), np.int64), *pieces])
    speed_mps = np.where(table[:, 2] < 0, np.nan, table[:, 2] / MILLIONTHS)
    return PassageArrays(
        crossed_us=np.ascontiguousarray(table[:, 0]),
        direction=table[:, 1].astype(np.int8),
        speed_mps=speed_mps,
    )


def passage_query(
    columns: Sequence[Any], sensor_id: int, start_us: int | None, end_us: int | None, with_uncounted: bool
) -> Select[Any]:
    """Select columns of one sensor's passages, named or as expressions, in order of crossing."""
    chosen = (getattr(PassageRow, one) if isinstance(one, str) else one for one in columns)
    query = select(*chosen).where(PassageRow.sensor_id == sensor_id)
    if start_us is not None:
        query = query.where(PassageRow.crossed_us >= start_us)
    if end_us is not None:
        query = query.where(PassageRow.crossed_us < end_us)
    if not with_uncounted:
        query = query.where(PassageRow.story == STORY_CODES[Story.PASSAGE])
    return query.order_by(PassageRow.crossed_us)


def _logged(rows: Any, sensor: str, readings: dict[int, tuple[Mounting, str]]) -> Iterator[LoggedPassage]:
    for row in rows:
        mounting, chain_version = readings[row.reading_id]
        yield LoggedPassage(
            sensor=sensor, passage=decode(row), mounting=mounting, chain_version=chain_version
        )


def known_sensors(connection: Connection, sensor: str | Collection[str] | None) -> list[tuple[int, str]]:
    """Ids and names of all sensors, or of those named."""
    rows = connection.execute(select(SensorRow.id, SensorRow.name).order_by(SensorRow.name)).all()
    known = {row.name: row.id for row in rows}
    wanted = known.keys() if sensor is None else {sensor} if isinstance(sensor, str) else set(sensor)
    if unknown := sorted(wanted - known.keys()):
        names = ", ".join(known) or "none yet"
        raise StoreError(f"the store knows no sensor {unknown[0]!r}; it knows: {names}")
    return [(known[name], name) for name in sorted(wanted)]


def _readings(connection: Connection) -> dict[int, tuple[Mounting, str]]:
    rows = connection.execute(
        select(
            ReadingRow.id.label("reading_id"), ReadingRow.chain_version, *MountingRow.__table__.columns
        ).join(MountingRow, MountingRow.id == ReadingRow.mounting_id)
    )
    return {row.reading_id: (_mounting(row), row.chain_version) for row in rows}


def _mounting(row: Row[Any]) -> Mounting:
    width = (row.beam_width_h_deg, row.beam_width_v_deg)
    return Mounting(
        aspect=Aspect(row.aspect),
        height_m=row.height_m,
        offset_m=row.offset_m,
        beam_angle_deg=row.beam_angle_deg,
        tilt_deg=row.tilt_deg,
        beam_width_deg=None if None in width else width,
        since_us=row.since_us,
    )


def _sensor(row: Row[Any], mounting: Mounting) -> Sensor:
    return Sensor(
        name=row.name,
        carrier_hz=row.carrier_hz,
        channels=Channels(row.channels),
        swap_iq=row.swap_iq,
        mains_hz=row.mains_hz,
        speed_bands_mps=tuple(json.loads(row.speed_bands_mps)),
        min_speed_mps=row.min_speed_mps,
        max_speed_mps=row.max_speed_mps,
        highpass_hz=row.highpass_hz,
        approaching_name=row.approaching_name,
        receding_name=row.receding_name,
        mounting=mounting,
    )
