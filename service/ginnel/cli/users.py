"""`ginnel users`: who may see the dashboard."""

from __future__ import annotations

import re
import sys
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

import click

from ginnel.cli.options import config_option

if TYPE_CHECKING:
    from ginnel.store import Store

ROLES = ("look", "edit")
_NAME = re.compile(r"[A-Za-z0-9][A-Za-z0-9._@-]{0,63}")


@click.group()
def users() -> None:
    """Say who may see the dashboard. Without any user it shows itself on this machine only."""


@users.command()
@click.argument("name")
@click.option(
    "--role",
    type=click.Choice(ROLES),
    default="look",
    show_default=True,
    help="edit may change marks and tallies.",
)
@config_option
def add(name: str, role: str, config_file: Path | None) -> None:
    """Add a user; the password is asked for, or read from standard input."""
    from ginnel.store.users import Role, User, put_user
    from ginnel.web.access.secrets import hash_password

    _check(name, "user")
    with _opened(config_file) as store:
        person = User(name=name, role=Role(role), password_hash=hash_password(_new_password()))
        put_user(store, person, new=True)
    click.echo(f"{name} may {role} now.")


@users.command()
@click.argument("name")
@config_option
def remove(name: str, config_file: Path | None) -> None:
    """Take a user and their tokens away; their sessions end at once."""
    from ginnel.store.users import has_users, remove_user

    with _opened(config_file) as store:
        remove_user(store, name)
        left = has_users(store)
    click.echo(f"{name} is gone." + ("" if left else " There are no users left."))


@users.command(name="list")
@config_option
def list_(config_file: Path | None) -> None:
    """List users with their roles and tokens."""
    from ginnel.store import users as known
    from ginnel.times import from_us

    with _opened(config_file) as store:
        people, shown = known.users(store), known.tokens(store)
    for person in people:
        click.echo(f"{person.name}  {person.role.value}")
        for token in shown:
            if token.user == person.name:
                click.echo(f"  token {token.label}, since {from_us(token.made_us):%Y-%m-%d}")
    if not people:
        click.echo("There are no users.")


@users.command()
@click.argument("name")
@config_option
def password(name: str, config_file: Path | None) -> None:
    """Give a user another password; their sessions end at once, their tokens stay."""
    from dataclasses import replace

    from ginnel.errors import StoreError
    from ginnel.store.users import put_user, user
    from ginnel.web.access.secrets import hash_password

    with _opened(config_file) as store:
        person = user(store, name)
        if person is None:
            raise StoreError(f"there is no user {name}: see `ginnel users list`")
        put_user(store, replace(person, password_hash=hash_password(_new_password())), new=False)
    click.echo(f"{name} has another password now.")


@users.command()
@click.argument("name")
@click.argument("label")
@click.option("--remove", "is_removed", is_flag=True, help="Take the token away instead.")
@config_option
def token(name: str, label: str, is_removed: bool, config_file: Path | None) -> None:
    """Make a token with which a program may do what the user may; it is shown once."""
    from ginnel.store.users import Token, put_token, remove_token
    from ginnel.times import to_us
    from ginnel.web.access.secrets import digest, new_token

    _check(label, "token")
    with _opened(config_file) as store:
        if is_removed:
            remove_token(store, name, label)
            click.echo(f"The token {label} of {name} is gone.")
            return
        text = new_token()
        made_us = to_us(datetime.now(UTC))
        put_token(store, Token(user=name, label=label, digest=digest(text), made_us=made_us))
    click.echo(text)
    click.echo("Keep it: it is not shown again. Programs send it as  Authorization: Bearer TOKEN", err=True)


def _opened(config_file: Path | None) -> Store:
    from ginnel.config import load_settings
    from ginnel.store import open_store

    return open_store(load_settings(config_file).store.url)


def _check(name: str, what: str) -> None:
    if not _NAME.fullmatch(name):
        raise click.UsageError(
            f"{name!r} cannot be the name of a {what}: letters, digits and . _ @ - only, 64 at most"
        )


def _new_password() -> str:
    from ginnel.errors import ConfigError
    from ginnel.web.access.secrets import SHORTEST

    if sys.stdin.isatty():
        text: str = click.prompt("Password", hide_input=True, confirmation_prompt=True)
    else:
        text = sys.stdin.readline().rstrip("\r\n")
    if len(text) < SHORTEST:
        raise ConfigError(f"a password needs at least {SHORTEST} characters")
    return text
