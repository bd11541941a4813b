"""What goes wrong, said in one line: a page for people, problem details (RFC 9457) for programs."""

from __future__ import annotations

from http import HTTPStatus

import flask
from flask import Flask, request
from werkzeug.exceptions import HTTPException, InternalServerError, SecurityError

from ginnel.errors import ConfigError, StoreBusyError, StoreError
from ginnel.web.view import ViewError

PROBLEM_TYPE = "application/problem+json"
_OWN_WORDS = {
    400: ("Not understood", "The address or the form was not understood."),
    403: ("Not allowed", "This is not for you to see or do."),
    404: ("Not found", "There is nothing at this address."),
    405: ("Not allowed", "That cannot be done at this address."),
    413: ("Too much", "That is more than the dashboard takes at once."),
    429: ("Too many tries", "Wait a few minutes, then try again."),
    500: ("Something broke", "The dashboard's log says more."),
}


def register(app: Flask) -> None:
    """Let every error of the application be answered here."""
    app.register_error_handler(HTTPException, _refused)
    app.register_error_handler(StoreError, _store_failed)
    app.register_error_handler(ConfigError, _store_failed)
    app.register_error_handler(ViewError, lambda error: problem(400, str(error)))


def problem(status: int, detail: str | None = None, title: str | None = None) -> flask.Response:
    """Answer with a problem, as a page or as problem details."""
    own_title, own_detail = _OWN_WORDS.get(status, (HTTPStatus(status).phrase, ""))
    title, detail = title or own_title, detail or own_detail
    if request.path.startswith("/api/"):
        body = {"type": "about:blank", "title": title, "status": status, "detail": detail}
        answer = flask.jsonify(body)
        answer.content_type = PROBLEM_TYPE
    else:
        answer = flask.make_response(flask.render_template("trouble.html", title=title, text=detail))
    answer.status_code = status
    answer.cache_control.no_store = True
    return answer


def _refused(error: HTTPException) -> flask.Response:
    if isinstance(error, SecurityError):  # an untrusted host has no addresses to make a page with
        return flask.Response(
            "Open the dashboard by the address that ginnel serve printed.\n", 400, content_type="text/plain"
        )
    if error.response is not None and isinstance(error.response, flask.Response):
        return error.response
    status = error.code or 500
    ours = error.description if error.description != type(error).description else None
    answer = problem(status, None if isinstance(error, InternalServerError) else ours)
    for name, value in error.get_headers():
        if name not in ("Content-Type", "Content-Length"):
            answer.headers[name] = value
    return answer


def _store_failed(error: StoreError | ConfigError) -> flask.Response:
    busy = isinstance(error, StoreBusyError)
    return problem(503 if busy else 500, str(error), "The log cannot be read")
