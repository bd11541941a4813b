"""Copies of a store, each checked before it counts, and one of them taken back.

SQLite copies itself with its online backup, one consistent moment while others go on writing;
PostgreSQL is dumped by its own `pg_dump`. A copy gets its name only once it has been read through.
"""

from __future__ import annotations

import os
import shutil
import sqlite3
import subprocess
from collections.abc import Mapping
from contextlib import closing, suppress
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

from sqlalchemy import text
from sqlalchemy.engine import URL, make_url

from ginnel.errors import StoreDamagedError, StoreError, StoreFullError
from ginnel.store.engine import open_store, shown
from ginnel.times import to_us, utc_text
from ginnel.words import US_PER_S

_DAY_US = 86_400 * US_PER_S
#: Where Debian keeps PostgreSQL's programs, each version apart.
_POSTGRESQL = Path("/usr/lib/postgresql")
_SUFFIXES = {"sqlite": ".db", "postgresql": ".pgdump"}


@dataclass(frozen=True, slots=True, kw_only=True, order=True)
class Backup:
    """One checked copy."""

    made_us: int
    path: Path
    size_bytes: int


def back_up(url: str, folder: Path, now_us: int) -> Backup:
    """Copy the store at a URL into a folder, and check the copy.

    Raises
    ------
    StoreFullError
        The folder's disk has no room for it.
    StoreDamagedError
        The copy is not sound, so neither is the store.
    StoreError
        It cannot be copied; the message says why. Nothing is left behind.
    """
    parsed = make_url(url)
    backend = parsed.get_backend_name()
    target = folder / f"ginnel-{_name_of(now_us)}{_SUFFIXES[backend]}"
    unchecked = target.with_suffix(target.suffix + ".part")
    try:
        folder.mkdir(parents=True, exist_ok=True)
        # a log tells who was where when: nobody else's business
        unchecked.touch(mode=0o600)
        (_copy_sqlite if backend == "sqlite" else _dump_postgresql)(parsed, unchecked)
        with unchecked.open("rb") as file:
            os.fsync(file.fileno())
        unchecked.replace(target)
    except OSError as error:
        raise StoreError(f"no backup can be made in {folder}: {error.strerror or error}") from error
    finally:
        with suppress(OSError):
            unchecked.unlink(missing_ok=True)
    return Backup(made_us=now_us, path=target, size_bytes=target.stat().st_size)


def backups(folder: Path) -> list[Backup]:
    """Backups in a folder, the oldest first."""
    found = []
    for path in folder.glob("ginnel-*"):
        made_us = _time_of(path)
        if made_us is not None:
            found.append(Backup(made_us=made_us, path=path, size_bytes=path.stat().st_size))
    return sorted(found)


def prune_backups(folder: Path, keep_days: int, now_us: int) -> list[Backup]:
    """Remove backups older than so many days, never the newest; gives those removed."""
    old = [one for one in backups(folder)[:-1] if one.made_us < now_us - keep_days * _DAY_US]
    for one in old:
        one.path.unlink()
    return old


def restore_sqlite(url: str, backup: Path, now_us: int) -> Path | None:
    """Put a backup in the store's place; gives where the old store is now, None where there was none.

    Nothing is lost: the old files are renamed, not removed.

    Raises
    ------
    StoreError
        The backup is not sound, or files cannot be moved.
    """
    path = Path(make_url(url).database or "")
    _check_sqlite(backup)
    fresh = path.with_name(f"{path.name}.restoring")
    aside = path.with_name(f"{path.name}.replaced-{_name_of(now_us)}")
    try:
        shutil.copyfile(backup, fresh)
        with fresh.open("rb") as file:
            os.fsync(file.fileno())
        had_one = path.exists()
        # what SQLite keeps beside a store belongs to that store alone
        for end in ("", "-wal", "-shm"):
            if (beside := path.with_name(path.name + end)).exists():
                beside.rename(aside.with_name(aside.name + end))
        fresh.replace(path)
    except OSError as error:
        fresh.unlink(missing_ok=True)
        raise StoreError(f"{path} cannot be restored: {error.strerror or error}") from error
    return aside if had_one else None


def postgresql_restore_command(url: str, backup: Path) -> str:
    """Give the command that puts a dump back into its database."""
    return f"pg_restore --clean --if-exists --single-transaction --dbname={_plain(make_url(url))} {backup}"


def _copy_sqlite(url: URL, target: Path) -> None:
    source = Path(url.database or "")
    open_store(f"sqlite:///{source}", read_only=True).close()  # refuses what is no store, with our words
    try:
        size_bytes = source.stat().st_size
        if (free := shutil.disk_usage(target.parent).free) < 1.05 * size_bytes:
            raise StoreFullError(
                f"no room for a backup in {target.parent}: it takes {size_bytes / 1e6:.0f} MB, "
                f"{free / 1e6:.0f} MB are free"
            )
        with (
            closing(sqlite3.connect(f"{source.absolute().as_uri()}?mode=ro", uri=True)) as one,
            closing(sqlite3.connect(target)) as two,
        ):
            # all pages at once are one moment of the store; readers hold up no writer
            one.backup(two)
            two.execute("PRAGMA journal_mode = DELETE")  # a copy is one file
    except sqlite3.Error as error:
        raise _copy_error(shown(url), error) from error
    _check_sqlite(target)


def _check_sqlite(path: Path) -> None:
    """Open a copy and read all of it."""
    try:
        with closing(sqlite3.connect(f"{path.absolute().as_uri()}?mode=ro&immutable=1", uri=True)) as copy:
            told = copy.execute("PRAGMA integrity_check(1)").fetchone()[0]
            copy.execute("SELECT version_num FROM alembic_version").fetchone()
    except sqlite3.Error as error:
        raise StoreDamagedError(f"{path} is no sound copy of a store: {error}") from error
    if told != "ok":
        raise StoreDamagedError(f"{path} is no sound copy of a store: {' '.join(told.split())}")


def _copy_error(name: str, error: sqlite3.Error) -> StoreError:
    if "malformed" in str(error) or "not a database" in str(error):
        return StoreDamagedError(
            f"{name} is damaged ({error}): take the last backup with `ginnel store restore`"
        )
    return StoreError(f"{name} cannot be copied: {error}")


def _dump_postgresql(url: URL, target: Path) -> None:
    with (
        open_store(url.render_as_string(hide_password=False), read_only=True) as store,
        store.reading() as now,
    ):
        schema = now.execute(text("SELECT current_schema()")).scalar_one()
    environment = {**os.environ, **({"PGPASSWORD": str(url.password)} if url.password else {})}
    _run(
        [_program("pg_dump"), "--format=custom", f'--schema="{schema}"', f"--file={target}", _plain(url)],
        environment,
    )
    _run([_program("pg_restore"), "--file=/dev/null", str(target)], environment)  # reads all of it


def _plain(url: URL) -> str:
    """URL as PostgreSQL's own programs take it, without the password."""
    # `set` would take None for no change
    bare = url.set(drivername="postgresql")._replace(password=None).difference_update_query(["options"])
    return bare.render_as_string(hide_password=False)


def _program(name: str) -> str:
    """One of PostgreSQL's programs: on the path, else the newest there is, as it knows older servers too."""
    places = sorted(_POSTGRESQL.glob("*/bin"), key=lambda place: -int(place.parent.name.partition(".")[0]))
    path = os.pathsep.join([os.environ.get("PATH", os.defpath), *map(str, places)])
    found = shutil.which(name, path=path)
    if found is None:
        raise StoreError(f"a backup of PostgreSQL needs {name}: apt install postgresql-client")
    return found


def _run(command: list[str], environment: Mapping[str, str]) -> None:
    done = subprocess.run(command, env=environment, capture_output=True, text=True, check=False)  # noqa: S603 (no shell)
    if done.returncode:
        told = " ".join(done.stderr.split()) or f"exit code {done.returncode}"
        raise StoreError(f"{Path(command[0]).name} failed: {told}")


def _name_of(moment_us: int) -> str:
    """Time as a file name holds it anywhere: 20260302T091504Z."""
    return utc_text(moment_us)[:19].replace("-", "").replace(":", "") + "Z"


def _time_of(path: Path) -> int | None:
    stem, _, suffix = path.name.removeprefix("ginnel-").partition(".")
    if f".{suffix}" not in _SUFFIXES.values():
        return None
    try:
        return to_us(datetime.strptime(stem, "%Y%m%dT%H%M%S%z"))
    except ValueError:
        return None
