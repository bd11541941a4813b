"""The Data Package descriptor that lies beside an exported file.

Data Package (version 2) is an open standard: a JSON file that says what the columns of a table are.
Properties of our own are grouped under ``ginnel``.
"""

from __future__ import annotations

from typing import Any

from ginnel import __version__, reports
from ginnel.export.columns import Column
from ginnel.export.tables import Table
from ginnel.reports import SensorFacts
from ginnel.store import Store
from ginnel.times import utc_text
from ginnel.words import Mounting

_PROFILE = "https://datapackage.org/profiles/2.0/datapackage.json"


def descriptor(store: Store, table: Table, path: str, n_bytes: int, sha256: str) -> dict[str, Any]:
    """Describe a CSV file at a path relative to the descriptor."""
    where = reports.site(store)
    return {
        "$schema": _PROFILE,
        "name": table.name,
        "title": f"{table.title}, {where.name}",
        "resources": [
            {
                "name": table.name,
                "type": "table",
                "path": path,
                "format": "csv",
                "mediatype": "text/csv",
                "encoding": "utf-8",
                "bytes": n_bytes,
                "hash": f"sha256:{sha256}",
                "dialect": {
                    "delimiter": ",",
                    "lineTerminator": "\r\n",
                    "quoteChar": '"',
                    "doubleQuote": True,
                },
                "schema": {
                    "fields": [_field(column) for column in table.columns],
                    "missingValues": [""],
                    "primaryKey": list(table.primary_key),
                },
            }
        ],
        "ginnel": {
            "version": __version__,
            "site": {"name": where.name, "timezone": where.timezone},
            "sensors": [_sensor(facts) for facts in table.sensors],
        },
    }


def _field(column: Column) -> dict[str, Any]:
    field: dict[str, Any] = {"name": column.name, "type": column.type, "description": column.description}
    if column.unit:
        field["unit"] = column.unit
    constraints: dict[str, Any] = {}
    if column.required:
        constraints["required"] = True
    if column.values:
        constraints["enum"] = list(column.values)
    if constraints:
        field["constraints"] = constraints
    return field


def _sensor(facts: SensorFacts) -> dict[str, Any]:
    sensor = facts.sensor
    return {
        "name": sensor.name,
        "carrier_hz": sensor.carrier_hz,
        "channels": sensor.channels.value,
        "speed_bands_mps": list(sensor.speed_bands_mps),
        "directions": {"approaching": sensor.approaching_name, "receding": sensor.receding_name},
        "mountings": [_mounting(mounting) for mounting in facts.mountings],
        "chain_versions": list(facts.chain_versions),
    }


def _mounting(mounting: Mounting) -> dict[str, Any]:
    return {
        "aspect": mounting.aspect.value,
        "height_m": mounting.height_m,
        "offset_m": mounting.offset_m,
        "beam_angle_deg": mounting.beam_angle_deg,
        "tilt_deg": mounting.tilt_deg,
        "beam_width_deg": list(mounting.beam_width_deg) if mounting.beam_width_deg else None,
        "since": None if mounting.since_us is None else utc_text(mounting.since_us),
    }
