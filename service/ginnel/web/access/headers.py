"""What the browser is told about each answer."""

from __future__ import annotations

import flask

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


def harden(answer: flask.Response) -> flask.Response:
    """Say what a page may do, and that nobody between may keep it."""
    answer.headers["Content-Security-Policy"] = CONTENT_POLICY
    answer.headers["X-Content-Type-Options"] = "nosniff"
    answer.headers["Referrer-Policy"] = "same-origin"
    answer.headers["Cross-Origin-Opener-Policy"] = "same-origin"
    answer.headers["Cross-Origin-Resource-Policy"] = "same-origin"
    answer.headers["Permissions-Policy"] = "camera=(), geolocation=(), microphone=(), payment=(), usb=()"
    if "Cache-Control" not in answer.headers:
        answer.headers["Cache-Control"] = "private, no-cache"
    return answer
