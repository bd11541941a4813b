"""Health, conditions and watermarks of jobs: read back as they were told; telling twice changes nothing."""

from __future__ import annotations

from dataclasses import replace

import pytest

from ginnel.errors import StoreError
from ginnel.store import (
    JobRecord,
    LoggedHealth,
    Store,
    conditions,
    iter_health,
    job_records,
    latest_health,
    open_conditions,
    put_conditions,
    put_health,
    put_job,
    put_sensor,
)
from ginnel.words import Condition, HealthSample, Sensor, Severity

MINUTE_US = 60_000_000
T0 = 1_772_442_000_000_000
FULL = HealthSample(
    at_us=T0,
    listened_s=59.875,
    level_dbfs=-41.25,
    noise_dbfs_hz=-73.5,
    hum_db=12.5,
    lamp_db=31.062,
    lamp_mps=1.424,
    clipped_share=0.000125,
    dropped_samples=480,
    lag_s=0.75,
    disk_free_bytes=12_345_000_000,
    disk_size_bytes=31_000_000_000,
    resident_bytes=87_000_000,
    temperature_c=54.321,
)
CLIPS = Condition(
    kind="input-clips",
    sensor="north",
    severity=Severity.WARNING,
    raised_us=T0,
    sentence="The input clips.",
    advice="Turn the gain down.",
)


@pytest.fixture
def known(store: Store) -> Store:
    put_sensor(store, Sensor(name="north"))
    put_sensor(store, Sensor(name="south"))
    return store


def test_samples_read_back_as_they_were(known: Store) -> None:
    bare = HealthSample(at_us=T0 + MINUTE_US)
    put_health(known, [LoggedHealth(sensor="north", sample=one) for one in (FULL, bare)])
    assert list(iter_health(known, "north")) == [FULL, bare]
    assert list(iter_health(known, "north", T0 + 1, T0 + MINUTE_US)) == []
    assert latest_health(known) == [LoggedHealth(sensor="north", sample=bare)]


def test_the_same_minute_twice_stays_as_it_was(known: Store) -> None:
    put_health(known, [LoggedHealth(sensor="north", sample=FULL)])
    put_health(known, [LoggedHealth(sensor="north", sample=replace(FULL, level_dbfs=0.0))])
    assert list(iter_health(known, "north")) == [FULL]


def test_a_sample_of_an_unknown_sensor_is_refused(known: Store) -> None:
    with pytest.raises(StoreError, match="no sensor 'west'; it knows: north, south"):
        put_health(known, [LoggedHealth(sensor="west", sample=FULL)])


def test_a_condition_is_open_until_it_is_cleared(known: Store) -> None:
    board = replace(CLIPS, kind="disk-nearly-full", sensor=None, raised_us=T0 + 1, severity=Severity.FAILURE)
    put_conditions(known, [CLIPS, board])
    put_conditions(known, [CLIPS])
    assert open_conditions(known) == [CLIPS, board]
    cleared = replace(CLIPS, cleared_us=T0 + 5 * MINUTE_US)
    put_conditions(known, [cleared])
    put_conditions(known, [cleared])
    assert open_conditions(known) == [board]
    assert conditions(known, T0, T0 + MINUTE_US) == [cleared, board]
    assert conditions(known, T0 + 6 * MINUTE_US, T0 + 7 * MINUTE_US) == [board]


def test_a_condition_raised_again_is_another_one(known: Store) -> None:
    put_conditions(known, [CLIPS, replace(CLIPS, cleared_us=T0 + 1), replace(CLIPS, raised_us=T0 + 2)])
    assert [one.cleared_us for one in conditions(known, T0, T0 + 9)] == [T0 + 1, None]


def test_a_condition_that_the_store_hears_of_too_late_is_whole(known: Store) -> None:
    cleared = replace(CLIPS, cleared_us=T0 + 1)
    put_conditions(known, [cleared])
    assert conditions(known, T0, T0 + 1) == [cleared]


def test_a_watermark_moves_only_when_the_job_is_done(store: Store) -> None:
    assert job_records(store) == {}
    put_job(store, "backup", ran_us=10, outcome="done", done_until_us=9)
    put_job(store, "backup", ran_us=20, outcome="no room", done_until_us=19, failed=True)
    put_job(store, "check", ran_us=5, outcome="never done", failed=True)
    assert job_records(store) == {
        "backup": JobRecord(name="backup", done_until_us=9, ran_us=20, outcome="no room", failed=True),
        "check": JobRecord(name="check", done_until_us=None, ran_us=5, outcome="never done", failed=True),
    }
