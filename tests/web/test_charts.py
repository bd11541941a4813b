"""What the charts hold, read back from the documents that the browser is given."""

from __future__ import annotations

from typing import Any

import pytest
from bokeh.document import Document
from bokeh.models import ColumnDataSource
from bokeh.models.annotations import BoxAnnotation, Span
from flask.testing import FlaskClient

DAY = "sensor=corridor&show=day&on=2026-03-02"
BUSY = f"/charts/busy.json?{DAY}"


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
    return sorted((box.left, box.right) for box in boxes if box.hatch_pattern is not None)


def test_every_hour_that_was_heard_has_a_bar_of_its_count(client: FlaskClient) -> None:
    bars = bars_of(charts_of(client, BUSY)["flow"])
    assert bars["to the looms"]["when"] == ["08:00", "09:00", "11:00"]
    assert bars["to the looms"]["top"] == [3, 1, 1]
    assert bars["to the gate"]["top"] == [0, -1, -1], "the other way goes down"
    assert bars["direction unknown"]["bottom"] == [3, 1, 1], "stacked upon the first"
    assert bars["direction unknown"]["top"] == [3, 1, 2]


@pytest.mark.parametrize(("page", "name"), [("busy", "flow"), ("trust", "coverage")])
def test_what_was_not_heard_is_hatched(client: FlaskClient, page: str, name: str) -> None:
    # heard 08:00 to 10:00 and 11:30 to 12:00
    chart = charts_of(client, f"/charts/{page}.json?{DAY}")[name]
    assert boxes_of(chart) == [(0.0, 8.0), (10.0, 11.5), (12.0, 24.0)]


def test_speeds_are_stacked_and_marked_at_their_percentiles(client: FlaskClient) -> None:
    chart = charts_of(client, f"/charts/fast.json?{DAY}")["speeds"]
    bars = bars_of(chart)
    assert sum(int(n) for n in bars["to the looms"]["count"]) == 5
    assert sum(int(n) for n in bars["to the gate"]["count"]) == 2
    spans: list[Any] = [model for model in chart.models if isinstance(model, Span)]
    marks = sorted(span.location for span in spans)
    # of 1.05 ... 2.05: position 1 + 0.85 * 6 = 6.1, so 1.55 + 0.1 * 0.5 = 1.60 by Hyndman and Fan's type 7;
    # classes of 1 cm/s put it within half of one
    assert marks[2] == pytest.approx(1.60, abs=0.0051)


def test_a_day_of_23_hours_is_drawn_23_hours_long_with_the_wall_clock_beneath(client: FlaskClient) -> None:
    chart = charts_of(client, "/charts/busy.json?sensor=gate&on=2026-03-29")["flow"]
    (plot,) = chart.roots
    assert plot.x_range.end == 23.0  # type: ignore[attr-defined]
    labels = plot.xaxis[0].major_label_overrides  # type: ignore[attr-defined]
    # one hour was skipped before 03:00
    assert {float(at): label for at, label in labels.items()}[2.0] == "03"
    assert boxes_of(chart) == []


def test_a_week_has_a_map_of_its_hours(client: FlaskClient) -> None:
    chart = charts_of(client, "/charts/busy.json?sensor=corridor&show=week&on=2026-03-02")["week"]
    sources = [model for model in chart.models if isinstance(model, ColumnDataSource)]
    (source,) = [one for one in sources if "rate" in one.data]
    cells = dict(zip(source.data["when"], source.data["rate"], strict=True))
    # three in the one hour heard; three in the half hour heard
    assert cells == {"Monday 08:00": 3.0, "Monday 09:00": 2.0, "Monday 11:00": 6.0}
    (unheard,) = [one for one in sources if "rate" not in one.data]
    assert len(unheard.data["hour"]) == 7 * 24 - 3, "all others are hatched"


def test_a_day_without_speeds_has_no_speed_chart(client: FlaskClient) -> None:
    assert charts_of(client, "/charts/fast.json?sensor=corridor&on=2020-01-01") == {}


def test_dark_and_light_differ(client: FlaskClient) -> None:
    dark, light = (client.get(f"{BUSY}&scheme={scheme}").text for scheme in ("dark", "light"))
    assert "#5fbcb1" in dark
    assert "#5fbcb1" not in light
