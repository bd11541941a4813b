"""Opening a store: each thing that can be wrong with it has one clear line."""

from __future__ import annotations

import os
import sqlite3
import sys
from pathlib import Path

import pytest
from sqlalchemy import make_url, text

from ginnel.errors import StoreBusyError, StoreError
from ginnel.store import Store, engine, open_store, put_site, site
from ginnel.words import Site


def test_a_missing_file_is_not_made_by_accident(tmp_path: Path) -> None:
    path = tmp_path / "ginnel.db"
    with pytest.raises(StoreError, match=r"there is no store at .*ginnel\.db: make one with `ginnel init`"):
        open_store(f"sqlite:///{path}")
    assert not path.exists()


def test_a_missing_folder_is_named(tmp_path: Path) -> None:
    with pytest.raises(StoreError, match=r"there is no folder .*nowhere: make it first"):
        open_store(f"sqlite:///{tmp_path / 'nowhere' / 'ginnel.db'}", create=True)


def test_a_file_that_is_no_database_is_left_alone(tmp_path: Path) -> None:
    path = tmp_path / "letter.db"
    path.write_text("Dear reader, " * 100)
    with pytest.raises(StoreError, match=r"letter\.db is not a Ginnel store \(not a SQLite database\)"):
        open_store(f"sqlite:///{path}", create=True)
    assert path.read_text() == "Dear reader, " * 100


def test_a_folder_is_no_store(tmp_path: Path) -> None:
    with pytest.raises(StoreError, match="is a folder, not a store"):
        open_store(f"sqlite:///{tmp_path}", create=True)


@pytest.mark.parametrize("url", ["ginnel.db", "mysql+nothing://x/y", "oracle://x/y", ""])
def test_what_is_no_database_url_is_told(url: str) -> None:
    with pytest.raises(StoreError, match=r"database URL|a store is"):
        open_store(url)


def test_a_store_in_memory_is_refused() -> None:
    for url in ("sqlite://", "sqlite:///:memory:"):
        with pytest.raises(StoreError, match="would be lost"):
            open_store(url, create=True)


def test_a_server_that_is_not_there_is_told_without_the_password(tmp_path: Path) -> None:
    url = f"postgresql://someone:sesame@/ginnel?host={tmp_path}"
    with pytest.raises(StoreBusyError, match="cannot be reached") as caught:
        open_store(url)
    assert "sesame" not in str(caught.value)
    assert "\n" not in str(caught.value)


def test_a_missing_driver_is_told(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "psycopg", None)
    with pytest.raises(StoreError, match=r"pip install 'psycopg\[binary\]'"):
        open_store("postgresql://someone@/ginnel")


def test_sqlite_is_set_up_for_a_log(tmp_path: Path) -> None:
    with open_store(f"sqlite:///{tmp_path / 'ginnel.db'}", create=True) as store:
        with store.reading() as connection:
            told = {
                name: connection.execute(text(f"PRAGMA {name}")).scalar()
                for name in ("journal_mode", "foreign_keys", "synchronous", "busy_timeout")
            }
        assert told == {"journal_mode": "wal", "foreign_keys": 1, "synchronous": 2, "busy_timeout": 10_000}


def test_foreign_keys_hold(store: Store) -> None:
    with pytest.raises(StoreError, match=r"(?i)foreign key"), store.writing() as connection:
        connection.execute(
            text(
                "INSERT INTO span "
                "(sensor_id, reading_id, started_us, ended_us, sample_rate_hz, clock_trusted) "
                "VALUES (1, 1, 0, 1, 8000, TRUE)"
            )
        )


def test_one_reading_sees_one_state_of_the_log(store: Store) -> None:
    count = text("SELECT count(*) FROM site")
    with store.reading() as connection:
        assert connection.execute(count).scalar() == 0
        put_site(store, Site(name="x"))
        assert connection.execute(count).scalar() == 0
    assert site(store) == Site(name="x")


def test_a_failure_half_way_takes_all_back(store: Store) -> None:
    def half_way() -> None:
        with store.writing() as connection:
            connection.execute(text("INSERT INTO site (id, name, timezone) VALUES (1, 'x', 'UTC')"))
            raise RuntimeError("half way")

    with pytest.raises(RuntimeError, match="half way"):
        half_way()
    assert site(store) is None


def test_a_second_writer_is_told_that_the_store_is_busy(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(engine, "BUSY_TIMEOUT_S", 0.0)
    url = f"sqlite:///{tmp_path / 'ginnel.db'}"
    with open_store(url, create=True) as one, open_store(url) as two, one.writing():
        assert site(two) is None  # readers are not kept out
        with pytest.raises(StoreBusyError, match="in use by another writer: try again"):
            put_site(two, Site(name="x"))


@pytest.mark.skipif(os.geteuid() == 0, reason="root may write anywhere")
def test_a_read_only_file_can_be_read(tmp_path: Path) -> None:
    path = tmp_path / "ginnel.db"
    open_store(f"sqlite:///{path}", create=True).close()
    path.chmod(0o444)
    with open_store(f"sqlite:///{path}", read_only=True) as store:
        assert site(store) is None


def test_a_name_with_odd_characters_is_a_file_name(tmp_path: Path) -> None:
    path = tmp_path / "the log #1 & é.db"
    with open_store(f"sqlite:///{path}", create=True) as store:
        put_site(store, Site(name="odd"))
    plain = sqlite3.connect(path)
    assert plain.execute("SELECT name FROM site").fetchone() == ("odd",)
    plain.close()


@pytest.mark.parametrize(
    ("said", "told"),
    [
        # what SQLite 3.40 says on a file system mounted read-only, and on a full one (tried by hand)
        ("unable to open database file", "make both the store and its folder writable"),
        ("attempt to write a readonly database", "make both the store and its folder writable"),
        ("database or disk is full", "the disk is full: make room on it"),
    ],
)
def test_what_the_disk_refuses_is_told_with_the_mend(said: str, told: str) -> None:
    url = make_url("sqlite:////var/lib/ginnel/ginnel.db")
    with pytest.raises(StoreError, match=told) as caught, engine.translated(url):
        raise sqlite3.OperationalError(said)
    assert str(caught.value).startswith("/var/lib/ginnel/ginnel.db")


def overfill(store: Store) -> None:
    with store.writing() as connection:
        connection.execute(text("PRAGMA max_page_count = 1"))  # SQLite makes it what the file has already
        connection.execute(text("CREATE TABLE big AS SELECT zeroblob(100000) AS zeros"))


def test_a_store_that_may_not_grow_says_that_the_disk_is_full(tmp_path: Path) -> None:
    url = f"sqlite:///{tmp_path / 'ginnel.db'}"
    with open_store(url, create=True) as store, pytest.raises(StoreError, match="the disk is full"):
        overfill(store)
