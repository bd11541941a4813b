"""Deliveries on their way to the store: at once where it takes them, in order and once in any case."""

from __future__ import annotations

import logging
from collections.abc import Callable
from contextlib import ExitStack
from threading import Event, Lock

from ginnel.clock import Clock
from ginnel.daemon.deliveries import Delivery, merged
from ginnel.daemon.spool import Spool
from ginnel.errors import SpanRefusedError, StoreError
from ginnel.store import Store, extend_span, kept_open, redate_span

log = logging.getLogger(__name__)

#: So many passages may wait in memory once neither store nor spool take any; then listening rests.
MOST_PASSAGES = 20_000
_RETRY_S = 5.0
_AT_ONCE = 50


class Outbox:
    """Between the listeners and the store, with a thread of its own (`run`).

    What it was given waits in memory for as long as ``every_s``; listeners remember that part themselves
    (`pending`). When the store fails it waits on disk.

    Parameters
    ----------
    connect : opens the store; called again until it succeeds
    """

    def __init__(self, connect: Callable[[], Store], spool: Spool, clock: Clock, every_s: float) -> None:
        self._connect, self._spool, self._clock = connect, spool, clock
        self._every_s = every_s
        self._lock = Lock()
        self._fresh: list[Delivery] = []
        self._in_hand: list[Delivery] = []
        self._refused: set[tuple[str, int]] = set()
        self._store: Store | None = None
        self._in_use = ExitStack()  # the store, closed when `run` ends
        #: Why the store takes nothing, in a line; None while it does.
        self.fault: str | None = None

    @property
    def is_full(self) -> bool:
        """Whether there is no room for more passages: listening must rest, and be seen to."""
        with self._lock:
            return sum(len(one.passages) for one in (*self._in_hand, *self._fresh)) > MOST_PASSAGES

    @property
    def n_waiting(self) -> int:
        """Deliveries that wait on disk."""
        return self._spool.n_waiting

    def put(self, *deliveries: Delivery) -> None:
        """Take deliveries; returns at once."""
        with self._lock:
            self._fresh = merged([*self._fresh, *deliveries])

    def pending(self, sensor_name: str) -> tuple[Delivery, ...]:
        """Give a sensor's deliveries that would be lost if the process were killed now."""
        with self._lock:
            return tuple(one for one in (*self._in_hand, *self._fresh) if one.sensor.name == sensor_name)

    def is_refused(self, key: tuple[str, int]) -> bool:
        """Whether the store has refused a span for good."""
        return key in self._refused

    def run(self, stop: Event) -> None:
        """Deliver now and then until stopped, and once more then."""
        with self._in_use:
            while not self._clock.wait(stop, _RETRY_S if self.fault else self._every_s):
                self.deliver()
            self.deliver()

    def deliver(self) -> None:
        """Hand over what there is, to the store or else to the spool."""
        with self._lock:
            self._in_hand, self._fresh = self._fresh, []
        left = self._in_hand
        try:
            left = self._to_store(self._in_hand)
            self._spool.append(left)
            left = []
        except StoreError as exc:
            self._tell(f"{exc}; and there is no room to wait on disk")
        with self._lock:
            self._fresh = merged([*left, *self._fresh])
            self._in_hand = []

    def _to_store(self, fresh: list[Delivery]) -> list[Delivery]:
        """Give the store what waits on disk, then what is fresh; tells what it did not take."""
        done = 0
        try:
            if self._store is None:
                self._store = self._open()
            while self._spool.n_waiting:
                for number, one in self._spool.first(_AT_ONCE):
                    self._hand_over(self._store, one)
                    self._spool.remove(number)
            for one in fresh:
                self._hand_over(self._store, one)
                done += 1
        except StoreError as exc:
            self._tell(str(exc))
        else:
            if self.fault is not None:
                log.info("the store takes passages again")
            self.fault = None
        return fresh[done:]

    def _open(self) -> Store:
        store = self._in_use.enter_context(self._connect())
        self._in_use.enter_context(kept_open(store))
        return store

    def _hand_over(self, store: Store, one: Delivery) -> None:
        if one.key in self._refused:
            return
        try:
            if one.moved_from_us is not None:
                redate_span(store, one.sensor.name, one.moved_from_us, one.span.started_us)
            extend_span(
                store,
                one.sensor,
                one.span,
                one.passages,
                one.chain_version,
                drift_ppm=one.drift_ppm,
                dropped_samples=one.dropped_samples,
            )
        except SpanRefusedError as exc:
            self._refused.add(one.key)
            log.error("%s", exc)

    def _tell(self, fault: str) -> None:
        if self.fault is None:
            log.error("%s; what is heard waits until it takes passages again", fault)
        self.fault = fault
