"""Backups of real stores: what is in them, when they are refused, how one is taken back."""

from __future__ import annotations

import sqlite3
import subprocess
import threading
from contextlib import closing
from pathlib import Path

import pytest
from sqlalchemy import make_url

from ginnel.errors import StoreDamagedError, StoreError
from ginnel.store import (
    Store,
    back_up,
    backup,
    backups,
    find_faults,
    iter_passages,
    open_store,
    postgresql_restore_command,
    prune_backups,
    record_span,
    restore_sqlite,
)
from ginnel.words import Direction, Passage, Sensor, Span

S = 1_000_000
DAY_US = 86_400 * S
T0 = 1_772_442_000 * S  # 2026-03-02T09:00:00Z
NORTH = Sensor(name="north")

pytestmark = pytest.mark.usefixtures("postgres_programs")


def fill(store: Store, first: int, n: int) -> None:
    passages = [
        Passage(
            started_us=T0 + i * S,
            crossed_us=T0 + i * S,
            ended_us=T0 + i * S,
            direction=Direction.APPROACHING,
            direction_confidence=None,
            speed_mps=1.0,
            speed_se_mps=None,
            snr_db=None,
        )
        for i in range(first, first + n)
    ]
    span = Span(started_us=T0 + first * S, ended_us=T0 + (first + n) * S, sample_rate_hz=8000.0)
    record_span(store, NORTH, span, passages, "1")


def crossings(url: str) -> list[int]:
    with open_store(url, read_only=True) as store:
        return [(one.passage.crossed_us - T0) // S for one in iter_passages(store)]


def test_a_backup_holds_what_the_store_held(store: Store, store_url: str, tmp_path: Path) -> None:
    fill(store, 0, 50)
    made = back_up(store_url, tmp_path / "copies", T0)
    assert backups(tmp_path / "copies") == [made]
    assert made.path.name.startswith("ginnel-20260302T090000Z.")
    assert made.size_bytes == made.path.stat().st_size > 0
    assert made.path.stat().st_mode & 0o077 == 0
    assert [one.name for one in (tmp_path / "copies").iterdir()] == [made.path.name]


def test_a_backup_taken_back_is_the_log_of_that_moment(store: Store, store_url: str, tmp_path: Path) -> None:
    fill(store, 0, 50)
    made = back_up(store_url, tmp_path, T0)
    fill(store, 50, 10)
    store.close()
    if store.dialect == "sqlite":
        aside = restore_sqlite(store_url, made.path, T0 + S)
        assert aside == tmp_path / "ginnel.db.replaced-20260302T090001Z"
        assert crossings(f"sqlite:///{aside}") == list(range(60))
    else:
        command = postgresql_restore_command(store_url, made.path)
        subprocess.run(command.split(), check=True, capture_output=True)
    assert crossings(store_url) == list(range(50))


def test_a_backup_is_one_moment_while_others_write(store: Store, store_url: str, tmp_path: Path) -> None:
    fill(store, 0, 10)
    go_on = threading.Event()

    def write() -> None:
        first = 10
        while not go_on.is_set():
            fill(store, first, 10)
            first += 10

    writer = threading.Thread(target=write)
    writer.start()
    try:
        made = back_up(store_url, tmp_path / "copies", T0)
    finally:
        go_on.set()
        writer.join()
    if store.dialect == "sqlite":  # a dump is not a store that can be opened
        found = crossings(f"sqlite:///{made.path}")
        assert found == list(range(len(found)))
        assert len(found) % 10 == 0


@pytest.fixture
def sqlite_url(tmp_path: Path) -> str:
    url = f"sqlite:///{tmp_path / 'ginnel.db'}"
    with open_store(url, create=True) as store:
        fill(store, 0, 2000)
    return url


def damage(url: str) -> Path:
    """Overwrite a piece of a store, as a dying flash card does."""
    path = Path(make_url(url).database or "")
    with closing(sqlite3.connect(path)) as connection:
        connection.execute("PRAGMA wal_checkpoint(TRUNCATE)")
    whole = bytearray(path.read_bytes())
    whole[-65536:-32768] = b"\xa5" * 32768  # where the passages are
    path.write_bytes(whole)
    return path


def test_a_damaged_store_gives_no_backup_and_names_the_command(sqlite_url: str, tmp_path: Path) -> None:
    damage(sqlite_url)
    with pytest.raises(StoreDamagedError):
        back_up(sqlite_url, tmp_path / "copies", T0)
    assert list((tmp_path / "copies").iterdir()) == []
    with pytest.raises(StoreDamagedError, match="`ginnel store restore`"), open_store(sqlite_url) as store:
        list(iter_passages(store))
    with open_store(sqlite_url) as store:
        assert find_faults(store)


def test_a_row_that_its_table_forbids_is_told(sqlite_url: str) -> None:
    with closing(sqlite3.connect(make_url(sqlite_url).database or "")) as careless:
        careless.execute("PRAGMA ignore_check_constraints = ON")
        careless.execute("UPDATE span SET ended_us = started_us - 1")
        careless.commit()
    with open_store(sqlite_url) as store:
        assert find_faults(store) == ["CHECK constraint failed in span"]


def test_a_damaged_store_is_put_back_whole(sqlite_url: str, tmp_path: Path) -> None:
    made = back_up(sqlite_url, tmp_path / "copies", T0)
    path = damage(sqlite_url)
    broken = path.read_bytes()
    aside = restore_sqlite(sqlite_url, made.path, T0 + S)
    assert aside is not None
    assert aside.read_bytes() == broken
    assert crossings(sqlite_url) == list(range(2000))


def test_a_damaged_backup_is_not_put_back(sqlite_url: str, tmp_path: Path) -> None:
    made = back_up(sqlite_url, tmp_path / "copies", T0)
    damage(f"sqlite:///{made.path}")
    with pytest.raises(StoreDamagedError, match="no sound copy"):
        restore_sqlite(sqlite_url, made.path, T0 + S)
    assert crossings(sqlite_url) == list(range(2000))


def test_a_store_that_is_gone_is_restored_too(sqlite_url: str, tmp_path: Path) -> None:
    made = back_up(sqlite_url, tmp_path / "copies", T0)
    for part in tmp_path.glob("ginnel.db*"):
        part.unlink()
    assert restore_sqlite(sqlite_url, made.path, T0 + S) is None
    assert crossings(sqlite_url) == list(range(2000))


def test_a_folder_that_cannot_be_made_is_named(sqlite_url: str, tmp_path: Path) -> None:
    (tmp_path / "file").touch()
    with pytest.raises(StoreError, match=r"no backup can be made in .*file/copies: Not a directory"):
        back_up(sqlite_url, tmp_path / "file" / "copies", T0)


def test_a_missing_program_is_told(
    tmp_path: Path, postgres_url: str, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("PATH", str(tmp_path))
    monkeypatch.setattr(backup, "_POSTGRESQL", tmp_path)
    with pytest.raises(StoreError, match=r"needs pg_dump: apt install postgresql-client"):
        backup._program("pg_dump")


def test_old_backups_go_the_newest_never(sqlite_url: str, tmp_path: Path) -> None:
    folder = tmp_path / "copies"
    for day in (0, 1, 2, 9):
        back_up(sqlite_url, folder, T0 + day * DAY_US)
    (folder / "notes.txt").touch()
    assert len(prune_backups(folder, 7, T0 + 8 * DAY_US + 1)) == 2
    assert [(one.made_us - T0) // DAY_US for one in backups(folder)] == [2, 9]
    assert len(prune_backups(folder, 7, T0 + 99 * DAY_US)) == 1
    assert [(one.made_us - T0) // DAY_US for one in backups(folder)] == [9]
    assert (folder / "notes.txt").exists()
    assert backups(tmp_path / "nowhere") == []
