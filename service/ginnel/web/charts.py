"""The charts of a page, in JSON, for the same address as the page's own."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import replace
from typing import TYPE_CHECKING, Any

import flask
from flask import Blueprint, request

from ginnel.web.answers import busy, fast, full, trust
from ginnel.web.asked import Asked, ask
from ginnel.web.pages import limit_mps
from ginnel.web.view import View

if TYPE_CHECKING:
    from bokeh.plotting import figure

    from ginnel.web.drawing.scheme import Scheme

charts = Blueprint("charts", __name__, url_prefix="/charts")


@charts.get("/<page>.json")
def of_page(page: str) -> flask.Response:
    """Give every chart of a page, by the id of the place it goes to."""
    from bokeh.core.types import ID
    from bokeh.embed import json_item

    from ginnel.web.drawing.scheme import SCHEMES

    scheme = SCHEMES.get(request.args.get("scheme", "light"))
    if page not in DRAWN or scheme is None:
        flask.abort(404)
    asked = ask()
    plots = DRAWN[page](asked, asked.view(), scheme)
    return flask.jsonify({name: json_item(plot, ID(name)) for name, plot in plots.items()})


def _busy(asked: Asked, view: View, scheme: Scheme) -> Mapping[str, figure]:
    from ginnel.web.drawing.busy import draw

    return draw(busy.look(asked.store, view, asked.now_us), asked.wording, scheme)


def _fast(asked: Asked, view: View, scheme: Scheme) -> Mapping[str, figure]:
    from ginnel.web.drawing.fast import draw

    limit = limit_mps(asked.settings.speed_limit, asked.settings.units)
    return draw(fast.look(asked.store, view, limit), asked.wording, scheme)


def _full(asked: Asked, view: View, scheme: Scheme) -> Mapping[str, figure]:
    from ginnel.web.drawing.full import draw

    return draw(full.look(asked.store, view, asked.spaces, asked.now_us), asked.wording, scheme)


def _trust(asked: Asked, view: View, scheme: Scheme) -> Mapping[str, figure]:
    from ginnel.web.drawing.trust import draw

    return draw(trust.look(asked.store, view, asked.now_us), asked.wording, scheme)


def _side(asked: Asked, view: View, scheme: Scheme) -> Mapping[str, figure]:
    from ginnel.web.drawing.busy import flow

    other = replace(view, sensor=asked.sensor(request.args.get("with")))
    return {
        place: flow(busy.look(asked.store, one, asked.now_us), asked.wording, scheme)
        for place, one in (("flow-one", view), ("flow-other", other))
    }


DRAWN: dict[str, Callable[[Asked, View, Any], Mapping[str, Any]]] = {
    "busy": _busy,
    "fast": _fast,
    "full": _full,
    "side": _side,
    "trust": _trust,
}
