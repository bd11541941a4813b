"""A disk that is really full: a file system of a few megabytes, made for the test (root only)."""

from __future__ import annotations

import os
import subprocess
import threading
from collections.abc import Iterator
from pathlib import Path

import pytest
from sqlalchemy import text

from ginnel.clock import ClockReading
from ginnel.config import BackupSettings, RetentionSettings, SensorSettings, Settings, StoreSettings
from ginnel.daemon import upkeep
from ginnel.daemon.health import Gauge
from ginnel.daemon.jobs import Housekeeping
from ginnel.errors import StoreFullError
from ginnel.store import (
    Store,
    back_up,
    backups,
    find_faults,
    iter_health,
    open_conditions,
    open_store,
    put_sensor,
    record_span,
)
from ginnel.words import Direction, Passage, Sensor, Span

S = 1_000_000
HOUR_US = 3600 * S
T0 = 1_772_442_000 * S  # 2026-03-02T09:00:00Z
NORTH = Sensor(name="north")
DISK_BYTES = 24_000_000


class SetClock:
    """A clock that shows what it is set to."""

    def __init__(self, wall_us: int) -> None:
        self.wall_us = wall_us

    def read(self) -> ClockReading:
        return ClockReading(wall_us=self.wall_us, steady_us=0, asleep_us=0, is_set=True)

    def wait(self, event: threading.Event, seconds: float) -> bool:
        return event.wait(seconds)


@pytest.fixture
def disk(tmp_path: Path) -> Iterator[Path]:
    """Folder on a small file system of its own."""
    folder = tmp_path / "disk"
    folder.mkdir()
    mount = ["mount", "-t", "tmpfs", "-o", f"size={DISK_BYTES}", "tmpfs", str(folder)]
    if os.geteuid() != 0 or subprocess.run(mount, capture_output=True, check=False).returncode:
        pytest.skip("only root may make a small file system")
    try:
        yield folder
    finally:
        subprocess.run(["umount", str(folder)], check=True)


def fill(store: Store, hour: int, n: int) -> None:
    at_us = T0 + hour * HOUR_US
    passages = [
        Passage(
            started_us=at_us + i * S,
            crossed_us=at_us + i * S,
            ended_us=at_us + i * S,
            direction=Direction.APPROACHING,
            direction_confidence=None,
            speed_mps=1.0 + i / 1000,
            speed_se_mps=None,
            snr_db=None,
        )
        for i in range(n)
    ]
    record_span(
        store, NORTH, Span(started_us=at_us, ended_us=at_us + HOUR_US, sample_rate_hz=8000.0), passages, "1"
    )


def ballast(folder: Path, leave_bytes: int) -> Path:
    """Fill the disk up to so many bytes."""
    path = folder / "ballast"
    free = os.statvfs(folder).f_bavail * os.statvfs(folder).f_frsize
    path.write_bytes(b"x" * max(0, free - leave_bytes))
    return path


def n_stale(store: Store) -> int:
    with store.reading() as connection:
        return int(connection.execute(text("SELECT count(*) FROM hour_stale")).scalar_one())


def test_a_full_disk_is_told_survived_and_forgotten(disk: Path) -> None:
    """Evidence goes first, then older backups, then roll-ups wait and it is said; with room all is well."""
    url = f"sqlite:///{disk / 'ginnel.db'}"
    settings = Settings(
        store=StoreSettings(url=url),
        retention=RetentionSettings(keep_free_mb=10),
        backup=BackupSettings(folder=str(disk / "backups")),
        sensor=(SensorSettings(name="north"),),
    )
    evidence = disk / "evidence"
    evidence.write_bytes(b"x" * 3_000_000)

    def prune_evidence(wanted: int) -> int:
        freed = evidence.stat().st_size if evidence.exists() else 0
        evidence.unlink(missing_ok=True)
        return freed

    clock = SetClock(T0 + 9 * HOUR_US)
    gauge = Gauge(NORTH, is_steady=False)
    house = Housekeeping(lambda: settings, clock, lambda: [gauge], lambda: None, prune_evidence)

    def kinds(store: Store) -> set[str]:
        return {one.kind for one in open_conditions(store)}

    with open_store(url, create=True) as store:
        put_sensor(store, NORTH)
        fill(store, 0, 500)
        for day in range(3):
            back_up(url, disk / "backups", T0 + day * 24 * HOUR_US)
        house.take_minute()
        assert evidence.exists()
        assert kinds(store) == set()

        heavy = ballast(disk, 8_000_000)
        house.take_minute()
        assert not evidence.exists()
        assert len(backups(disk / "backups")) == 3
        assert kinds(store) == set()  # there is room again

        heavy.unlink()
        heavy = ballast(disk, 1_000_000)
        clock.wall_us += 60 * S
        house.take_minute()
        assert len(backups(disk / "backups")) == 1
        assert kinds(store) == {"disk-nearly-full", "disk-full"}
        house.keep_house()
        assert n_stale(store) == 1

        rest = disk / "rest"
        rest.write_bytes(b"x" * (os.statvfs(disk).f_bavail * os.statvfs(disk).f_frsize))
        with pytest.raises(StoreFullError, match="the disk is full: make room on it"):
            fill(store, 1, 3000)
        clock.wall_us += 60 * S
        house.take_minute()  # nothing can be stored, and nothing breaks

        rest.unlink()
        heavy.unlink()
        for _ in range(2):
            clock.wall_us += 60 * S
            house.take_minute()
        assert kinds(store) == set()
        house.close()
        assert len(list(iter_health(store, "north"))) == 5  # what could not be stored waited
        house.keep_house()
        assert n_stale(store) == 0
        assert find_faults(store) == []


def test_a_backup_without_room_leaves_nothing_behind(disk: Path) -> None:
    url = f"sqlite:///{disk / 'ginnel.db'}"
    with open_store(url, create=True) as store:
        for hour in range(20):
            fill(store, hour, 500)
    ballast(disk, 100_000)
    with pytest.raises(StoreFullError, match=r"no room for a backup in .*: it takes .* MB, 0 MB are free"):
        back_up(url, disk / "backups", T0)
    assert list((disk / "backups").iterdir()) == []
    assert upkeep.has_room(disk, RetentionSettings(keep_free_mb=10)) is False
