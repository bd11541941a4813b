"""Who may see the dashboard: users, tokens for programs, and the key that signs sessions.

Passwords and tokens are never here, only what checks them: a hash with its own salt, and a digest.
"""

from __future__ import annotations

import secrets
from dataclasses import dataclass
from enum import StrEnum

from sqlalchemy import delete, func, insert, select, update

from ginnel.errors import StoreError
from ginnel.store.engine import Store
from ginnel.store.tables import TokenRow, UserRow, WebKeyRow


class Role(StrEnum):
    """What a user may do."""

    LOOK = "look"
    EDIT = "edit"  # also change what is kept: marks, tallies


@dataclass(frozen=True, slots=True, kw_only=True)
class User:
    """Somebody who may see the dashboard."""

    name: str
    role: Role
    password_hash: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Token:
    """What a program shows instead of a password; it may do what its user may."""

    user: str
    label: str
    digest: str  # SHA-256 of the token, in hexadecimal
    made_us: int


def users(store: Store) -> list[User]:
    """All users by name."""
    with store.reading() as connection:
        rows = connection.execute(select(*UserRow.__table__.columns).order_by(UserRow.name))
        return [User(name=row.name, role=Role(row.role), password_hash=row.password_hash) for row in rows]


def user(store: Store, name: str) -> User | None:
    """Find a user by name."""
    return next((one for one in users(store) if one.name == name), None)


def has_users(store: Store) -> bool:
    """Whether anybody has a password."""
    with store.reading() as connection:
        return bool(connection.execute(select(func.count()).select_from(UserRow)).scalar_one())


def put_user(store: Store, person: User, *, new: bool) -> None:
    """Add a user, or change one. The first one brings the key that signs sessions.

    Raises
    ------
    StoreError
        A new user's name is taken, or the one to change is not there.
    """
    values = {"role": person.role.value, "password_hash": person.password_hash}
    with store.writing() as connection:
        known = connection.execute(select(UserRow.name).where(UserRow.name == person.name)).first()
        if new and known:
            raise StoreError(f"there is a user {person.name} already: `ginnel users password {person.name}`")
        if not new and not known:
            raise StoreError(f"there is no user {person.name}: see `ginnel users list`")
        if new:
            connection.execute(insert(UserRow).values(name=person.name, **values))
        else:
            connection.execute(update(UserRow).where(UserRow.name == person.name).values(values))
        if connection.execute(select(WebKeyRow.id)).first() is None:
            connection.execute(insert(WebKeyRow).values(id=1, secret=secrets.token_bytes(32)))


def remove_user(store: Store, name: str) -> None:
    """Take a user and all of their tokens away."""
    with store.writing() as connection:
        connection.execute(delete(TokenRow).where(TokenRow.user_name == name))
        if connection.execute(delete(UserRow).where(UserRow.name == name)).rowcount == 0:
            raise StoreError(f"there is no user {name}: see `ginnel users list`")


def web_key(store: Store) -> bytes | None:
    """Key that signs sessions; None as long as there never was a user."""
    with store.reading() as connection:
        return connection.execute(select(WebKeyRow.secret)).scalar_one_or_none()


def tokens(store: Store, user_name: str | None = None) -> list[Token]:
    """Tokens of a user, or of all, by user and label."""
    query = select(*TokenRow.__table__.columns).order_by(TokenRow.user_name, TokenRow.label)
    if user_name is not None:
        query = query.where(TokenRow.user_name == user_name)
    with store.reading() as connection:
        return [
            Token(user=row.user_name, label=row.label, digest=row.digest, made_us=row.made_us)
            for row in connection.execute(query)
        ]


def user_of_token(store: Store, digest: str) -> User | None:
    """Find whose token has a digest."""
    query = (
        select(*UserRow.__table__.columns)
        .join(TokenRow, TokenRow.user_name == UserRow.name)
        .where(TokenRow.digest == digest)
    )
    with store.reading() as connection:
        row = connection.execute(query).first()
    return None if row is None else User(name=row.name, role=Role(row.role), password_hash=row.password_hash)


def put_token(store: Store, token: Token) -> None:
    """Keep the digest of a new token.

    Raises
    ------
    StoreError
        The user is not there, or has a token of that label.
    """
    with store.writing() as connection:
        if connection.execute(select(UserRow.name).where(UserRow.name == token.user)).first() is None:
            raise StoreError(f"there is no user {token.user}: see `ginnel users list`")
        same = select(TokenRow.label).where(TokenRow.user_name == token.user, TokenRow.label == token.label)
        if connection.execute(same).first():
            raise StoreError(f"{token.user} has a token {token.label} already: choose another label")
        connection.execute(
            insert(TokenRow).values(
                user_name=token.user, label=token.label, digest=token.digest, made_us=token.made_us
            )
        )


def remove_token(store: Store, user_name: str, label: str) -> None:
    """Take a token away; what shows it is refused from now on."""
    same = (TokenRow.user_name == user_name, TokenRow.label == label)
    with store.writing() as connection:
        if connection.execute(delete(TokenRow).where(*same)).rowcount == 0:
            raise StoreError(f"{user_name} has no token {label}: see `ginnel users list`")
