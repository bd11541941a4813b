"""The gate before every page: who has no business here gets no further than the login."""

from __future__ import annotations

import secrets
from datetime import timedelta
from urllib.parse import urlsplit

import flask
from flask import Blueprint, Flask, current_app, request
from flask_login import current_user, login_user, logout_user
from flask_wtf.csrf import CSRFError, CSRFProtect
from werkzeug.exceptions import SecurityError
from werkzeug.wrappers import Response

from ginnel.store import Store
from ginnel.store import users as known
from ginnel.web.access.people import Person, manager
from ginnel.web.access.secrets import is_password
from ginnel.web.access.throttle import Throttle
from ginnel.web.problems import problem

gate = Blueprint("gate", __name__)

#: What a stranger may ask for: the login itself, its looks, and whether the program lives.
OPEN_ENDPOINTS = frozenset({"gate.login", "gate.log_in", "assets.asset", "health.healthz"})


def register(app: Flask, store: Store, *, local_only: bool, behind_tls: bool) -> None:
    """Put the gate before an application."""
    app.config.update(
        SECRET_KEY=known.web_key(store) or secrets.token_bytes(32),
        SESSION_COOKIE_NAME="ginnel",
        SESSION_COOKIE_HTTPONLY=True,
        SESSION_COOKIE_SAMESITE="Lax",
        SESSION_COOKIE_SECURE=behind_tls,
        PERMANENT_SESSION_LIFETIME=timedelta(days=14),
        WTF_CSRF_TIME_LIMIT=None,  # as long as the session
        GINNEL_LOCAL_ONLY=local_only,
    )
    app.extensions["ginnel.throttle"] = Throttle()
    manager().init_app(app)
    app.before_request(ask_who)
    CSRFProtect(app)
    app.register_error_handler(
        CSRFError, lambda error: problem(400, f"{error.description} Go back and reload.")
    )
    app.register_blueprint(gate)
    app.jinja_env.globals["person"] = person


def ask_who() -> Response | None:
    """Let in whoever may; send strangers to the login, and programs away."""
    if isinstance(request.routing_exception, SecurityError):  # an untrusted host gets no address of ours
        raise request.routing_exception
    if person() is not None or request.endpoint in OPEN_ENDPOINTS or is_open():
        return None
    if not known.has_users(_store()):  # listening to the network, and the last user is gone
        return problem(403, "The dashboard has no users: `ginnel users add NAME` on its own machine.")
    if request.path.startswith("/api/") or request.endpoint == "health.metrics":
        answer = problem(401, "Show a token: Authorization: Bearer ...", "Who are you?")
        answer.headers["WWW-Authenticate"] = 'Bearer realm="ginnel"'
        return answer
    asked = request.full_path.rstrip("?") if request.method == "GET" else "/"
    return flask.redirect(flask.url_for("gate.login", next=None if asked == "/" else asked))


def is_open() -> bool:
    """Whether no login is needed: nobody has a password, and only this machine can ask."""
    return bool(current_app.config["GINNEL_LOCAL_ONLY"]) and not known.has_users(_store())


def person() -> Person | None:
    """Who is asking, if we know."""
    return current_user._get_current_object() if current_user.is_authenticated else None


@gate.get("/login")
def login() -> str | Response:
    """Ask for name and password."""
    if person() is not None or is_open():
        return flask.redirect(_next_url())
    return flask.render_template("login.html", next=request.args.get("next", ""))


@gate.post("/login")
def log_in() -> Response | tuple[str, int]:
    """Let somebody in who knows the password."""
    name, password = request.form.get("name", ""), request.form.get("password", "")
    throttle: Throttle = current_app.extensions["ginnel.throttle"]
    address = request.remote_addr or ""
    if not throttle.is_open(address, name):
        return problem(429, "Too many wrong passwords. Wait five minutes, then try again.")
    found = known.user(_store(), name)
    if not is_password(found.password_hash if found else None, password) or found is None:
        throttle.failed(address, name)
        current_app.logger.warning("login refused, from %s", address)
        page = flask.render_template(
            "login.html",
            next=request.form.get("next", ""),
            name=name,
            wrong="That name and password do not belong together.",
        )
        return page, 401
    flask.session.clear()
    flask.session.permanent = True
    login_user(Person(found))
    return flask.redirect(_next_url())


@gate.post("/logout")
def log_out() -> Response:
    """Forget who is asking."""
    logout_user()
    flask.session.clear()
    return flask.redirect(flask.url_for("gate.login"))


def _next_url() -> str:
    """Where somebody wanted to go: an address of ours, or the first page."""
    root = request.script_root
    wanted = request.values.get("next", "").replace("\\", "/")
    parts = urlsplit(wanted)
    is_ours = wanted.startswith("/") and not wanted.startswith("//") and not parts.scheme and not parts.netloc
    return root + wanted if is_ours and wanted.isprintable() else f"{root}/"


def _store() -> Store:
    store: Store = current_app.extensions["ginnel.store"]
    return store
