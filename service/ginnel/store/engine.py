"""Opening a store, and the two ways to talk to it: reading and writing."""

from __future__ import annotations

import sqlite3
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from types import TracebackType
from typing import Any, Self

from sqlalchemy import Connection, Engine, create_engine, event
from sqlalchemy.engine import URL, make_url
from sqlalchemy.exc import ArgumentError, DBAPIError, NoSuchModuleError
from sqlalchemy.pool import NullPool, QueuePool

from ginnel.errors import StoreBusyError, StoreDamagedError, StoreError, StoreFullError

BUSY_TIMEOUT_S = 10.0
_IMMEDIATE = "ginnel_immediate"
#: SQLSTATE of PostgreSQL: no room; broken data, broken index.
_DISK_FULL, _DAMAGED = "53100", ("XX001", "XX002")


class Store:
    """A log that is open. Safe to share between threads; close it when done.

    `reading` and `writing` give one transaction each. There is one writer at a time: SQLite makes
    a second one wait up to ten seconds, then `StoreBusyError`.
    """

    def __init__(self, engine: Engine, *, read_only: bool = False) -> None:
        self._engine = engine
        self.read_only = read_only

    @property
    def name(self) -> str:
        """Where the store is, fit for messages (no password)."""
        return shown(self._engine.url)

    @property
    def dialect(self) -> str:
        """``sqlite`` or ``postgresql``."""
        return self._engine.dialect.name

    @contextmanager
    def reading(self) -> Iterator[Connection]:
        """One consistent view of the store."""
        with translated(self._engine.url), self._engine.connect() as connection:
            if self.dialect == "postgresql":
                connection = connection.execution_options(
                    isolation_level="REPEATABLE READ", postgresql_readonly=True
                )
            yield connection

    @contextmanager
    def writing(self) -> Iterator[Connection]:
        """One transaction, kept whole or not at all."""
        if self.read_only:
            raise StoreError(f"{self.name} is open for reading only")
        with translated(self._engine.url), self._engine.connect() as connection:
            connection = connection.execution_options(**{_IMMEDIATE: True})
            with connection.begin():
                yield connection

    def close(self) -> None:
        """Let go of the database; harmless when repeated."""
        self._engine.dispose()

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        self.close()


def open_store(url: str, *, create: bool = False, read_only: bool = False) -> Store:
    """Open the store at a database URL.

    Parameters
    ----------
    url : ``sqlite:///ginnel.db`` or ``postgresql+psycopg://user@host/name``
    create : make the tables of an empty store, and a SQLite file that is not there
    read_only : refuse to write

    Raises
    ------
    SchemaMismatchError
        The store was made by an older or a newer Ginnel, or has no tables yet.
    StoreError
        It cannot be opened; the message says why.
    """
    from ginnel.store import schema

    if create and schema.current(url, create=True) is None:
        schema.upgrade(url)
    store = Store(make_engine(url, read_only=read_only), read_only=read_only)
    try:
        schema.check(store)
    except BaseException:
        store.close()
        raise
    return store


def make_engine(url: str, *, create: bool = False, read_only: bool = False) -> Engine:
    """Engine for a database URL, set up as the log needs it. Nothing is connected yet."""
    parsed = _parsed(url)
    if parsed.get_backend_name() == "postgresql":
        try:
            # yield_per streams; statements are few, so a small pool serves web and writer
            return create_engine(parsed, pool_pre_ping=True, pool_size=5)
        except ModuleNotFoundError as error:
            raise StoreError(
                f"{shown(parsed)} needs the PostgreSQL driver: pip install 'psycopg[binary]'"
            ) from error
    path = _checked_file(parsed, create=create)
    # The file is opened by name, not by URI: a name may hold any character.
    mode = "ro" if read_only else "rwc" if create else "rw"
    # A writer keeps a connection: when the last one closes, SQLite copies the log of writes into the file
    # and removes it, which would wear a flash card with every commit. A reader keeps none, so that it sees
    # a store that was restored meanwhile.
    pool: dict[str, Any] = {"poolclass": NullPool} if read_only else {"poolclass": QueuePool, "pool_size": 1}
    engine = create_engine(
        URL.create("sqlite+pysqlite", database=str(path)), creator=lambda: _connected(path, mode), **pool
    )
    event.listen(engine, "begin", _begin)
    return engine


def shown(url: URL) -> str:
    """Name a database URL without its password, a SQLite file by its path."""
    if url.get_backend_name() == "sqlite" and url.database:
        return url.database
    return url.render_as_string(hide_password=True)


@contextmanager
def translated(url: URL) -> Iterator[None]:
    """Turn the database's errors into ours, one clear line each."""
    try:
        yield
    except (DBAPIError, sqlite3.Error) as error:
        cause = error.orig if isinstance(error, DBAPIError) else error
        text = " ".join(str(cause).split())
        if "is locked" in text or "database is busy" in text:
            raise StoreBusyError(f"{shown(url)} is in use by another writer: try again") from error
        if "unable to open database file" in text or "readonly database" in text:
            raise StoreError(
                f"{shown(url)} cannot be opened: SQLite keeps files of its own beside it, so make both the "
                f"store and its folder writable for this user"
            ) from error
        sqlstate = getattr(cause, "sqlstate", None)
        if "disk is full" in text or sqlstate == _DISK_FULL:
            raise StoreFullError(
                f"{shown(url)}: the disk is full: make room on it, then try again"
            ) from error
        if "malformed" in text or sqlstate in _DAMAGED:
            raise StoreDamagedError(
                f"{shown(url)} is damaged ({text}): stop Ginnel, then take the last backup with "
                "`ginnel store restore`"
            ) from error
        if "not a database" in text:
            raise StoreError(f"{shown(url)} is not a Ginnel store (not a SQLite database)") from error
        if isinstance(error, DBAPIError) and url.get_backend_name() == "postgresql" and _lost(error):
            raise StoreBusyError(f"{shown(url)} cannot be reached: {text}") from error
        raise StoreError(f"{shown(url)}: {text}") from error


def _lost(error: DBAPIError) -> bool:
    # no SQLSTATE: the server never answered
    return error.connection_invalidated or getattr(error.orig, "sqlstate", None) is None


def _parsed(url: str) -> URL:
    try:
        parsed = make_url(url)
        if parsed.drivername == "postgresql":
            parsed = parsed.set(drivername="postgresql+psycopg")
        backend = parsed.get_backend_name()
    except (ArgumentError, NoSuchModuleError) as error:
        raise StoreError(f"{url!r} is no database URL: write sqlite:///ginnel.db, for example") from error
    if backend not in ("sqlite", "postgresql"):
        raise StoreError(f"{shown(parsed)}: a store is sqlite:///FILE or postgresql+psycopg://USER@HOST/NAME")
    return parsed


def _checked_file(url: URL, *, create: bool) -> Path:
    if not url.database or url.database == ":memory:":
        raise StoreError("a store in memory would be lost: write sqlite:///ginnel.db, for example")
    path = Path(url.database)
    if not path.parent.is_dir():
        raise StoreError(f"{path}: there is no folder {path.parent}: make it first")
    if path.is_dir():
        raise StoreError(f"{path} is a folder, not a store")
    if not create and not path.exists():
        raise StoreError(
            f"there is no store at {path}: make one with `ginnel init` or `ginnel store upgrade`"
        )
    return path


def _connected(path: Path, mode: str) -> sqlite3.Connection:
    connection = sqlite3.connect(
        f"{path.absolute().as_uri()}?mode={mode}",
        uri=True,
        timeout=BUSY_TIMEOUT_S,
        isolation_level=None,  # the driver would begin transactions late; `_begin` does it
        check_same_thread=False,
    )
    try:
        connection.execute("PRAGMA foreign_keys = ON")
        if mode != "ro":
            connection.execute("PRAGMA journal_mode = WAL")
            connection.execute("PRAGMA synchronous = FULL")  # a power cut loses nothing committed
    except BaseException:
        connection.close()
        raise
    return connection


def _begin(connection: Connection) -> None:
    # IMMEDIATE takes the write lock at once: a reader that turns writer could not be made to wait
    options: Any = connection.get_execution_options()
    connection.exec_driver_sql("BEGIN IMMEDIATE" if options.get(_IMMEDIATE) else "BEGIN")
