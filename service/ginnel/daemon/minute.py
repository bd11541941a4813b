"""Once a minute: how everything is, what is wrong, and who should know."""

from __future__ import annotations

import logging
from collections import deque
from collections.abc import Callable, Sequence
from pathlib import Path

from ginnel import store as log_on_disk
from ginnel.clock import Clock
from ginnel.config import Settings
from ginnel.daemon.alerts import send_alerts
from ginnel.daemon.conditions import ConditionWatch, Finding
from ginnel.daemon.findings import computer_findings, sensor_findings
from ginnel.daemon.health import Gauge, SensorMinute, computer_health
from ginnel.daemon.usual import Usual, usual
from ginnel.errors import StoreError
from ginnel.store import JobRecord, LoggedHealth, Store
from ginnel.words import US_PER_S, Condition, Severity

log = logging.getLogger(__name__)

#: What is usual changes slowly, and costs some milliseconds to find out.
_USUAL_US = 1800 * US_PER_S
#: Minutes stored together: every commit wears a flash card, whatever is in it.
_MINUTES_TOGETHER = 5
#: Minutes that wait while the store takes nothing: a day of them.
_MINUTES_KEPT = 1440


class MinuteWatch:
    """Takes each minute's health, judges it, and has it stored; what cannot be stored waits in memory.

    Parameters
    ----------
    gauges : of the sensors that are listened to now
    store_trouble : why what is heard cannot be stored, in a line; None where it can
    folder : on the disk that must not fill up
    """

    def __init__(
        self,
        settings: Callable[[], Settings],
        clock: Clock,
        gauges: Callable[[], Sequence[Gauge]],
        store_trouble: Callable[[], str | None],
        folder: Path,
    ) -> None:
        self._settings, self._clock, self._gauges = settings, clock, gauges
        self._store_trouble, self._folder = store_trouble, folder
        self._watch = ConditionWatch()
        self._has_adopted = False
        self._usual: dict[str, tuple[int, Usual]] = {}
        self._unsaved: deque[LoggedHealth] = deque(maxlen=_MINUTES_KEPT)
        self._saved_us = 0
        self._save_trouble: str | None = None
        self._untold: deque[Condition] = deque(maxlen=_MINUTES_KEPT)

    def run(self, store: Store | None, trouble: str | None = None) -> list[Condition]:
        """Take the minute that ends now; gives what it raised or cleared.

        Parameters
        ----------
        store : None where it cannot be opened, and why in ``trouble``
        """
        now = self._clock.read()
        computer = computer_health(self._folder)
        minutes = [gauge.take(now.wall_us, computer) for gauge in self._gauges()]
        self._unsaved.extend(LoggedHealth(sensor=one.sensor.name, sample=one.sample) for one in minutes)
        trouble = self._store_trouble() or trouble or self._save_trouble
        jobs: dict[str, JobRecord] = {}
        if store is not None:
            try:
                self._save_conditions(store)
                jobs = log_on_disk.job_records(store)
            except StoreError as exc:
                trouble = trouble or str(exc)
        changes = self._watch.forget(now.wall_us, [one.sensor.name for one in minutes])
        findings = [
            *computer_findings(
                computer,
                clock_is_set=now.is_set,
                keep_free_bytes=self._settings().retention.keep_free_mb * 1_000_000,
                store_trouble=trouble,
            ),
            *job_findings(jobs),
        ]
        for minute in minutes:
            findings += sensor_findings(minute, self._usual_of(store, minute, now.wall_us))
        changes += self._watch.push(now.wall_us, findings)
        self._tell(changes)
        is_time = not 0 <= now.wall_us - self._saved_us < _MINUTES_TOGETHER * 60 * US_PER_S
        if store is not None and (changes or is_time):
            self._save_trouble = None
            try:
                self.save(store)
            except StoreError as exc:
                self._save_trouble = str(exc)  # the next minute tells
        return changes

    def save(self, store: Store) -> None:
        """Store what waits: conditions, and the minutes since the last time.

        Raises
        ------
        StoreError
            It cannot be written. All waits on.
        """
        self._save_conditions(store)
        if self._unsaved:
            log_on_disk.put_health(store, tuple(self._unsaved))
            self._saved_us = self._unsaved[-1].sample.at_us
            self._unsaved.clear()

    def _save_conditions(self, store: Store) -> None:
        if not self._has_adopted:
            raised = log_on_disk.open_conditions(store)
            known = {(one.kind, one.sensor) for one in raised}
            # what was raised again since the start is the same trouble that was there before
            self._untold = deque(
                (one for one in self._untold if (one.kind, one.sensor) not in known), _MINUTES_KEPT
            )
            self._watch.adopt(raised)
            self._has_adopted = True
        if self._untold:
            log_on_disk.put_conditions(store, tuple(self._untold))
            self._untold.clear()

    def _usual_of(self, store: Store | None, minute: SensorMinute, now_us: int) -> Usual:
        name = minute.sensor.name
        found_us, known = self._usual.get(name, (0, Usual()))
        if store is None or abs(now_us - found_us) < _USUAL_US:
            return known
        try:
            known = usual(store, name, now_us)
        except StoreError as exc:
            log.debug("%s: what is usual is not known: %s", name, exc)
        self._usual[name] = (now_us, known)
        return known

    def _tell(self, changes: Sequence[Condition]) -> None:
        for one in changes:
            if one.cleared_us is not None:
                log.info("over: %s (%s)", one.kind, one.sensor or "all sensors")
            else:
                level = logging.ERROR if one.severity is Severity.FAILURE else logging.WARNING
                log.log(level, "%s: %s %s", one.kind, one.sentence, one.advice)
        self._untold.extend(changes)
        urls = [url.get_secret_value() for url in self._settings().notify.urls]
        if changes and urls:
            send_alerts(urls, self._settings().site.name, changes)


def job_findings(records: dict[str, JobRecord]) -> list[Finding]:
    """What the last tries of the jobs say."""
    kinds = {"backup": "backup-failed", "check": "store-damaged"}
    findings = [
        Finding(
            kind=kind,
            sensor=None,
            is_bad=records[name].failed,
            sentence=f"The nightly {name} failed: {records[name].outcome}.",
        )
        for name, kind in kinds.items()
        if name in records
    ]
    failed = [one for name, one in records.items() if one.failed and name not in kinds]
    told = f"The job {failed[0].name} failed: {failed[0].outcome}." if failed else ""
    return [*findings, Finding(kind="job-failed", sensor=None, is_bad=bool(failed), sentence=told)]
