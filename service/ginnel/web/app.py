"""The Flask application: the gate, the pages, the API, and what each answer carries."""

from __future__ import annotations

import ipaddress
from typing import TYPE_CHECKING
from urllib.parse import urlsplit

from flask import Flask
from flask.json.provider import DefaultJSONProvider
from flask_compress import Compress

from ginnel.store import open_store
from ginnel.web import problems
from ginnel.web.access import gate
from ginnel.web.access.headers import harden
from ginnel.web.api.routes import api
from ginnel.web.assets import asset_url, assets
from ginnel.web.charts import charts
from ginnel.web.files import files
from ginnel.web.health import health
from ginnel.web.pages import pages

if TYPE_CHECKING:
    from ginnel.config import Settings

LOOPBACK_NAMES = ["127.0.0.1", "localhost", "[::1]"]
LARGEST_BODY = 64 * 1024


def create_app(settings: Settings) -> Flask:
    """Make the dashboard of one store.

    Raises
    ------
    StoreError
        The store cannot be opened.
    """
    web = settings.web
    app = Flask(__name__, static_folder=None)
    local_only = is_loopback(web.address) and web.public_url is None
    if is_loopback(web.address):
        # a page elsewhere must not reach the dashboard under a name of its own (DNS rebinding)
        public = urlsplit(web.public_url or "").hostname
        app.config["TRUSTED_HOSTS"] = [*LOOPBACK_NAMES, *([public] if public else [])]
    app.config["MAX_CONTENT_LENGTH"] = LARGEST_BODY
    app.config["COMPRESS_MIMETYPES"] = [
        "text/html",
        "application/json",
        "application/problem+json",
        "text/csv",
    ]
    app.config["COMPRESS_ALGORITHM"] = ["br", "gzip"]
    store = open_store(settings.store.url, read_only=True)
    app.extensions["ginnel.store"], app.extensions["ginnel.settings"] = store, settings
    Compress(app)
    app.after_request(harden)
    problems.register(app)
    behind_tls = (web.public_url or "").startswith("https:")
    gate.register(app, store, local_only=local_only, behind_tls=behind_tls)
    for blueprint in (api, assets, charts, files, health, pages):
        app.register_blueprint(blueprint)
    in_order = DefaultJSONProvider(app)
    in_order.sort_keys = False  # in a chart's document, what is referred to must come first
    app.json = in_order
    app.jinja_env.trim_blocks = app.jinja_env.lstrip_blocks = True
    app.jinja_env.globals["asset_url"] = asset_url
    return app


def is_loopback(address: str) -> bool:
    """Whether only this machine can reach an address."""
    return ipaddress.ip_address(address).is_loopback
