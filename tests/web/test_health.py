"""What programs that watch over Ginnel are told; the figures are judged by the library that reads them."""

from __future__ import annotations

import time
from pathlib import Path

import pytest
from flask.testing import FlaskClient
from prometheus_client.openmetrics.parser import text_string_to_metric_families

from ginnel import __version__
from ginnel.config import Settings, StoreSettings
from ginnel.store import LoggedHealth, open_store, put_conditions, put_health, put_job, record_span
from ginnel.store.users import Role, User, put_user
from ginnel.web.access.secrets import hash_password
from ginnel.web.app import create_app
from ginnel.words import Condition, HealthSample, Sensor, Severity, Span

S = 1_000_000
LANE = Sensor(name="lane")


@pytest.fixture
def url(tmp_path: Path) -> str:
    """A store into which somebody listens, with one minute of health and nothing wrong."""
    url = f"sqlite:///{tmp_path / 'ginnel.db'}"
    now_us = time.time_ns() // 1000
    with open_store(url, create=True) as store:
        span = Span(started_us=now_us - 900 * S, ended_us=now_us, sample_rate_hz=8000.0)
        record_span(store, LANE, span, [], "1")
        sample = HealthSample(at_us=now_us, level_dbfs=-41.5, clipped_share=0.0, temperature_c=51.0)
        put_health(store, [LoggedHealth(sensor="lane", sample=sample)])
    return url


def client(url: str) -> FlaskClient:
    return create_app(Settings(store=StoreSettings(url=url))).test_client()


def put_failure(url: str) -> None:
    failure = Condition(
        kind="source-lost",
        sensor="lane",
        severity=Severity.FAILURE,
        raised_us=1_772_442_000 * S,
        sentence="lane: the source is lost.",
        advice="Look.",
    )
    with open_store(url) as store:
        put_conditions(store, [failure])


def figures(text: str) -> dict[tuple[str, tuple[str, ...]], float]:
    """Every sample by its name and the values of its labels, in order of the labels' names."""
    return {
        (sample.name, tuple(value for _, value in sorted(sample.labels.items()))): float(sample.value)
        for family in text_string_to_metric_families(text)  # type: ignore[no-untyped-call] # untyped there
        for sample in family.samples
    }


def test_healthz_is_one_word(url: str) -> None:
    answer = client(url).get("/healthz")
    assert (answer.status_code, answer.json) == (200, {"state": "well"})
    assert answer.headers["Cache-Control"] == "no-store"
    put_failure(url)
    answer = client(url).get("/healthz")
    assert (answer.status_code, answer.json) == (503, {"state": "failure"})


def test_healthz_of_a_store_that_cannot_be_read_tells_no_more(url: str, tmp_path: Path) -> None:
    app = client(url)
    for file in tmp_path.glob("ginnel.db*"):
        file.unlink()
    answer = app.get("/healthz")
    assert (answer.status_code, answer.json) == (503, {"state": "failure"})


def test_metrics_are_what_the_log_says(url: str) -> None:
    with open_store(url) as store:
        put_job(store, "backup", ran_us=5 * S, outcome="no room", failed=True)
    answer = client(url).get("/metrics")
    assert answer.status_code == 200
    assert answer.content_type.startswith("application/openmetrics-text")
    found = figures(answer.text)
    assert found["ginnel_info", (__version__,)] == 1
    assert found["ginnel_state", ()] == 0
    assert found["ginnel_listening", ("lane",)] == 1
    assert found["ginnel_coverage_ratio", ("lane",)] == pytest.approx(0.25, abs=0.01)
    assert found["ginnel_level_dbfs", ("lane",)] == -41.5
    assert found["ginnel_temperature_celsius", ("lane",)] == 51
    assert ("ginnel_hum_decibels", ("lane",)) not in found  # not known
    assert found["ginnel_job_failed", ("backup",)] == 1
    assert not [name for name, _ in found if name.startswith("ginnel_condition")]
    put_failure(url)
    found = figures(client(url).get("/metrics").text)
    raised = found["ginnel_condition_raised_timestamp_seconds", ("source-lost", "lane", "failure")]
    assert (raised, found["ginnel_state", ()]) == (1_772_442_000, 2)


def test_a_stranger_learns_one_word_only(url: str) -> None:
    with open_store(url) as store:
        ann = User(name="ann", role=Role.LOOK, password_hash=hash_password("correct horse battery"))
        put_user(store, ann, new=True)
    app = client(url)
    assert app.get("/healthz").json == {"state": "well"}
    answer = app.get("/metrics")
    assert answer.status_code == 401
    assert "lane" not in answer.text
