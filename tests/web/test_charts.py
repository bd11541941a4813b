"""What the charts hold, read back from the documents that the browser is given."""

from __future__ import annotations

from typing import Any

import pytest
from bokeh.document import Document
from bokeh.models import ColumnDataSource
from bokeh.models.annotations import BoxAnnotation, Span
from flask.testing import FlaskClient

DAY = "/charts.json?sensor=corridor&day=2026-03-02"


def charts_of(client: FlaskClient, url: str) -> dict[str, Document]:
    answer = client.get(url)
    assert answer.status_code == 200
    items: dict[str, Any] = answer.json or {}
    return {name: Document.from_json(item["doc"]) for name, item in items.items()}


def bars_of(document: Document) -> dict[str, dict[str, list[Any]]]:
    """Bars by the name of their direction."""
    sources = [model for model in document.models if isinstance(model, ColumnDataSource)]
    found = {}
    for source in sources:
        data = {name: list(values) for name, values in source.data.items()}
        if data.get("way"):
            found[data["way"][0]] = data
    return found


def boxes_of(document: Document) -> list[tuple[float, float]]:
    boxes: list[Any] = [model for model in document.models if isinstance(model, BoxAnnotation)]
    return sorted((box.left, box.right) for box in boxes)


def test_every_hour_that_was_heard_has_a_bar_of_its_count(client: FlaskClient) -> None:
    bars = bars_of(charts_of(client, DAY)["flow"])
    assert bars["to the looms"]["hour"] == ["08:00", "09:00", "11:00"]
    assert bars["to the looms"]["top"] == [3, 1, 1]
    assert bars["to the gate"]["top"] == [0, -1, -1], "the other way goes down"
    assert bars["direction unknown"]["bottom"] == [3, 1, 1], "stacked upon the first"
    assert bars["direction unknown"]["top"] == [3, 1, 2]


@pytest.mark.parametrize("name", ["flow", "coverage"])
def test_what_was_not_heard_is_hatched(client: FlaskClient, name: str) -> None:
    # heard 08:00 to 10:00 and 11:30 to 12:00
    assert boxes_of(charts_of(client, DAY)[name]) == [(0.0, 8.0), (10.0, 11.5), (12.0, 24.0)]


def test_speeds_are_stacked_and_marked_at_the_85th_percentile(client: FlaskClient) -> None:
    chart = charts_of(client, DAY)["speed"]
    bars = bars_of(chart)
    assert sum(int(n) for n in bars["to the looms"]["count"]) == 5
    assert sum(int(n) for n in bars["to the gate"]["count"]) == 2
    assert max(bars["direction unknown"]["top"]) == 1
    (mark,) = [model for model in chart.models if isinstance(model, Span)]
    assert mark.location == pytest.approx(1.60)  # as in test_pages


def test_a_day_of_23_hours_is_drawn_23_hours_long_with_the_wall_clock_beneath(client: FlaskClient) -> None:
    chart = charts_of(client, "/charts.json?sensor=gate&day=2026-03-29")["flow"]
    (plot,) = chart.roots
    assert plot.x_range.end == 23.0  # type: ignore[attr-defined]
    labels = plot.xaxis[0].major_label_overrides  # type: ignore[attr-defined]
    # one hour was skipped before 03:00
    assert {float(at): label for at, label in labels.items()}[2.0] == "03"
    assert boxes_of(chart) == []


def test_a_day_without_speeds_has_no_speed_chart(client: FlaskClient) -> None:
    assert sorted(charts_of(client, "/charts.json?sensor=corridor&day=2020-01-01")) == ["coverage", "flow"]


def test_dark_and_light_differ(client: FlaskClient) -> None:
    dark, light = (client.get(f"{DAY}&scheme={scheme}").text for scheme in ("dark", "light"))
    assert "#58b3a8" in dark
    assert "#58b3a8" not in light
