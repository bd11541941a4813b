"""The Data Package descriptor that lies beside an exported file.

Data Package (version 2) is an open standard: a JSON file that says what the columns of a table are.
Properties of our own are grouped under ``ginnel``.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from ginnel import __version__, reports
from ginnel.export.columns import Column
from ginnel.export.tables import Table
from ginnel.reports import SensorFacts
from ginnel.reports.overview import extent_us, heard
from ginnel.stats.speeds import PERCENTILE_METHOD
from ginnel.store import Store
from ginnel.times import utc_text
from ginnel.words import US_PER_S, Mounting

_PROFILE = "https://datapackage.org/profiles/2.0/datapackage.json"
_MEDIA_TYPES = {
    "csv": "text/csv",
    "jsonl": "application/jsonl",
    "parquet": "application/vnd.apache.parquet",
    "xlsx": "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet",
}

#: How the numbers came about, for whoever must judge them.
METHOD = {
    "passages": (
        "Doppler radar: each mover that goes past is fitted with its radial speed and level over time, and "
        "counts once; turning back and fidgeting do not count. Raw counts are never altered."
    ),
    "coverage": "Time listened over time; an interval never listened to is blank, not zero.",
    "count_limits": (
        "Exact 95 % Poisson limits (Garwood 1936): the noise of counting alone, not what the sensor misses."
    ),
    "percentiles": PERCENTILE_METHOD,
    "intervals": "Half-open, named by their start, cut by the site's clock.",
}


def descriptor(store: Store, tables: Sequence[Table], resources: Sequence[dict[str, Any]]) -> dict[str, Any]:
    """Describe an export: its files, the site and its sensors, how it came about, how much was listened."""
    where = reports.site(store)
    first = tables[0]
    return {
        "$schema": _PROFILE,
        "name": "-".join(table.name for table in tables),
        "title": f"{', '.join(table.title for table in tables)}, {where.name}",
        "resources": list(resources),
        "ginnel": {
            "version": __version__,
            "site": {"name": where.name, "timezone": where.timezone},
            "sensors": [_sensor(facts) for facts in first.sensors],
            "coverage": [_coverage(store, first, facts.sensor.name) for facts in first.sensors],
            "method": METHOD,
        },
    }


def resource(table: Table, kind: str, path: str | list[str]) -> dict[str, Any]:
    """Describe one table of a file, or of several parts, by their paths from the descriptor."""
    facts: dict[str, Any] = {
        "name": table.name,
        "type": "table",
        "path": path,
        "format": kind,
        "mediatype": _MEDIA_TYPES[kind],
        "schema": {
            "fields": [field(column) for column in table.columns],
            "missingValues": [""],
            "primaryKey": list(table.primary_key),
        },
    }
    if kind in ("csv", "jsonl"):
        facts["encoding"] = "utf-8"
    if kind == "csv":
        facts["dialect"] = {
            "delimiter": ",",
            "lineTerminator": "\r\n",
            "quoteChar": '"',
            "doubleQuote": True,
        }
    elif kind == "xlsx":
        facts["dialect"] = {"sheetName": table.name}
    return facts


def field(column: Column) -> dict[str, Any]:
    """Describe a column by the Table Schema standard."""
    field: dict[str, Any] = {
        "name": column.name,
        "type": column.kind.value,
        "description": column.description,
    }
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


def _coverage(store: Store, table: Table, sensor: str) -> dict[str, Any]:
    """How much of the time asked for (else of the sensor's own log) was listened to."""
    asked, known = table.question, extent_us(store, sensor) or (None, None)
    start_us = known[0] if asked.start_us is None else asked.start_us
    end_us = known[1] if asked.end_us is None else asked.end_us
    if start_us is None or end_us is None or start_us >= end_us:
        return {"sensor": sensor, "from": None, "to": None, "listened_s": 0.0, "coverage": None}
    listened_us = sum(one.ended_us - one.started_us for one in heard(store, sensor, start_us, end_us))
    return {
        "sensor": sensor,
        "from": utc_text(start_us),
        "to": utc_text(end_us),
        "listened_s": listened_us / US_PER_S,
        "coverage": round(listened_us / (end_us - start_us), 6),
    }


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
