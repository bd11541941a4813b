"""Rows that spans and passages refer to: sensors, mountings, and readings that join the two."""

from __future__ import annotations

import json
from typing import Any

from sqlalchemy import Connection, insert, select, update
from sqlalchemy.dialects import postgresql, sqlite

from ginnel.store.tables import MountingRow, ReadingRow, SensorRow
from ginnel.words import Mounting, Sensor


def sensor_row_id(connection: Connection, sensor: Sensor) -> int:
    """Id of a sensor, made or brought up to date. Locks it, so that writers of one sensor take turns."""
    values = {
        "carrier_hz": sensor.carrier_hz,
        "channels": sensor.channels.value,
        "swap_iq": sensor.swap_iq,
        "mains_hz": sensor.mains_hz,
        "speed_bands_mps": json.dumps(list(sensor.speed_bands_mps)),
        "min_speed_mps": sensor.min_speed_mps,
        "max_speed_mps": sensor.max_speed_mps,
        "highpass_hz": sensor.highpass_hz,
        "approaching_name": sensor.approaching_name,
        "receding_name": sensor.receding_name,
    }
    query = select(*SensorRow.__table__.columns).where(SensorRow.name == sensor.name).with_for_update()
    row = connection.execute(query).one_or_none()
    if row is None:
        dialect = sqlite if connection.dialect.name == "sqlite" else postgresql
        connection.execute(
            dialect.insert(SensorRow).values(name=sensor.name, **values).on_conflict_do_nothing()
        )
        row = connection.execute(query).one()
    if any(row._mapping[name] != value for name, value in values.items()):
        connection.execute(update(SensorRow).where(SensorRow.id == row.id).values(values))
    return int(row.id)


def mounting_row_id(connection: Connection, sensor_id: int, mounting: Mounting) -> int:
    """Id of a mounting, made if it is new."""
    width = mounting.beam_width_deg or (None, None)
    values = {
        "sensor_id": sensor_id,
        "aspect": mounting.aspect.value,
        "height_m": mounting.height_m,
        "offset_m": mounting.offset_m,
        "beam_angle_deg": mounting.beam_angle_deg,
        "tilt_deg": mounting.tilt_deg,
        "beam_width_h_deg": width[0],
        "beam_width_v_deg": width[1],
        "since_us": mounting.since_us,
    }
    return _found_or_made(connection, MountingRow, values)


def reading_row_id(connection: Connection, sensor_id: int, sensor: Sensor, chain_version: str) -> int:
    """Id of a reading, made if it is new; names and speed bands do not bear on it."""
    settings = {
        "carrier_hz": sensor.carrier_hz,
        "channels": sensor.channels.value,
        "highpass_hz": sensor.highpass_hz,
        "mains_hz": sensor.mains_hz,
        "max_speed_mps": sensor.max_speed_mps,
        "min_speed_mps": sensor.min_speed_mps,
        "swap_iq": sensor.swap_iq,
    }
    values = {
        "sensor_id": sensor_id,
        "mounting_id": mounting_row_id(connection, sensor_id, sensor.mounting),
        "chain_version": chain_version,
        "settings": json.dumps(settings),
    }
    return _found_or_made(connection, ReadingRow, values)


def _found_or_made(
    connection: Connection, table: type[MountingRow] | type[ReadingRow], values: dict[str, Any]
) -> int:
    """Id of the row with these values. The sensor's lock keeps two writers from making it twice."""
    same = [
        getattr(table, name).is_(None) if value is None else getattr(table, name) == value
        for name, value in values.items()
    ]
    found = connection.execute(select(table.id).where(*same).order_by(table.id).limit(1)).scalar()
    if found is None:
        found = connection.execute(insert(table).values(values).returning(table.id)).scalar_one()
    return int(found)
