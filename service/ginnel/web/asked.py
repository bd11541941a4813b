"""What a request asks about: the store, its site and sensors, one view, and how to write things."""

from __future__ import annotations

from dataclasses import dataclass, field
from datetime import UTC, date, datetime
from typing import Any
from zoneinfo import ZoneInfo

import flask
from babel import Locale
from flask import current_app, request

from ginnel.config import Settings, WebSettings
from ginnel.reports import overview as about
from ginnel.store import Store
from ginnel.times import from_us, to_us
from ginnel.web.questions import QUESTIONS, Question
from ginnel.web.view import Show, View, read_view
from ginnel.web.wording import Wording, name_of
from ginnel.words import Sensor, Site, Space


@dataclass(frozen=True, slots=True, kw_only=True)
class Asked:
    """The site, its sensors, and how to write things for them."""

    store: Store
    site: Site
    sensors: tuple[Sensor, ...]
    wording: Wording
    settings: WebSettings
    spaces: tuple[Space, ...]
    now_us: int = field(default_factory=lambda: to_us(datetime.now(UTC)))

    @property
    def zone(self) -> ZoneInfo:
        """The site's time zone."""
        return self.wording.zone

    def sensor(self, name: str | None) -> Sensor:
        """Find a sensor by name, the first one without; ends the request where there is none."""
        found = self.sensors[0] if name is None and self.sensors else None
        found = found or next((sensor for sensor in self.sensors if sensor.name == name), None)
        if found is None:
            flask.abort(404, f"No sensor here is called {name}." if name else "Nothing has been logged yet.")
        return found

    def view(self) -> View:
        """Read the view from the address; without one it is the newest day of which the log knows."""
        sensor = self.sensor(request.args.get("sensor"))
        return read_view(request.args, sensor, self.zone, self.newest_day(sensor))

    def newest_day(self, sensor: Sensor) -> date:
        """Find the last day of the site of which the log knows anything; today without any."""
        extent = about.extent_us(self.store, sensor.name)
        return from_us(self.now_us if extent is None else extent[1] - 1, self.zone).date()


def ask() -> Asked:
    """Find what every page needs."""
    store: Store = current_app.extensions["ginnel.store"]
    settings: Settings = current_app.extensions["ginnel.settings"]
    found = about.overview(store)
    wording = Wording(
        locale=Locale.parse(settings.web.locale),
        zone=ZoneInfo(found.site.timezone),
        units=settings.web.units,
    )
    return Asked(
        store=store,
        site=found.site,
        sensors=found.sensors,
        wording=wording,
        settings=settings.web,
        spaces=tuple(space.to_space() for space in settings.space),
    )


def show(
    template: str,
    question: Question,
    asked: Asked,
    view: View | None = None,
    *,
    charts: bool = False,
    **values: Any,
) -> str:
    """Render a page, with what every page has.

    ``charts`` says that there are some to draw; ``values`` are the template's own.
    """
    kept: dict[str, str] = values.pop("kept", {})
    common: dict[str, Any] = {
        "question": question,
        "questions": [_link(one, view) for one in QUESTIONS],
        "asked": asked,
        "site": asked.site,
        "sensors": asked.sensors,
        "wording": asked.wording,
        "name_of": name_of,
        "address": address,
        "view": view,
        "kept": kept,
        "shows": list(Show),
        "is_invented": asked.site.name.endswith(INVENTED),
    }
    if view is not None:
        earlier, later = view.earlier(), view.later()
        here = question.endpoint
        common |= {
            "earlier_url": earlier and address(here, earlier.query | kept),
            "later_url": later and address(here, later.query | kept),
            "clock_changes": _clock_changes(view),
            "charts_url": address("charts.of_page", {"page": here.split(".")[1]} | view.query | kept)
            if charts
            else None,
        }
    return flask.render_template(template, **common, **values)


def address(endpoint: str, query: dict[str, str]) -> str:
    """Address of a page with its query."""
    values: dict[str, Any] = dict(query)
    return flask.url_for(endpoint, **values)


#: How a made-up site is named, so that nobody takes its numbers for real ones.
INVENTED = "(invented)"


def _link(question: Question, view: View | None) -> dict[str, str]:
    query = view.query if view is not None and question.endpoint != "pages.now" else {}
    return {
        "endpoint": question.endpoint,
        "name": question.name,
        "url": address(question.endpoint, query),
    }


def _clock_changes(view: View) -> bool:
    offsets = {from_us(moment_us, view.zone).utcoffset() for moment_us in (view.start_us, view.end_us - 1)}
    return len(offsets) > 1
