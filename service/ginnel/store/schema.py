"""Bringing a store's tables up to date, and saying when they are not.

The migrations are Alembic's, in ``migrations/`` beside the source, or inside the package when it
was installed from a wheel. Alembic itself is loaded only to migrate.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from sqlalchemy import Connection, inspect, text

from ginnel.errors import SchemaMismatchError, StoreError
from ginnel.store.engine import Store, make_engine, shown, translated

if TYPE_CHECKING:
    from alembic.config import Config

#: The revision that this version of Ginnel reads and writes. Revisions are numbered, so order tells age.
HEAD = "0005"

_LOCK = 0x67696E6E  # any fixed number: two upgrades of one PostgreSQL store take turns


def migrations_dir() -> Path:
    """Where the migrations are, in a checkout and in an installed wheel."""
    package = Path(__file__).resolve().parents[1]
    for folder in (package / "migrations", package.parents[1] / "migrations"):
        if (folder / "env.py").is_file():
            return folder
    raise StoreError(f"the migrations are missing from {package}: install Ginnel again")


def alembic_config() -> Config:
    """Alembic's settings for our migrations, without a database."""
    from alembic.config import Config

    config = Config()
    config.set_main_option("script_location", str(migrations_dir()).replace("%", "%%"))
    config.set_main_option("path_separator", "os")
    return config


def upgrade(url: str, revision: str = "head") -> None:
    """Bring the store at a URL up to date, in one transaction; makes a missing SQLite file."""
    _migrate(url, revision, down=False)


def downgrade(url: str, revision: str) -> None:
    """Take the store at a URL back to an older revision, or to ``base``: no tables, no data."""
    _migrate(url, revision, down=True)


def current(url: str, *, create: bool = False) -> str | None:
    """Revision of the store at a URL; None where it has no tables yet."""
    engine = make_engine(url, create=create)
    try:
        with translated(engine.url), engine.connect() as connection:
            return _revision(connection)
    finally:
        engine.dispose()


def check(store: Store) -> None:
    """Refuse a store that this version cannot read.

    Raises
    ------
    SchemaMismatchError
        It has no tables, or was made by an older or a newer Ginnel.
    """
    with store.reading() as connection:
        revision = _revision(connection)
    if revision is None:
        raise SchemaMismatchError(f"{store.name} has no tables yet: run `ginnel store upgrade`")
    if revision < HEAD:
        raise SchemaMismatchError(
            f"{store.name} was made by an older Ginnel ({revision}, now {HEAD}): run `ginnel store upgrade`"
        )
    if revision > HEAD:
        raise SchemaMismatchError(
            f"{store.name} was made by a newer Ginnel ({revision}, this one knows {HEAD}): upgrade Ginnel"
        )


def _revision(connection: Connection) -> str | None:
    tables = inspect(connection).get_table_names()
    if "alembic_version" in tables:
        return connection.execute(text("SELECT version_num FROM alembic_version")).scalar_one_or_none()
    if tables:
        raise StoreError(
            f"{shown(connection.engine.url)} holds tables that are not Ginnel's: give it its own"
        )
    return None


def _migrate(url: str, revision: str, *, down: bool) -> None:
    from alembic import command
    from alembic.util import CommandError

    engine = make_engine(url, create=not down)
    config = alembic_config()
    try:
        with translated(engine.url), engine.connect() as connection:
            sqlite = connection.dialect.name == "sqlite"
            if sqlite:
                # A changed table is copied and dropped, which must not cascade. SQLite ignores
                # this inside a transaction, so it is said to the driver before one begins.
                raw = connection.connection.dbapi_connection
                assert raw is not None  # noqa: S101 (just connected)
                raw.cursor().execute("PRAGMA foreign_keys = OFF")
            connection = connection.execution_options(ginnel_immediate=True)
            with connection.begin():
                _revision(connection)
                if not sqlite:
                    connection.execute(text("SELECT pg_advisory_xact_lock(:key)"), {"key": _LOCK})
                config.attributes["connection"] = connection
                (command.downgrade if down else command.upgrade)(config, revision)
                if sqlite and (broken := connection.exec_driver_sql("PRAGMA foreign_key_check").first()):
                    raise StoreError(f"{shown(engine.url)}: rows of {broken[0]} refer to missing {broken[2]}")
    except CommandError as error:
        raise SchemaMismatchError(
            f"{shown(engine.url)} is at a revision that this Ginnel does not know: upgrade Ginnel ({error})"
        ) from error
    finally:
        engine.dispose()
