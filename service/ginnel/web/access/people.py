"""Who is asking: by session or by token, through Flask-Login."""

from __future__ import annotations

from dataclasses import dataclass

from flask import Request, current_app
from flask_login import LoginManager

from ginnel.store import Store
from ginnel.store import users as known
from ginnel.web.access.secrets import digest, stamp


@dataclass(frozen=True, slots=True)
class Person:
    """A user who has shown a password or a token, in the form that Flask-Login asks for."""

    user: known.User

    is_authenticated = True
    is_active = True
    is_anonymous = False

    @property
    def name(self) -> str:
        """Name of the user."""
        return self.user.name

    def get_id(self) -> str:
        """What the session holds, signed: the name, and a stamp of the password."""
        return f"{stamp(self.user.password_hash)} {self.user.name}"


def manager() -> LoginManager:
    """Make the login manager of an application."""
    login = LoginManager()
    login.user_loader(_by_session)
    login.request_loader(_by_token)
    return login


def _by_session(session_id: str) -> Person | None:
    seal, _, name = session_id.partition(" ")
    found = known.user(_store(), name)
    return Person(found) if found is not None and stamp(found.password_hash) == seal else None


def _by_token(request: Request) -> Person | None:
    authorization = request.authorization
    if authorization is None or authorization.type != "bearer" or not authorization.token:
        return None
    found = known.user_of_token(_store(), digest(authorization.token))
    return None if found is None else Person(found)


def _store() -> Store:
    store: Store = current_app.extensions["ginnel.store"]
    return store
