"""The jobs of housekeeping, as plain functions.

Each works from what the store says is done already, so that one missed is made up and one doubled finds
nothing to do. A job gives a line about what it did, or None where nothing was due.
"""

from __future__ import annotations

from collections.abc import Callable
from datetime import UTC, datetime, time, timedelta
from pathlib import Path

from ginnel import store as log
from ginnel.clock import Clock
from ginnel.config import BackupSettings, RetentionSettings
from ginnel.daemon.findings import full_below_bytes
from ginnel.daemon.health import disk_bytes
from ginnel.errors import StoreError
from ginnel.store import JobRecord, Store
from ginnel.times import from_us, to_us
from ginnel.words import US_PER_S

DAY_US = 86_400 * US_PER_S
#: Passages of an hour come in after it is over, on a busy day; a mark brings a later one in.
_SETTLED_US = 120 * US_PER_S
#: What failed is tried again after so long.
_RETRY_US = 6 * 3600 * US_PER_S
#: Roll-ups so old are compared with their passages every night; `ginnel store check` compares all.
_COMPARED_US = 3 * DAY_US

#: Removes kept signals, the oldest first, until so many bytes are free; gives how many bytes went.
PruneEvidence = Callable[[int], int]


def roll_up(store: Store, clock: Clock) -> str | None:
    """Make the roll-ups of hours that are over."""
    n_hours = log.roll_up_hours(store, clock.read().wall_us - _SETTLED_US)
    return f"{n_hours} hours rolled up" if n_hours else None


def prune(store: Store, clock: Clock, retention: RetentionSettings) -> str | None:
    """Let go of what is older than the settings say; only by a clock that can be trusted.

    Age is measured against the newest thing in the log, too: a clock gone wild must not empty it.
    """
    now = clock.read()
    newest_us = log.newest_us(store)
    if not now.is_set or newest_us is None:
        return None
    now_us = min(now.wall_us, newest_us + DAY_US)
    gone = []
    for what, days, remove in (
        ("passages", retention.passages_days, log.prune_passages),
        ("hours of roll-ups", retention.rollups_days, log.prune_rollups),
        ("health samples", retention.health_days, log.prune_health),
        ("conditions", retention.conditions_days, log.prune_conditions),
    ):
        if days and (n := remove(store, now_us - days * DAY_US)):
            gone.append(f"{n} {what}")
    return f"removed {', '.join(gone)}" if gone else "nothing is old enough"


def back_up(store_url: str, clock: Clock, backup: BackupSettings) -> str | None:
    """Make the backup of the night, check it, and let go of old ones."""
    if backup.keep_days == 0:
        return None
    now_us = clock.read().wall_us
    made = log.back_up(store_url, Path(backup.folder), now_us)
    log.prune_backups(Path(backup.folder), backup.keep_days, now_us)
    return f"{made.path.name}, {made.size_bytes / 1e6:.1f} MB, checked"


def look_for_faults(store: Store, clock: Clock) -> str | None:
    """Look for what is wrong in the store, among roll-ups in those of the last days.

    Raises
    ------
    StoreError
        Something is wrong; the message begins with how much.
    """
    if found := log.find_faults(store, clock.read().wall_us - _COMPARED_US):
        raise StoreError(f"{len(found)} faults in the store: {found[0]}")
    return "no faults"


def tidy(store_url: str) -> str | None:
    """Give room back to the disk where much of the store's file is empty."""
    freed_bytes = log.vacuum(store_url)
    return f"{freed_bytes / 1e6:.1f} MB given back" if freed_bytes else "nothing to give back"


def make_room(
    folder: Path, retention: RetentionSettings, backup: BackupSettings, prune_evidence: PruneEvidence | None
) -> str | None:
    """Where the disk has less room than it should, let evidence go, then all backups but the newest."""
    wanted = retention.keep_free_mb * 1_000_000
    free, _ = disk_bytes(folder)
    if free is None or free >= wanted:
        return None
    gone = []
    if prune_evidence is not None and (freed_bytes := prune_evidence(wanted - free)):
        gone.append(f"{freed_bytes / 1e6:.1f} MB of evidence")
    for old in log.backups(Path(backup.folder))[:-1]:
        free, _ = disk_bytes(folder)
        if free is None or free >= wanted:
            break
        old.path.unlink()
        gone.append(old.path.name)
    return f"removed {', '.join(gone)} to make room" if gone else None


def has_room(folder: Path, retention: RetentionSettings) -> bool:
    """Whether jobs may write: below a fifth of the room that there should be, listening has the rest."""
    free, _ = disk_bytes(folder)
    return free is None or free >= full_below_bytes(retention.keep_free_mb * 1_000_000)


def due_us(now_us: int, at_utc: time, record: JobRecord | None) -> int | None:
    """When a nightly job should last have run, where it has not been done since; None where it has.

    One that failed waits some hours. The time is the job's new watermark once it is done.
    """
    now = from_us(now_us)
    tonight = datetime.combine(now.date(), at_utc, UTC)
    last_us = to_us(tonight if tonight <= now else tonight - timedelta(days=1))
    if record is None:
        return last_us
    if record.failed and 0 <= now_us - record.ran_us < _RETRY_US:
        return None
    return last_us if record.done_until_us is None or record.done_until_us < last_us else None
