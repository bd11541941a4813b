"""The pages: each reads its address, asks, and shows."""

from __future__ import annotations

from dataclasses import replace

from flask import Blueprint, request

from ginnel.web import files, questions
from ginnel.web.answers import busy as busy_answer
from ginnel.web.answers import fast as fast_answer
from ginnel.web.answers import full as full_answer
from ginnel.web.answers import now as now_answer
from ginnel.web.answers import single as single_answer
from ginnel.web.answers import trust as trust_answer
from ginnel.web.asked import address, ask, show
from ginnel.web.wording import PER_MPS, interval_name
from ginnel.words import Passage, Story

pages = Blueprint("pages", __name__)


@pages.get("/")
def now() -> str:
    """Answer whether everything is all right."""
    asked = ask()
    found = now_answer.look(asked.store, asked.sensors, asked.now_us)
    return show("now.html", questions.NOW, asked, now=found)


@pages.get("/now-part")
def now_part() -> str:
    """Give the live part of the first page alone."""
    asked = ask()
    found = now_answer.look(asked.store, asked.sensors, asked.now_us)
    return show("now_part.html", questions.NOW, asked, now=found)


@pages.get("/busy")
def busy() -> str:
    """Answer how busy it was."""
    asked = ask()
    view = asked.view()
    found = busy_answer.look(asked.store, view, asked.now_us)
    return show(
        "busy.html", questions.BUSY, asked, view, charts=True, busy=found, interval_name=interval_name
    )


@pages.get("/fast")
def fast() -> str:
    """Answer how fast they went."""
    asked = ask()
    view = asked.view()
    found = fast_answer.look(asked.store, view, limit_mps(asked.settings.speed_limit, asked.settings.units))
    wording, few = asked.wording, fast_answer.FEW
    return show(
        "fast.html",
        questions.FAST,
        asked,
        view,
        charts=bool(found.all.summary.n),
        fast=found,
        few=few,
        trend_rows=[
            (interval_name(view, found.every, one.start_us, wording), one.summary) for one in found.along
        ],
        clock_rows=[(f"{hour:02}:00", one) for hour, one in enumerate(found.by_hour)],
        has_trend=any(one.summary.n >= few for one in found.along),
        has_clock=any(one.n >= few for one in found.by_hour),
    )


@pages.get("/full")
def full() -> str:
    """Answer how full it was."""
    asked = ask()
    view = asked.view()
    found = full_answer.look(asked.store, view, asked.spaces, asked.now_us)
    return show(
        "full.html",
        questions.FULL,
        asked,
        view,
        charts=bool(found.rows),
        full=found,
        most_days=full_answer.MOST_DAYS,
        has_spaces=bool(asked.spaces),
        interval_name=interval_name,
    )


@pages.get("/one-by-one")
def single() -> str:
    """Answer what exactly passed."""
    asked = ask()
    with_uncounted = request.args.get("with") == "uncounted"
    hour = request.args.get("hour")
    view = asked.view()
    found = single_answer.look(asked.store, view, hour, with_uncounted=with_uncounted)
    kept = {"with": "uncounted"} if with_uncounted else {}
    names = single_answer.hour_names([one.start_us for one in found.hours], found.view)
    return show(
        "single.html",
        questions.SINGLE,
        asked,
        found.view,
        single=found,
        names=names,
        shown_hour=next(name for name, one in zip(names, found.hours, strict=True) if one.is_shown),
        remarks=remarks,
        kept=kept,
    )


@pages.get("/sure")
def trust() -> str:
    """Answer how far this can be trusted."""
    asked = ask()
    view = asked.view()
    found = trust_answer.look(asked.store, view, asked.now_us)
    odd = trust_answer.oddities(asked.store, view, asked.now_us)
    return show("trust.html", questions.TRUST, asked, view, charts=True, trust=found, odd=odd)


@pages.get("/take-away")
def take() -> str:
    """Offer files to take away."""
    asked = ask()
    view = asked.view()
    return show(
        "take.html",
        questions.TAKE,
        asked,
        view,
        kinds=files.kinds(),
        formats=files.formats(),
        summary_forms=files.summary_forms(),
        links=[
            (one.name, address(one.endpoint, view.query))
            for one in questions.QUESTIONS
            if one not in (questions.NOW, questions.TAKE)
        ],
    )


@pages.get("/side-by-side")
def side() -> str:
    """Compare two sensors."""
    asked = ask()
    view = asked.view()
    names = [sensor.name for sensor in asked.sensors if sensor.name != view.sensor.name]
    other = asked.sensor(request.args.get("with", names[0] if names else view.sensor.name))
    pair = tuple(
        busy_answer.look(asked.store, replace(view, sensor=sensor), asked.now_us)
        for sensor in (view.sensor, other)
    )
    return show(
        "side.html",
        questions.SIDE,
        asked,
        view,
        charts=True,
        pair=pair,
        other=other,
        kept={"with": other.name},
        interval_name=interval_name,
    )


def limit_mps(limit: float | None, units: str) -> float | None:
    """Turn the limit of the settings into m/s."""
    return None if limit is None else limit / PER_MPS[units]


def remarks(passage: Passage) -> str:
    """What to know of a passage before trusting it."""
    words = [] if passage.story is Story.PASSAGE else [f"{passage.story.value}, not counted"]
    return ", ".join(words + sorted(flag.value for flag in passage.flags))
