"""The jobs of housekeeping on real stores: what they do, missed, doubled, without room, with a wild clock."""

from __future__ import annotations

import logging
import threading
from collections.abc import Callable
from datetime import UTC, datetime, time
from pathlib import Path

import numpy as np
import pytest
from sqlalchemy import text

from ginnel.clock import ClockReading
from ginnel.config import BackupSettings, RetentionSettings, SensorSettings, Settings, StoreSettings
from ginnel.config.sections import ListenSettings, SiteSettings
from ginnel.daemon import health as daemon_health
from ginnel.daemon import upkeep
from ginnel.daemon.health import Gauge
from ginnel.daemon.jobs import Housekeeping, start_jobs, watched_folder
from ginnel.daemon.minute import MinuteWatch
from ginnel.errors import StoreError
from ginnel.store import (
    JobRecord,
    LoggedHealth,
    Store,
    backups,
    hourly_counts,
    iter_health,
    iter_passages,
    job_records,
    open_conditions,
    open_store,
    put_health,
    put_sensor,
    record_span,
)
from ginnel.times import to_us
from ginnel.words import Block, Direction, HealthSample, Passage, Sensor, Span

S = 1_000_000
HOUR_US = 3600 * S
DAY_US = 24 * HOUR_US
T0 = 1_772_442_000 * S  # 2026-03-02T09:00:00Z
NORTH = Sensor(name="north")

pytestmark = pytest.mark.usefixtures("postgres_programs")


class SetClock:
    """A clock that shows what it is set to."""

    def __init__(self, wall_us: int, *, is_set: bool = True) -> None:
        self.wall_us, self.is_set = wall_us, is_set

    def read(self) -> ClockReading:
        return ClockReading(wall_us=self.wall_us, steady_us=0, asleep_us=0, is_set=self.is_set)

    def wait(self, event: threading.Event, seconds: float) -> bool:
        return event.wait(seconds)


def fill(store: Store, at_us: int = T0) -> None:
    span = Span(started_us=at_us, ended_us=at_us + HOUR_US, sample_rate_hz=8000.0)
    passage = Passage(
        started_us=at_us + S,
        crossed_us=at_us + 2 * S,
        ended_us=at_us + 3 * S,
        direction=Direction.APPROACHING,
        direction_confidence=None,
        speed_mps=1.0,
        speed_se_mps=None,
        snr_db=None,
    )
    record_span(store, NORTH, span, [passage], "1")


@pytest.fixture
def settings(store_url: str, tmp_path: Path) -> Settings:
    return Settings(
        site=SiteSettings(name="Tannery annex"),
        store=StoreSettings(url=store_url),
        listen=ListenSettings(state=str(tmp_path)),
        backup=BackupSettings(folder=str(tmp_path / "backups")),
        sensor=(SensorSettings(name="north"),),
    )


def n_stale(store: Store) -> int:
    with store.reading() as connection:
        return int(connection.execute(text("SELECT count(*) FROM hour_stale")).scalar_one())


def test_hours_are_rolled_up_once_they_have_settled(store: Store) -> None:
    fill(store)
    assert upkeep.roll_up(store, SetClock(T0 + HOUR_US + 119 * S)) is None
    assert upkeep.roll_up(store, SetClock(T0 + HOUR_US + 121 * S)) == "1 hours rolled up"
    assert upkeep.roll_up(store, SetClock(T0 + 9 * HOUR_US)) is None
    assert n_stale(store) == 0


def test_old_things_go_by_their_kind(store: Store) -> None:
    for day in (0, 50, 100):
        fill(store, T0 + day * DAY_US)
        put_health(store, [LoggedHealth(sensor="north", sample=HealthSample(at_us=T0 + day * DAY_US))])
    clock = SetClock(T0 + 101 * DAY_US)
    keep_all = RetentionSettings(health_days=0)
    assert upkeep.prune(store, clock, keep_all) == "nothing is old enough"
    told = upkeep.prune(store, clock, RetentionSettings(passages_days=80, health_days=20))
    assert told == "removed 1 passages, 2 health samples"
    assert len(list(iter_passages(store))) == 2
    assert len(list(iter_health(store, "north"))) == 1
    assert hourly_counts(store, "north", T0, T0 + DAY_US).count.tolist() == [1]


@pytest.mark.parametrize("clock", [SetClock(T0 + 9000 * DAY_US), SetClock(T0 + 99 * DAY_US, is_set=False)])
def test_a_wild_clock_empties_nothing(store: Store, clock: SetClock) -> None:
    fill(store)
    upkeep.prune(store, clock, RetentionSettings(passages_days=5, health_days=5, conditions_days=5))
    assert len(list(iter_passages(store))) == 1


def test_the_backup_of_the_night_is_made_and_old_ones_go(store: Store, settings: Settings) -> None:
    fill(store)
    for day in range(4):
        told = upkeep.back_up(
            settings.store.url,
            SetClock(T0 + day * DAY_US),
            settings.backup.model_copy(update={"keep_days": 2}),
        )
        assert told is not None
        assert told.endswith("checked")
    kept = [(one.made_us - T0) // DAY_US for one in backups(Path(settings.backup.folder))]
    assert kept == [1, 2, 3]
    none = settings.backup.model_copy(update={"keep_days": 0})
    assert upkeep.back_up(settings.store.url, SetClock(T0), none) is None


def test_faults_are_told(store: Store) -> None:
    fill(store)
    upkeep.roll_up(store, SetClock(T0 + 2 * HOUR_US))
    assert upkeep.look_for_faults(store, SetClock(T0 + 2 * HOUR_US)) == "no faults"
    with store.writing() as connection:
        connection.execute(text("UPDATE hour_listened SET listened_us = 5"))
    with pytest.raises(StoreError, match="1 faults in the store: north: the roll-up of 2026-03-02T09h"):
        upkeep.look_for_faults(store, SetClock(T0 + 2 * HOUR_US))


AT = time(2, 30)
TONIGHT = to_us(datetime(2026, 3, 2, 2, 30, tzinfo=UTC))


@pytest.mark.parametrize(
    ("now_us", "record", "expected"),
    [
        (TONIGHT + S, None, TONIGHT),
        (TONIGHT - S, None, TONIGHT - DAY_US),
        (TONIGHT + S, JobRecord(name="x", done_until_us=TONIGHT, ran_us=0, outcome="", failed=False), None),
        (
            TONIGHT + 5 * DAY_US,  # nights were missed: once makes up for all
            JobRecord(name="x", done_until_us=TONIGHT, ran_us=0, outcome="", failed=False),
            TONIGHT + 5 * DAY_US,
        ),
        (
            TONIGHT + HOUR_US,
            JobRecord(name="x", done_until_us=None, ran_us=TONIGHT + S, outcome="", failed=True),
            None,
        ),
        (
            TONIGHT + 7 * HOUR_US,
            JobRecord(name="x", done_until_us=None, ran_us=TONIGHT + S, outcome="", failed=True),
            TONIGHT,
        ),
    ],
)
def test_a_night_is_due_once(now_us: int, record: JobRecord | None, expected: int | None) -> None:
    assert upkeep.due_us(now_us, AT, record) == expected


@pytest.fixture
def disk(monkeypatch: pytest.MonkeyPatch) -> Callable[[int], None]:
    """Let the disk have so much free, as a full one cannot be had in every place where tests run."""
    free = [10_000_000_000]

    def disk_bytes(folder: Path) -> tuple[int, int]:
        return free[0], 30_000_000_000

    for module in (upkeep, daemon_health):
        monkeypatch.setattr(module, "disk_bytes", disk_bytes)

    def is_free(n_bytes: int) -> None:
        free[0] = n_bytes

    return is_free


def test_without_room_evidence_goes_first_then_older_backups_then_roll_ups_wait(
    store: Store, settings: Settings, disk: Callable[[int], None]
) -> None:
    fill(store)
    folder = Path(settings.backup.folder)
    for day in range(3):
        upkeep.back_up(settings.store.url, SetClock(T0 + day * DAY_US), settings.backup)
    asked: list[int] = []

    def prune_evidence(wanted: int) -> int:
        asked.append(wanted)
        disk(600_000_000)
        return 250_000_000

    def made_room(prune: Callable[[int], int] | None) -> str | None:
        return upkeep.make_room(folder, settings.retention, settings.backup, prune)

    assert made_room(prune_evidence) is None
    disk(350_000_000)
    assert made_room(prune_evidence) == "removed 250.0 MB of evidence to make room"
    assert asked == [150_000_000]
    assert len(backups(folder)) == 3
    disk(350_000_000)
    told = made_room(lambda wanted: 0)
    assert told is not None
    assert told.startswith("removed ginnel-20260302T090000Z.")
    assert [one.made_us for one in backups(folder)] == [T0 + 2 * DAY_US]
    assert made_room(None) is None

    clock = SetClock(T0 + 2 * HOUR_US)
    house = Housekeeping(lambda: settings, clock, lambda: [], lambda: None, None)
    disk(99_000_000)
    house.keep_house()
    assert (n_stale(store), job_records(store)) == (1, {})
    disk(101_000_000)
    house.keep_house()
    assert n_stale(store) == 0
    assert {name: one.failed for name, one in job_records(store).items()} == dict.fromkeys(
        ("backup", "check", "prune", "rollup", "tidy"), False
    )


def test_keeping_house_twice_does_nothing_twice(store: Store, settings: Settings) -> None:
    fill(store)
    clock = SetClock(T0 + 2 * HOUR_US)
    house = Housekeeping(lambda: settings, clock, lambda: [], lambda: None, None)
    house.keep_house()
    first = job_records(store)
    clock.wall_us += 600 * S
    house.keep_house()
    assert job_records(store) == first
    assert len(backups(Path(settings.backup.folder))) == 1
    clock.wall_us += DAY_US
    house.keep_house()
    assert len(backups(Path(settings.backup.folder))) == 2


def test_a_job_that_fails_is_told_and_keeps_no_other_from_running(
    store: Store, settings: Settings, tmp_path: Path
) -> None:
    (tmp_path / "file").touch()
    broken = settings.model_copy(update={"backup": BackupSettings(folder=str(tmp_path / "file" / "x"))})
    clock = SetClock(T0 + 2 * HOUR_US)
    put_sensor(store, NORTH)
    house = Housekeeping(lambda: broken, clock, lambda: [], lambda: None, None)
    house.keep_house()
    records = job_records(store)
    assert records["backup"].failed
    assert "no backup can be made in" in records["backup"].outcome
    assert not records["check"].failed
    house.take_minute()
    (raised,) = (one for one in open_conditions(store) if one.kind == "backup-failed")
    assert raised.sentence.startswith("The nightly backup failed: no backup can be made in")


def heard(gauge: Gauge, rms: float) -> None:
    samples = np.random.default_rng(1).normal(0, rms, 6 * 2000).astype(np.float32)
    gauge.heard(Block(started_us=0, sample_rate_hz=2000.0, samples=samples))


def test_a_dead_input_is_raised_stored_and_cleared(store: Store, settings: Settings) -> None:
    put_sensor(store, NORTH)
    clock = SetClock(T0)
    gauge = Gauge(NORTH)
    watch = MinuteWatch(lambda: settings, clock, lambda: [gauge], lambda: None, watched_folder(settings))
    kinds = []
    for rms in (0.0, 0.0, 0.0, 0.01, 0.01, 0.01):
        heard(gauge, rms)
        kinds.append([(one.kind, one.cleared_us) for one in watch.run(store)])
        clock.wall_us += 60 * S
    assert kinds == [[], [], [("input-dead", None)], [], [("input-dead", T0 + 240 * S)], []]
    assert open_conditions(store) == []
    watch.save(store)
    samples = list(iter_health(store, "north"))
    assert [one.at_us for one in samples] == [T0 + 60 * S * i for i in range(6)]
    assert samples[0].level_dbfs == -200
    assert samples[3].level_dbfs == pytest.approx(10 * np.log10(2e-4), abs=0.2)
    assert samples[3].disk_free_bytes is not None


def test_what_happens_while_the_store_is_away_is_stored_later(store: Store, settings: Settings) -> None:
    put_sensor(store, NORTH)
    clock = SetClock(T0)
    gauge = Gauge(NORTH)
    watch = MinuteWatch(lambda: settings, clock, lambda: [gauge], lambda: None, watched_folder(settings))
    for _ in range(3):
        gauge.lost("unplugged")
        watch.run(None, "the server cannot be reached")
        clock.wall_us += 60 * S
    gauge.lost("unplugged")
    (cleared,) = watch.run(store)
    assert cleared.kind == "store-unreachable"
    assert [(one.kind, one.raised_us) for one in open_conditions(store)] == [("source-lost", T0)]
    assert len(list(iter_health(store, "north"))) == 4


def test_a_restart_takes_over_what_was_wrong(store: Store, settings: Settings) -> None:
    put_sensor(store, NORTH)
    clock = SetClock(T0)
    gauge = Gauge(NORTH)

    def restarted() -> MinuteWatch:
        return MinuteWatch(lambda: settings, clock, lambda: [gauge], lambda: None, watched_folder(settings))

    watch = restarted()
    gauge.lost("unplugged")
    watch.run(store)
    clock.wall_us += 60 * S
    watch = restarted()
    watch.run(None, "not up yet")  # raised once more, before the store could tell that it was known
    watch.run(store)
    clock.wall_us += 60 * S
    heard(gauge, 0.01)
    watch.run(store)
    assert open_conditions(store) == []


def test_trouble_of_the_listener_with_the_store_is_a_condition(store: Store, settings: Settings) -> None:
    watch = MinuteWatch(lambda: settings, SetClock(T0), lambda: [], lambda: "it is locked", Path("/"))
    (raised,) = watch.run(store)
    assert (raised.kind, raised.sentence) == (
        "store-unreachable",
        "The store cannot be written: it is locked.",
    )


def test_the_clock_that_strikes_runs_the_jobs(
    store: Store, settings: Settings, caplog: pytest.LogCaptureFixture
) -> None:
    """The real scheduler: its first firing is at once."""
    fill(store)
    done = threading.Event()

    class Watched(logging.Handler):
        def emit(self, record: logging.LogRecord) -> None:
            if record.getMessage().startswith("tidy: "):
                done.set()

    handler = Watched()
    logging.getLogger("ginnel.daemon.jobs").addHandler(handler)
    house = None
    try:
        with caplog.at_level(logging.INFO, "ginnel"):
            house = start_jobs(lambda: settings, SetClock(T0 + 2 * HOUR_US), lambda: [], lambda: None)
            assert done.wait(60)
    finally:
        if house is not None:
            house.close()
            house.close()
        logging.getLogger("ginnel.daemon.jobs").removeHandler(handler)
    assert n_stale(store) == 0
    assert set(job_records(store)) == {"backup", "check", "prune", "rollup", "tidy"}
    assert not [thread for thread in threading.enumerate() if "APScheduler" in thread.name]


def test_a_store_that_is_not_there_is_no_end_of_the_daemon(
    settings: Settings, caplog: pytest.LogCaptureFixture
) -> None:
    away = settings.model_copy(update={"store": StoreSettings(url="sqlite:////nowhere/ginnel.db")})
    gauge = Gauge(NORTH)
    house = Housekeeping(lambda: away, SetClock(T0), lambda: [gauge], lambda: None, None)
    house.take_minute()
    house.keep_house()
    told = [one.getMessage() for one in caplog.records]
    assert any("store-unreachable" in line and "there is no folder /nowhere" in line for line in told), told
    assert not any("nobody foresaw" in line for line in told)


def test_the_watched_disk_is_that_of_the_store_or_of_the_state(tmp_path: Path) -> None:
    here = Settings(store=StoreSettings(url=f"sqlite:///{tmp_path / 'ginnel.db'}"))
    there = replace_store(here, "postgresql+psycopg://someone@host/ginnel", str(tmp_path / "state"))
    assert watched_folder(here) == tmp_path
    assert watched_folder(there) == tmp_path / "state"


def replace_store(settings: Settings, url: str, state: str) -> Settings:
    return settings.model_copy(
        update={"store": StoreSettings(url=url), "listen": ListenSettings(state=state)}
    )


def test_an_open_store_is_not_held_by_a_job(store: Store, store_url: str, settings: Settings) -> None:
    """After a firing nothing keeps the store: a restore or an upgrade can go on."""
    Housekeeping(lambda: settings, SetClock(T0), lambda: [], lambda: None, None).keep_house()
    with open_store(store_url) as other, other.writing() as connection:
        connection.execute(text("DELETE FROM job"))
    assert job_records(store) == {}
