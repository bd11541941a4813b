"""When the jobs of housekeeping run: APScheduler, in memory, in UTC, beside listening.

The schedule is only a clock that strikes. What there is to do, each job finds out from the store, so that
nothing depends on a firing that a restart or a sleeping machine missed, or on there being one only.
"""

from __future__ import annotations

import logging
from collections.abc import Callable, Sequence
from contextlib import contextmanager
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING, Any

from sqlalchemy.engine import make_url

from ginnel.clock import Clock
from ginnel.config import Settings
from ginnel.daemon import upkeep
from ginnel.daemon.health import Gauge
from ginnel.daemon.minute import MinuteWatch
from ginnel.daemon.upkeep import PruneEvidence
from ginnel.errors import StoreBusyError, StoreError
from ginnel.store import Store, job_records, open_store, put_job

if TYPE_CHECKING:
    from collections.abc import Iterator

log = logging.getLogger(__name__)

_HOUR_US = 3_600_000_000


class Housekeeping:
    """The jobs of one daemon. Safe to run from the scheduler's threads."""

    def __init__(
        self,
        settings: Callable[[], Settings],
        clock: Clock,
        gauges: Callable[[], Sequence[Gauge]],
        store_trouble: Callable[[], str | None],
        prune_evidence: PruneEvidence | None,
    ) -> None:
        self._settings, self._clock, self._prune_evidence = settings, clock, prune_evidence
        self._url = settings().store.url
        self._folder = watched_folder(settings())
        self._minute = MinuteWatch(settings, clock, gauges, store_trouble, self._folder)
        self._scheduler: Any = None

    def start(self) -> None:
        """Let the clock strike: every minute, and every ten for what is less urgent."""
        from apscheduler.executors.pool import ThreadPoolExecutor
        from apscheduler.schedulers.background import BackgroundScheduler

        # one line for every firing would drown the journal
        logging.getLogger("apscheduler").setLevel(logging.WARNING)
        self._scheduler = BackgroundScheduler(
            timezone=UTC,
            executors={"default": ThreadPoolExecutor(1), "slow": ThreadPoolExecutor(1)},
            job_defaults={"coalesce": True, "max_instances": 1, "misfire_grace_time": None},
        )
        self._scheduler.add_job(self.take_minute, "cron", second=0, name="minute")
        self._scheduler.add_job(
            self.keep_house,
            "cron",
            minute="*/10",
            second=30,
            name="upkeep",
            executor="slow",
            next_run_time=datetime.now(UTC),
        )
        self._scheduler.start()

    def close(self) -> None:
        """Wait for what is running, then stop; harmless when repeated."""
        if self._scheduler is not None:
            self._scheduler.shutdown(wait=True)
            self._scheduler = None
        try:
            with open_store(self._url) as store:
                self._minute.save(store)
        except StoreError as exc:
            log.warning("the last minutes of health are lost: %s", exc)

    def take_minute(self) -> None:
        """Health, conditions, and room on the disk."""
        settings = self._settings()
        with _outermost("room"):
            told = upkeep.make_room(self._folder, settings.retention, settings.backup, self._prune_evidence)
            if told:
                log.warning("%s", told)
        with _outermost("minute"):
            try:
                with open_store(self._url) as store:
                    self._minute.run(store)
            except StoreError as exc:
                self._minute.run(None, str(exc))

    def keep_house(self) -> None:
        """Roll-ups, and in the night the rest; nothing that writes while there is no room."""
        settings = self._settings()
        with _outermost("upkeep"):
            if not upkeep.has_room(self._folder, settings.retention):
                log.error("the disk is full: roll-ups and backups wait until there is room")
                return
            try:
                with open_store(self._url) as store:
                    self._do(store, "rollup", lambda: upkeep.roll_up(store, self._clock))
                    self._do_nightly(store, settings)
            except StoreBusyError as exc:
                log.warning("housekeeping waits: %s", exc)
            except StoreError as exc:
                log.error("housekeeping waits: %s", exc)

    def _do_nightly(self, store: Store, settings: Settings) -> None:
        nightly: tuple[tuple[str, Callable[[], str | None]], ...] = (
            ("backup", lambda: upkeep.back_up(self._url, self._clock, settings.backup)),
            ("prune", lambda: upkeep.prune(store, self._clock, settings.retention)),
            ("check", lambda: upkeep.look_for_faults(store, self._clock)),
            ("tidy", lambda: upkeep.tidy(self._url)),
        )
        for name, job in nightly:
            record = job_records(store).get(name)
            until_us = upkeep.due_us(self._clock.read().wall_us, settings.backup.at_utc, record)
            if until_us is not None:
                self._do(store, name, job, until_us)

    def _do(
        self, store: Store, name: str, job: Callable[[], str | None], until_us: int | None = None
    ) -> None:
        """Run a job and record how it went; one that fails does not keep the others from running."""
        try:
            outcome, failed = job(), False
        except StoreBusyError as exc:
            log.warning("%s waits: %s", name, exc)
            return
        except StoreError as exc:
            outcome, failed = str(exc), True
            log.error("%s failed: %s", name, exc)
        if outcome is not None:
            now_us = self._clock.read().wall_us
            put_job(store, name, ran_us=now_us, outcome=outcome, done_until_us=until_us, failed=failed)
            if not failed:
                log.info("%s: %s", name, outcome)


def start_jobs(
    settings: Callable[[], Settings],
    clock: Clock,
    gauges: Callable[[], Sequence[Gauge]],
    store_trouble: Callable[[], str | None],
    prune_evidence: PruneEvidence | None = None,
) -> Housekeeping:
    """Start the jobs; close what is given when listening ends.

    Parameters
    ----------
    settings, gauges : the present ones, asked at every firing, so that settings may be read again
    store_trouble : why what is heard cannot be stored, in a line; None where it can
    prune_evidence : removes kept signals until so many bytes are free, and gives how many went
    """
    housekeeping = Housekeeping(settings, clock, gauges, store_trouble, prune_evidence)
    housekeeping.start()
    return housekeeping


def watched_folder(settings: Settings) -> Path:
    """Folder on the disk that must not fill up: that of a SQLite store, else that of the listener's state."""
    url = make_url(settings.store.url)
    if url.get_backend_name() == "sqlite":
        return Path(url.database or ".").absolute().parent
    return Path(settings.listen.state).absolute()


@contextmanager
def _outermost(name: str) -> Iterator[None]:
    """A thread's edge: what nobody foresaw is told, and the next firing tries again."""
    try:
        yield
    except Exception:
        log.exception("the job %s failed for a reason nobody foresaw", name)
