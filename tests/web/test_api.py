"""The API: says what the pages say, keeps to its own description, and answers errors as problems."""

from __future__ import annotations

import os
from typing import Any

import hypothesis
import pytest
import schemathesis
from flask.testing import FlaskClient
from hypothesis import HealthCheck
from schemathesis.specs.openapi.checks import positive_data_acceptance
from tests.web.conftest import tables_of

from ginnel.config import Settings
from ginnel.web.app import create_app

DAY = "sensor=corridor&show=day&on=2026-03-02"
#: GINNEL_API_EXAMPLES=500 looks longer.
EXAMPLES = int(os.environ.get("GINNEL_API_EXAMPLES", "12"))
TABLES = ("sensors", "now", "counts", "week", "speeds", "occupancy", "passages", "trust")


@pytest.mark.parametrize("name", TABLES)
def test_every_answer_is_as_described(settings: Settings, name: str) -> None:
    """Queries that fit the description and such that do not, thought up by schemathesis."""
    app = create_app(settings)
    described = schemathesis.openapi.from_wsgi("/api/v1/openapi.json", app)

    @hypothesis.given(case=described[f"/api/v1/{name}"]["GET"].as_strategy())
    @hypothesis.settings(max_examples=EXAMPLES, deadline=None, suppress_health_check=list(HealthCheck))
    def ask(case: Any) -> None:
        # JSON Schema cannot say which days a log can hold, or how long a range may be
        unfit = [positive_data_acceptance]
        case.call_and_validate(headers={"Accept-Encoding": "identity"}, excluded_checks=unfit)

    ask()
    app.extensions["ginnel.store"].close()


def test_every_table_is_described_with_its_errors(client: FlaskClient) -> None:
    told: dict[str, Any] = client.get("/api/v1/openapi.json").json or {}
    for name in TABLES:
        answers = told["paths"][f"/api/v1/{name}"]["get"]["responses"]
        assert list(answers["200"]["content"]) == ["application/json"]
        assert list(answers["404"]["content"]) == ["application/problem+json"]


def test_counts_are_those_of_the_page(client: FlaskClient) -> None:
    told: dict[str, Any] = client.get(f"/api/v1/counts?{DAY}").json or {}
    shown = {row[0]: row[1:5] for row in tables_of(client, f"/busy?{DAY}")[0][1:-1]}
    assert len(told["intervals"]) == len(shown) == 24
    for interval in told["intervals"]:
        clock = interval["start"][11:16]
        numbers = [interval["counts"][way] for way in ("approaching", "receding", "unknown")] + [
            interval["both"]
        ]
        assert ["\N{EN DASH}" if number is None else str(number) for number in numbers] == shown[clock]
    assert told["total"] == {"approaching": 5, "receding": 2, "unknown": 1}
    assert told["listened_s"] == 2.5 * 3600


def test_times_carry_the_sites_offset(client: FlaskClient) -> None:
    told: dict[str, Any] = client.get("/api/v1/counts?sensor=gate&on=2026-03-29").json or {}
    starts = [interval["start"] for interval in told["intervals"]]
    assert starts[0] == "2026-03-29T00:00:00Z" or starts[0] == "2026-03-29T00:00:00+00:00"
    assert starts[1] == "2026-03-29T02:00:00+01:00", "one o'clock was skipped"
    assert len(starts) == 23


def test_passages_are_given_one_by_one(client: FlaskClient) -> None:
    told: dict[str, Any] = client.get(f"/api/v1/passages?{DAY}&hour=11").json or {}
    assert [one["direction"] for one in told["passages"]] == ["receding", "unknown", "approaching"]
    assert told["passages"][1]["speed_mps"] is None
    assert told["passages"][1]["flags"] == ["overlapping"]
    assert told["listened_s"] == 1800
    assert told["complete"] is True


@pytest.mark.parametrize(
    ("query", "status", "said"),
    [
        ("counts?show=aeon", 400, "show: Input should be"),
        ("counts?on=2026-13-01", 400, "on: Input should be a valid date"),
        ("counts?show=range&on=1980-01-01&to=2026-01-01", 400, "more than ten years"),
        ("counts?sensor=cellar", 404, "No sensor here is called cellar."),
        ("nothing", 404, "There is nothing at this address."),
        ("passages?hour=eleven", 400, "hour: String should have at most 4 characters"),
    ],
)
def test_errors_are_problem_details(client: FlaskClient, query: str, status: int, said: str) -> None:
    answer = client.get(f"/api/v1/{query}")
    problem: dict[str, Any] = answer.get_json(force=True)
    assert answer.status_code == problem["status"] == status
    assert answer.content_type == "application/problem+json", "RFC 9457, section 3"
    assert said in problem["detail"]
    assert problem["type"] == "about:blank"


def test_what_is_there_may_only_be_read(client: FlaskClient) -> None:
    answer = client.delete("/api/v1/sensors")
    assert answer.status_code == 405
    assert answer.content_type == "application/problem+json"
