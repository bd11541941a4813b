"""For programs that watch over this one: is it well, and figures in the OpenMetrics format.

`/healthz` tells anybody one word, and nothing of the site. `/metrics` names sensors and counts, so the
gate lets in only who may look.
"""

from __future__ import annotations

import time
from collections.abc import Iterator
from typing import TYPE_CHECKING

import flask
from flask import Blueprint, current_app

from ginnel import __version__
from ginnel.errors import StoreError
from ginnel.reports.status import State, Status, status
from ginnel.words import US_PER_S

if TYPE_CHECKING:
    from prometheus_client.core import GaugeMetricFamily, Metric

health = Blueprint("health", __name__)

#: Field of `HealthSample`, name of the metric, what it is.
_MEASURES = (
    ("level_dbfs", "level_dbfs", "Level of the input, dB against a sine that just fits."),
    ("noise_dbfs_hz", "noise_dbfs_per_hertz", "Density of the noise between the lines."),
    ("hum_db", "hum_decibels", "Mains hum over the noise."),
    ("lamp_db", "lamp_decibels", "Strongest line of a lamp over the noise."),
    ("clipped_share", "clipped_ratio", "Share of samples at full scale."),
    ("dropped_samples", "dropped_samples", "Samples dropped in the last minute."),
    ("lag_s", "lag_seconds", "How old the newest sample was when its turn came."),
    ("disk_free_bytes", "disk_free_bytes", "Room on the disk."),
    ("disk_size_bytes", "disk_size_bytes", "Size of the disk."),
    ("resident_bytes", "resident_memory_bytes", "Memory of the listener."),
    ("temperature_c", "temperature_celsius", "The hottest part that the system shows."),
)


@health.get("/healthz")
def healthz() -> flask.Response:
    """One word; 503 where something has failed."""
    try:
        state = _status().state
    except StoreError:
        state = State.FAILURE  # why is nobody's business here
    answer = flask.jsonify({"state": state.value})
    answer.status_code = 503 if state is State.FAILURE else 200
    answer.cache_control.no_store = True
    return answer


@health.get("/metrics")
def metrics() -> flask.Response:
    """Figures of the last minute, OpenMetrics text."""
    from prometheus_client.openmetrics.exposition import CONTENT_TYPE_LATEST, generate_latest
    from prometheus_client.registry import CollectorRegistry

    found = _status()

    class Figures:
        """What the library asks for its text."""

        def collect(self) -> Iterator[Metric]:
            return _families(found)

    registry = CollectorRegistry()
    registry.register(Figures())
    text = generate_latest(registry)  # type: ignore[no-untyped-call] # the library has no types here
    answer = flask.Response(text, content_type=CONTENT_TYPE_LATEST)
    answer.cache_control.no_store = True
    return answer


def _status() -> Status:
    settings = current_app.extensions["ginnel.settings"]
    names = [sensor.name for sensor in settings.sensor] or None
    return status(current_app.extensions["ginnel.store"], time.time_ns() // 1000, names)


def _families(found: Status) -> Iterator[Metric]:
    from prometheus_client.core import InfoMetricFamily

    yield InfoMetricFamily("ginnel", "This program.", value={"version": __version__})
    state = _gauge("ginnel_state", "0 well, 1 warning, 2 failure.", [])
    state.add_metric([], list(State).index(found.state))
    yield state
    yield from _sensor_families(found)
    raised = _gauge("ginnel_condition_raised_timestamp_seconds", "Something is wrong, since.", _CONDITION)
    for one in found.conditions:
        raised.add_metric([one.sensor or "", one.kind, one.severity.value], one.raised_us / US_PER_S)
    yield raised
    done = _gauge("ginnel_job_tried_timestamp_seconds", "A job of housekeeping was last tried.", ["job"])
    failed = _gauge("ginnel_job_failed", "Whether that failed.", ["job"])
    for job in found.jobs:
        done.add_metric([job.name], job.ran_us / US_PER_S)
        failed.add_metric([job.name], int(job.failed))
    yield done
    yield failed


_CONDITION = ["sensor", "kind", "severity"]


def _sensor_families(found: Status) -> Iterator[Metric]:
    listened = _gauge("ginnel_listening", "Whether a sensor is listened to.", ["sensor"])
    coverage = _gauge("ginnel_coverage_ratio", "Share of the last hour listened to.", ["sensor"])
    heard = _gauge("ginnel_heard_timestamp_seconds", "A sensor was last heard.", ["sensor"])
    passed = _gauge("ginnel_last_passage_timestamp_seconds", "The last passage.", ["sensor"])
    for one in found.sensors:
        listened.add_metric([one.sensor], int(one.is_listened_to))
        coverage.add_metric([one.sensor], one.hour_coverage)
        for family, moment_us in ((heard, one.heard_until_us), (passed, one.last_passage_us)):
            if moment_us is not None:
                family.add_metric([one.sensor], moment_us / US_PER_S)
    yield from (listened, coverage, heard, passed)
    for field, name, text in _MEASURES:
        family = _gauge(f"ginnel_{name}", text, ["sensor"])
        for one in found.sensors:
            value = None if one.health is None else getattr(one.health, field)
            if value is not None and one.is_listened_to:  # an old figure is none
                family.add_metric([one.sensor], value)
        yield family


def _gauge(name: str, text: str, labels: list[str]) -> GaugeMetricFamily:
    from prometheus_client.core import GaugeMetricFamily

    return GaugeMetricFamily(name, text, labels=labels)
