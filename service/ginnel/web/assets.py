"""Style, scripts and the chart library's script: named by their content, compressed once, kept for ever.

The name of a file holds a hash of what is in it, so a browser asks for each version once.
"""

from __future__ import annotations

import functools
import hashlib
from pathlib import Path

import flask
from flask import Blueprint, request

STATIC = Path(__file__).parent / "static"
CHART_SCRIPT = "bokeh.min.js"
OWN = ("look.css", "page.js")
YEAR_S = 365 * 86_400
_TYPES = {".css": "text/css; charset=utf-8", ".js": "text/javascript; charset=utf-8"}

assets = Blueprint("assets", __name__, url_prefix="/assets")


def asset_url(name: str) -> str:
    """Address of a file, for templates."""
    return flask.url_for("assets.asset", tag=tag_of(name), name=name)


@assets.get("/<tag>/<name>")
def asset(tag: str, name: str) -> flask.Response:
    """Give one of the known files; whatever else is asked for is not there."""
    if name not in (*OWN, CHART_SCRIPT) or tag != tag_of(name):
        flask.abort(404)
    coding = request.accept_encodings.best_match(["br", "gzip"])
    answer = flask.Response(content(name, coding), content_type=_TYPES[Path(name).suffix])
    if coding:
        answer.content_encoding = coding
    answer.vary.add("Accept-Encoding")
    answer.cache_control.public = answer.cache_control.immutable = True
    answer.cache_control.max_age = YEAR_S
    return answer


@functools.cache
def tag_of(name: str) -> str:
    """Hash of a file's content, short."""
    return hashlib.sha256(content(name, None)).hexdigest()[:12]


@functools.cache
def content(name: str, coding: str | None) -> bytes:
    """Bytes of a file, compressed if asked for: at most three copies of each are kept."""
    data = _path(name).read_bytes()
    if coding == "br":
        import brotli

        packed: bytes = brotli.compress(
            data, quality=9
        )  # 11 would save another 9 % and take 20 times as long
        return packed
    if coding == "gzip":
        import gzip

        return gzip.compress(data, 9, mtime=0)
    return data


def _path(name: str) -> Path:
    if name == CHART_SCRIPT:
        from bokeh.settings import settings as bokeh_settings

        return Path(bokeh_settings.bokehjs_path()) / "js" / name
    return STATIC / name
