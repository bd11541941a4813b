"""The daemon: its threads, its signals, and word to whoever watches over it."""

from __future__ import annotations

import logging
import signal
from collections.abc import Callable
from contextlib import ExitStack
from pathlib import Path
from threading import Event, Thread
from types import FrameType

from ginnel.clock import Clock, SystemClock
from ginnel.config import SensorSettings, Settings, load_settings
from ginnel.daemon.jobs import start_jobs
from ginnel.daemon.listener import Listener
from ginnel.daemon.memory import give_memory_back, use_memory_sparingly
from ginnel.daemon.notify import notify, watchdog_s
from ginnel.daemon.outbox import Outbox
from ginnel.daemon.places import Lock, Places, make_places
from ginnel.daemon.spool import Spool
from ginnel.errors import GinnelError, StoreBusyError, StoreError
from ginnel.store import Store, listened_until_us, open_store, put_sensor, put_site
from ginnel.words import US_PER_S

log = logging.getLogger(__name__)

_TICK_S = 0.5
#: A listener that shows no sign of life for so long is stuck; a crowd may keep one busy for a while.
_STUCK_S = 120.0
_HEALTH_LINE_S = 60.0


class Daemon:
    """Listens to all sensors of the settings until stopped.

    Parameters
    ----------
    reload : reads the settings again, for SIGHUP

    Raises
    ------
    GinnelError
        Something is wrong that only a person can mend: it is told before anything has begun.
    """

    def __init__(
        self, settings: Settings, reload: Callable[[], Settings], clock: Clock | None = None
    ) -> None:
        if not settings.sensor:
            raise GinnelError("no sensor is configured: add a [[sensor]] to the settings")
        self._settings, self._reload = settings, reload
        self._clock = clock or SystemClock(is_always_set=settings.listen.trust_clock == "always")
        self._stop, self._stop_outbox, self._hup = Event(), Event(), Event()
        self._store: Store | None = None
        self.listeners: list[Listener] = []
        self._has_failed = False

    def stop(self) -> None:
        """Ask it to stop; `run` returns once all is stored."""
        self._stop.set()

    def run(self) -> bool:
        """Listen; tells whether it ended as it should."""
        use_memory_sparingly()
        with ExitStack() as stack:
            places = make_places(Path(self._settings.listen.state))
            stack.enter_context(Lock(places))
            spool = Spool(places.spool)
            outbox = Outbox(self._connect, spool, self._clock, self._settings.listen.store_every_s)
            self._open_early()
            make = self._maker(outbox, places)
            self.listeners = [make(sensor) for sensor in self._settings.sensor]
            writer = Thread(target=outbox.run, args=(self._stop_outbox,), name="ginnel-outbox", daemon=True)
            writer.start()
            for listener in self.listeners:
                listener.start()
            jobs = start_jobs(
                lambda: self._settings,
                self._clock,
                lambda: [listener.gauge for listener in self.listeners],
                lambda: outbox.fault,
            )
            stack.callback(jobs.close)
            notify("READY=1", "STATUS=listening")
            log.info("listening to %s", ", ".join(listener.name for listener in self.listeners))
            try:
                self._watch(outbox, writer, make)
            finally:
                notify("STOPPING=1")
                self._end(writer)
        log.info("ended")
        return not self._has_failed

    def catch_signals(self) -> None:
        """Let SIGTERM and SIGINT end it in good order, and SIGHUP read the settings again."""

        def end(number: int, frame: FrameType | None) -> None:
            self._stop.set()

        def hang_up(number: int, frame: FrameType | None) -> None:
            self._hup.set()

        for number in (signal.SIGTERM, signal.SIGINT):
            signal.signal(number, end)
        signal.signal(signal.SIGHUP, hang_up)

    def _connect(self) -> Store:
        """Open the store and tell it of site and sensors; also from the outbox, until it succeeds."""
        if self._store is None:
            store = open_store(self._settings.store.url, create=True)
            put_site(store, self._settings.site.to_site())
            for sensor in self._settings.sensor:
                put_sensor(store, sensor.to_sensor())
            self._store = store
        return self._store

    def _open_early(self) -> None:
        """Open the store; one that cannot be reached now may come, one of another kind will not."""
        try:
            self._connect()
        except StoreBusyError as exc:
            log.error("%s; what is heard waits until then", exc)

    def _stored_until_us(self, sensor_name: str) -> int | None:
        if self._store is None:
            return None
        try:
            return listened_until_us(self._store, sensor_name)
        except StoreError as exc:
            log.warning("%s: how far it was heard before is not known", exc)
            return None

    def _maker(self, outbox: Outbox, places: Places) -> Callable[[SensorSettings], Listener]:
        def make(settings: SensorSettings) -> Listener:
            return Listener(settings, outbox, places, self._clock, self._stored_until_us)

        return make

    def _watch(self, outbox: Outbox, writer: Thread, make: Callable[[SensorSettings], Listener]) -> None:
        """Look after the threads until told to stop, or until every source has come to its end."""
        every_s = watchdog_s()
        fed_us = told_us = self._clock.read().steady_us
        while not self._stop.wait(_TICK_S):
            now_us = self._clock.read().steady_us
            if self._hup.is_set():
                self._hup.clear()
                self._take_settings(make)
            if not writer.is_alive():
                log.critical("writing to the store failed for a reason nobody foresaw: ending")
                self._has_failed = True
                return
            if all(listener.has_ended for listener in self.listeners):
                return
            if every_s is not None and now_us - fed_us > every_s / 3 * US_PER_S and self._is_well(fed_us):
                notify("WATCHDOG=1")
                fed_us = now_us
            if now_us - told_us > _HEALTH_LINE_S * US_PER_S:
                told_us = now_us
                self._tell(outbox)

    def _is_well(self, since_us: int) -> bool:
        """Whether samples flow: some sensor heard any, and no listener is stuck.

        A folder may be empty for hours; there it is enough that somebody looks into it.
        """
        now_us = self._clock.read().steady_us
        if any(now_us - listener.alive_us > _STUCK_S * US_PER_S for listener in self.listeners):
            return False
        return any(
            (listener.alive_us if listener.is_folder else listener.heard_us) > since_us
            for listener in self.listeners
        )

    def _tell(self, outbox: Outbox) -> None:
        """One line a minute on each sensor."""
        give_memory_back()
        for listener in self.listeners:
            state = listener.state
            log.info(
                "%s: %s, %.1f s waiting, %d samples dropped, %d deliveries wait on disk",
                listener.name,
                state.fault or "hears",
                state.lag_s,
                state.dropped_samples,
                outbox.n_waiting,
            )
        faults = [f"{one.name}: {one.state.fault}" for one in self.listeners if one.state.fault]
        notify("STATUS=" + ("; ".join([*faults, *([outbox.fault] if outbox.fault else [])]) or "listening"))

    def _take_settings(self, make: Callable[[SensorSettings], Listener]) -> None:
        """Read the settings again: sensors that are different begin anew, the others listen on."""
        try:
            new = self._reload()
            if (new.store, new.listen) != (self._settings.store, self._settings.listen):
                log.warning("a change of [store] or [listen] waits until ginnel listen is started again")
            wanted = {sensor.name: sensor for sensor in new.sensor}
            kept = [one for one in self.listeners if wanted.get(one.name) == one.settings]
            fresh = [
                make(sensor) for name, sensor in wanted.items() if name not in {one.name for one in kept}
            ]
        except GinnelError as exc:
            for line in str(exc).splitlines():
                log.error("the settings stay as they were: %s", line)
            return
        gone = [one for one in self.listeners if one not in kept]
        for one in gone:
            one.stop()
        for one in gone:
            one.join()
        self.listeners = [*kept, *fresh]
        self._settings = new
        self._renew_names()
        for one in fresh:
            one.start()
        log.info(
            "settings read again: %s", ", ".join(f"{one.name} begins anew" for one in fresh) or "no change"
        )

    def _renew_names(self) -> None:
        store, self._store = self._store, None
        if store is not None:
            try:
                put_site(store, self._settings.site.to_site())
                for sensor in self._settings.sensor:
                    put_sensor(store, sensor.to_sensor())
            except StoreError as exc:
                log.warning("%s: the store learns of the new settings later", exc)
            self._store = store

    def _end(self, writer: Thread) -> None:
        """Stop listening, then hand on what was heard."""
        for listener in self.listeners:
            listener.stop()
        for listener in self.listeners:
            listener.join()
        self._stop_outbox.set()
        writer.join()


def listen(config_file: Path | None) -> bool:
    """Run the daemon on the settings of a file until a signal ends it; tells whether all went well."""
    settings = load_settings(config_file)
    daemon = Daemon(settings, lambda: load_settings(config_file))
    daemon.catch_signals()
    return daemon.run()
