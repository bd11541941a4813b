"""Addresses of the API: each asks what the page of the same name asks."""

from __future__ import annotations

import math
from dataclasses import asdict
from datetime import date
from typing import Any

import flask
import numpy as np
from flask import Blueprint
from spectree import Response, SpecTree

from ginnel import __version__
from ginnel.reports.flow import typical_week
from ginnel.stats import SpeedSummary
from ginnel.times import from_us
from ginnel.web.answers import busy, fast, full, now, single, trust
from ginnel.web.api import models
from ginnel.web.asked import Asked, ask
from ginnel.web.problems import PROBLEM_TYPE, problem
from ginnel.web.view import View, read_view
from ginnel.web.wording import PER_MPS
from ginnel.words import Condition, Direction

api = Blueprint("api", __name__, url_prefix="/api/v1")


def _refuse(request: Any, response: Any, error: Exception | None, instance: Any, adapter: Any) -> None:
    """Answer a query that is not understood as a problem, which says of each word what is wrong."""
    if error is not None:
        words = [
            f"{'.'.join(map(str, one['loc']))}: {one['msg']}" for one in adapter.validation_errors(error)
        ]
        flask.abort(problem(400, "; ".join(words)))


spec = SpecTree("flask", before=_refuse, title="Ginnel", version=__version__, annotations=True)
_PROBLEMS: dict[str, Any] = {f"HTTP_{code}": models.Problem for code in (400, 401, 404, 500, 503)}


def _gives(model: type[Any]) -> Response:
    return Response(HTTP_200=model, **_PROBLEMS)


@api.get("/openapi.json")
def openapi() -> flask.Response:
    """Give the description of this API."""
    spec.app = flask.current_app
    told: dict[str, Any] = {key: value for key, value in spec.spec.items() if key != "tags"}
    told["paths"] = {path: what for path, what in told["paths"].items() if path.startswith("/api/v1/")}
    for path in told["paths"].values():
        for operation in path.values():
            for code, answer in operation["responses"].items():
                if code != "200" and "content" in answer:
                    answer["content"] = {PROBLEM_TYPE: next(iter(answer["content"].values()))}
    told["components"]["securitySchemes"] = {"token": {"type": "http", "scheme": "bearer"}}
    told["security"] = [{}, {"token": []}]
    return flask.jsonify(told)


@api.get("/sensors")
@spec.validate(resp=_gives(models.Sensors))
def sensors() -> Any:
    """Site and sensors."""
    asked = ask()
    return models.Sensors(
        site=asked.site.name,
        timezone=asked.site.timezone,
        sensors=[
            models.SensorOut(
                name=one.name,
                carrier_hz=one.carrier_hz,
                channels=one.channels.value,
                approaching=one.approaching_name,
                receding=one.receding_name,
            )
            for one in asked.sensors
        ],
    )


@api.get("/now")
@spec.validate(resp=_gives(models.NowOut))
def now_() -> Any:
    """Every sensor as it is now, and what is wrong."""
    asked = ask()
    found = now.look(asked.store, asked.sensors, asked.now_us)
    return models.NowOut(
        at=from_us(asked.now_us, asked.zone),
        sensors=[
            models.SensorNow(
                sensor=place.sensor.name,
                listening=place.is_listening,
                heard_until=_at(place.heard_until_us, asked),
                last_hour=_ways(place.hour.counts),
                last_hour_coverage=place.hour.coverage,
            )
            for place in found.places
        ],
        conditions=[_condition(one, asked) for one in found.troubles],
    )


@api.get("/counts")
@spec.validate(query=models.ViewQuery, resp=_gives(models.Counts))
def counts(query: models.ViewQuery) -> Any:
    """How busy it was."""
    asked, view = _asked(query)
    found = busy.look(asked.store, view, asked.now_us)
    return models.Counts(
        sensor=view.sensor.name,
        every=found.every.value,
        intervals=[
            models.CountInterval(
                **_span(one.start_us, one.end_us, asked),
                counts=_ways(one.counts),
                both=one.both,
                coverage=one.coverage,
                usual=one.usual[None],
                usual_low=one.usual_low,
                usual_high=one.usual_high,
            )
            for one in found.intervals
        ],
        total=_ways(found.total.counts),
        both=found.total.both,
        low=found.total.low,
        high=found.total.high,
        coverage=found.total.coverage,
        listened_s=found.total.listened_s,
    )


@api.get("/week")
@spec.validate(query=models.ViewQuery, resp=_gives(models.Week))
def week(query: models.ViewQuery) -> Any:
    """Passages an hour by weekday and hour of the clock."""
    asked, view = _asked(query)
    found = typical_week(asked.store, view.sensor.name, view.start_us, view.end_us, view.zone)
    return models.Week(
        sensor=view.sensor.name,
        rate_per_hour=[[None if math.isnan(rate) else rate for rate in day] for day in found.rate.tolist()],
        listened_h=found.listened_h.tolist(),
    )


@api.get("/speeds")
@spec.validate(query=models.ViewQuery, resp=_gives(models.Speeds))
def speeds(query: models.ViewQuery) -> Any:
    """How fast they went."""
    asked, view = _asked(query)
    limit = asked.settings.speed_limit
    limit_mps = None if limit is None else limit / PER_MPS[asked.settings.units]
    found = fast.look(asked.store, view, limit_mps)
    return models.Speeds(
        sensor=view.sensor.name,
        every=found.every.value,
        limit_mps=limit_mps,
        profiles=[
            models.Profile(
                direction=None if one.direction is None else one.direction.value,
                speeds=_speeds(one.summary),
                pace_low_mps=one.pace.low_mps if one.pace else None,
                pace_high_mps=one.pace.high_mps if one.pace else None,
                pace_share=one.pace.share if one.pace else None,
                over_limit=one.over_limit,
                histogram_edges_mps=np.round(one.edges_mps, 6).tolist(),
                histogram_counts=one.counts.tolist(),
            )
            for one in found.profiles
        ],
        intervals=[
            models.SpeedInterval(**_span(one.start_us, one.end_us, asked), speeds=_speeds(one.summary))
            for one in found.along
        ],
        clock_hours=[_speeds(one) for one in found.by_hour],
    )


@api.get("/occupancy")
@spec.validate(query=models.ViewQuery, resp=_gives(models.Fullness))
def occupancy(query: models.ViewQuery) -> Any:
    """How full it was."""
    asked, view = _asked(query)
    found = full.look(asked.store, view, asked.spaces, asked.now_us)
    return models.Fullness(
        sensor=view.sensor.name,
        every=found.every.value,
        intervals=[
            models.OccupancyInterval(
                **_span(row.interval_start_us, row.interval_end_us, asked),
                occupied_s=row.occupied_s,
                occupancy=row.occupancy,
                coverage=row.coverage,
            )
            for row in found.rows
        ],
        spaces=[
            models.SpaceOut(
                space=one.space.name,
                intervals=[
                    models.InsideInterval(
                        **_span(row.interval_start_us, row.interval_end_us, asked),
                        inside=row.inside,
                        low=row.low,
                        high=row.high,
                        caution=row.caution,
                    )
                    for row in one.rows
                ],
            )
            for one in found.spaces
        ],
    )


@api.get("/passages")
@spec.validate(query=models.PassagesQuery, resp=_gives(models.Passages))
def passages(query: models.PassagesQuery) -> Any:
    """Passages of an hour, one by one."""
    asked, view = _asked(query)
    found = single.look(asked.store, view, query.hour, with_uncounted=query.uncounted)
    return models.Passages(
        sensor=view.sensor.name,
        **_span(found.start_us, found.end_us, asked),
        listened_s=found.listened_s,
        complete=not found.is_cut,
        passages=[
            models.PassageOut(
                passage_id=entry.passage_id,
                started_at=from_us(entry.passage.started_us, asked.zone),
                crossed_at=from_us(entry.passage.crossed_us, asked.zone),
                ended_at=from_us(entry.passage.ended_us, asked.zone),
                story=entry.passage.story.value,
                direction=entry.passage.direction.value,
                direction_confidence=entry.passage.direction_confidence,
                speed_mps=entry.passage.speed_mps,
                speed_se_mps=entry.passage.speed_se_mps,
                speed_band=entry.speed_band,
                snr_db=entry.passage.snr_db,
                flags=sorted(flag.value for flag in entry.passage.flags),
            )
            for entry in found.entries
        ],
    )


@api.get("/trust")
@spec.validate(query=models.ViewQuery, resp=_gives(models.TrustOut))
def trust_(query: models.ViewQuery) -> Any:
    """How far the numbers can be trusted."""
    asked, view = _asked(query)
    found = trust.look(asked.store, view, asked.now_us)
    return models.TrustOut(
        sensor=view.sensor.name,
        every=found.every.value,
        coverage=found.total.coverage,
        intervals=[
            models.CoverageInterval(**_span(start_us, end_us, asked), coverage=share)
            for start_us, end_us, share in found.coverage
        ],
        gaps=[models.Gap(**_span(gap.started_us, gap.ended_us, asked)) for gap in found.gaps],
        n_gaps=found.n_gaps,
        health=[
            models.HealthOut(
                at=from_us(one.at_us, asked.zone),
                level_dbfs=one.level_dbfs,
                noise_dbfs_hz=one.noise_dbfs_hz,
                hum_db=one.hum_db,
                lamp_db=one.lamp_db,
                clipped_share=one.clipped_share,
            )
            for one in found.course
        ],
        conditions=[_condition(one, asked) for one in found.troubles],
        findings=[
            models.Finding(kind=one.kind.value, **_span(one.start_us, one.end_us, asked), reason=one.reason)
            for one in trust.oddities(asked.store, view, asked.now_us)
        ],
        chain_versions=list(found.facts.chain_versions),
    )


def _asked(query: models.ViewQuery) -> tuple[Asked, View]:
    asked = ask()
    sensor = asked.sensor(query.sensor)
    words = {
        name: value.isoformat() if isinstance(value, date) else str(value)
        for name, value in query.model_dump(include={"show", "on", "to"}, exclude_none=True).items()
    }
    return asked, read_view(words, sensor, asked.zone, asked.newest_day(sensor))


def _span(start_us: int, end_us: int, asked: Asked) -> dict[str, Any]:
    return {"start": from_us(start_us, asked.zone), "end": from_us(end_us, asked.zone)}


def _at(moment_us: int | None, asked: Asked) -> Any:
    return None if moment_us is None else from_us(moment_us, asked.zone)


def _ways(numbers: dict[Direction, int | None]) -> models.Ways:
    return models.Ways(
        approaching=numbers.get(Direction.APPROACHING),
        receding=numbers.get(Direction.RECEDING),
        unknown=numbers.get(Direction.UNKNOWN),
    )


def _speeds(summary: SpeedSummary) -> models.SpeedsOut:
    return models.SpeedsOut(**asdict(summary))


def _condition(one: Condition, asked: Asked) -> models.ConditionOut:
    return models.ConditionOut(
        kind=one.kind,
        sensor=one.sensor,
        severity=one.severity.value,
        raised_at=from_us(one.raised_us, asked.zone),
        cleared_at=_at(one.cleared_us, asked),
        sentence=one.sentence,
        advice=one.advice,
    )
