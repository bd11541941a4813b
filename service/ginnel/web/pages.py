"""Addresses of the dashboard: each reads its query, asks, and shows."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date, timedelta
from urllib.parse import urlencode
from zoneinfo import ZoneInfo

import flask
from flask import Blueprint, current_app, render_template, request
from werkzeug.exceptions import SecurityError

from ginnel.reports import overview as about
from ginnel.store import Store
from ginnel.times import from_us
from ginnel.web.day import Day, last_day, look_at, name_of
from ginnel.words import Sensor

pages = Blueprint("pages", __name__)


@dataclass(frozen=True, slots=True, kw_only=True)
class Choice:
    """What a query asks to see; the day is None where the log knows none."""

    about: about.Overview
    sensor: Sensor
    day: date | None


def open_store_of_app() -> Store:
    """Give the store that this application shows."""
    store: Store = current_app.extensions["ginnel.store"]
    return store


@pages.get("/")
def day_page() -> str | tuple[str, int]:
    """Show one day of one sensor."""
    found = about.overview(open_store_of_app())
    if not found.sensors:
        return render_template("empty.html", site=found.site)
    choice = _choice(found)
    if choice.day is None:
        return render_template("empty.html", site=found.site, sensor=choice.sensor)
    day = look_at(open_store_of_app(), found.site, choice.sensor, choice.day)
    return render_template(
        "day.html",
        day=day,
        site=found.site,
        sensors=found.sensors,
        charts_url=flask.url_for("pages.charts_json") + "?" + _query(day.sensor, day.day),
        before_url="?" + _query(day.sensor, day.day - timedelta(days=1)),
        after_url="?" + _query(day.sensor, day.day + timedelta(days=1)),
        name_of=name_of,
        local=lambda moment_us: from_us(moment_us, day.zone),
        speed_rows=_speed_rows(day),
    )


@pages.get("/charts.json")
def charts_json() -> flask.Response:
    """Give the charts of one day of one sensor."""
    from ginnel.web.charts import SCHEMES, day_charts

    scheme = SCHEMES.get(request.args.get("scheme", "light"))
    found = about.overview(open_store_of_app())
    if scheme is None or not found.sensors:
        flask.abort(404)
    choice = _choice(found)
    if choice.day is None:
        return flask.jsonify({})
    return flask.jsonify(
        day_charts(look_at(open_store_of_app(), found.site, choice.sensor, choice.day), scheme)
    )


@pages.app_errorhandler(400)
@pages.app_errorhandler(404)
def not_so(error: Exception) -> tuple[str, int]:
    """Say in a line what was wrong with the address."""
    if isinstance(error, SecurityError):  # an untrusted host has no addresses to make a page with
        return "Open the dashboard by the address that ginnel serve printed.", 400
    code = getattr(error, "code", 404)
    text = getattr(error, "description", None) or "There is nothing at this address."
    return render_template(
        "trouble.html", title="Not found" if code == 404 else "Not understood", text=text
    ), code


def _choice(found: about.Overview) -> Choice:
    name = request.args.get("sensor", found.sensors[0].name)
    sensor = next((sensor for sensor in found.sensors if sensor.name == name), None)
    if sensor is None:
        flask.abort(404, f"No sensor here is called {name}.")
    zone = ZoneInfo(found.site.timezone)
    asked = request.args.get("day")
    try:
        day = date.fromisoformat(asked) if asked else last_day(open_store_of_app(), sensor.name, zone)
    except ValueError:
        flask.abort(400, f"{asked} is not a day such as 2026-03-02.")
    if day is not None and not 1970 < day.year < 9999:
        flask.abort(400, f"{asked} is outside the years that a log can hold.")
    return Choice(about=found, sensor=sensor, day=day)


def _query(sensor: Sensor, day: date) -> str:
    return urlencode({"sensor": sensor.name, "day": day.isoformat()})


def _speed_rows(day: Day) -> list[tuple[str, object]]:
    rows: list[tuple[str, object]] = [
        (name_of(direction, day.sensor), day.speeds.summaries[direction]) for direction in day.directions
    ]
    return [*rows, ("all", day.speeds.summaries[None])]
