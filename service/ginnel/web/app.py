"""The Flask application: headers, static files, and the pages hung into it."""

from __future__ import annotations

from importlib.metadata import version
from pathlib import Path
from typing import TYPE_CHECKING

import flask
from flask import Flask
from flask.json.provider import DefaultJSONProvider

from ginnel.errors import StoreBusyError, StoreError
from ginnel.store import open_store
from ginnel.web.pages import pages

if TYPE_CHECKING:
    from ginnel.config import Settings

#: Nothing from elsewhere, no inline script, no eval. The chart library writes style elements
#: into the page (measured: they are refused without 'unsafe-inline'); style attributes stay forbidden.
CONTENT_POLICY = "; ".join(
    (
        "default-src 'none'",
        "script-src 'self'",
        "style-src-elem 'self' 'unsafe-inline'",
        "style-src-attr 'none'",
        "img-src 'self' data:",
        "connect-src 'self'",
        "base-uri 'none'",
        "form-action 'self'",
        "frame-ancestors 'none'",
    )
)
YEAR_S = 365 * 86_400


def create_app(settings: Settings) -> Flask:
    """Make the dashboard of one store.

    Raises
    ------
    StoreError
        The store cannot be opened.
    """
    app = Flask(__name__)
    # a page elsewhere must not reach the dashboard under a name of its own (DNS rebinding)
    app.config["TRUSTED_HOSTS"] = ["127.0.0.1", "localhost", "[::1]"]
    app.extensions["ginnel.store"] = open_store(settings.store.url, read_only=True)
    app.register_blueprint(pages)
    app.add_url_rule("/bokeh/<release>/bokeh.min.js", "bokeh_js", bokeh_js)
    app.after_request(harden)
    app.register_error_handler(StoreError, store_failed)
    in_order = DefaultJSONProvider(app)
    in_order.sort_keys = False  # in a chart's document, what is referred to must come first
    app.json = in_order
    app.jinja_env.trim_blocks = app.jinja_env.lstrip_blocks = True
    app.jinja_env.globals["bokeh_release"] = version("bokeh")
    return app


def bokeh_js(release: str) -> flask.Response:
    """Give the chart library's script, from the installed package."""
    from bokeh.settings import settings as bokeh_settings

    if release != version("bokeh"):
        flask.abort(404)
    folder = Path(bokeh_settings.bokehjs_path()) / "js"
    answer = flask.send_from_directory(folder, "bokeh.min.js", max_age=YEAR_S)
    answer.cache_control.immutable = True
    return answer


def harden(answer: flask.Response) -> flask.Response:
    """Say to the browser what a page may do."""
    answer.headers["Content-Security-Policy"] = CONTENT_POLICY
    answer.headers["X-Content-Type-Options"] = "nosniff"
    answer.headers["Referrer-Policy"] = "same-origin"
    answer.headers["Cross-Origin-Opener-Policy"] = "same-origin"
    return answer


def store_failed(error: StoreError) -> tuple[str, int]:
    """Answer with the error's own line."""
    status = 503 if isinstance(error, StoreBusyError) else 500
    return flask.render_template("trouble.html", title="The log cannot be read", text=str(error)), status
