"""A live source that sends raw samples: read by a thread of its own, kept in a bounded queue, dated."""

from __future__ import annotations

import threading
from collections import deque
from collections.abc import Iterator
from dataclasses import dataclass
from threading import Event

from ginnel.capture.dating import Dating
from ginnel.capture.links import Link
from ginnel.capture.live import Heard, Idle, SourceState
from ginnel.capture.pcm import PcmDecoder
from ginnel.clock import Clock, ClockReading
from ginnel.errors import SourceLostError
from ginnel.words import US_PER_S, SampleArray

#: So much may wait while whoever reads is busy (a crowd, a slow disk); what comes then is dropped.
QUEUE_S = 60.0
#: Bytes are handed on in parts of about this length.
_PART_S = 0.2
#: A source that sends nothing for so long is lost.
SILENT_S = 5.0
_FIRST_RETRY_S = 0.5
_POLL_S = 0.1
_IDLE_S = 0.5
#: A device that hangs is left to itself after so long.
_CLOSE_S = 5.0


@dataclass(frozen=True, slots=True)
class _Arrival:
    """Samples, and when the last of them came."""

    samples: SampleArray
    at: ClockReading


@dataclass(frozen=True, slots=True)
class _Lost:
    """Some samples never came, or could not be kept."""

    reason: str
    dropped_samples: int = 0
    is_end: bool = False


class StreamSource:
    """Samples that come over a link, which may go away and come back.

    Parameters
    ----------
    retry_s : longest wait between two tries to open the link
    not_before_us : end of what is in the log already
    """

    def __init__(
        self,
        link: Link,
        decoder: PcmDecoder,
        sample_rate_hz: float,
        clock: Clock,
        *,
        retry_s: float,
        not_before_us: int | None = None,
    ) -> None:
        self._link, self._decoder, self._clock = link, decoder, clock
        self._rate_hz = sample_rate_hz
        self._retry_s = retry_s
        self._dating = Dating(sample_rate_hz, not_before_us)
        self._inbox = _Inbox(round(QUEUE_S * sample_rate_hz))
        self._stop = Event()
        self._reader = threading.Thread(target=self._read, name="ginnel-reader", daemon=True)
        self._link_fault: str | None = "not opened yet"
        self._failure: Exception | None = None
        self.is_open = False
        #: Samples that came over the link, kept or not.
        self.n_arrived = 0

    @property
    def state(self) -> SourceState:
        """How it is doing."""
        return SourceState(
            fault=self._link_fault or self._dating.fault,
            lag_s=self._inbox.n_waiting / self._rate_hz,
            dropped_samples=self._inbox.n_dropped,
            drift_ppm=self._dating.drift_ppm,
            is_clock_trusted=self._dating.is_trusted,
        )

    def iter_heard(self, stop: Event) -> Iterator[Heard]:
        """Give what is heard until stopped, or until the link has come to its end."""
        self._reader.start()
        while True:
            item = self._inbox.get(_IDLE_S)
            if isinstance(item, _Arrival):
                yield from self._dating.push(item.samples, item.at) or [Idle()]
            elif isinstance(item, _Lost):
                if item.is_end:
                    yield from self._dating.finish()
                yield from self._dating.cut(item.reason, item.dropped_samples)
                if item.is_end:
                    return
            else:
                if self._failure is not None:
                    raise self._failure
                yield Idle()
            if stop.is_set() and not self._stop.is_set():
                self.close()  # what has come by now is still given
            if item is None and self._stop.is_set():
                yield from self._dating.finish()
                return

    def close(self) -> None:
        """Stop reading and let go of the link."""
        self._stop.set()
        if self._reader.is_alive() and threading.current_thread() is not self._reader:
            self._reader.join(_CLOSE_S)

    def _read(self) -> None:
        """Read until told to stop, opening the link again whenever it is lost (the thread)."""
        wait_s = _FIRST_RETRY_S
        try:
            while not self._stop.is_set():
                try:
                    self._link.open()
                    self._decoder.reset()
                    self.is_open = True
                    if self._read_link():
                        return
                except SourceLostError as exc:
                    if self._link_fault is None:
                        wait_s = _FIRST_RETRY_S  # it was well until now
                    self._link_fault = str(exc)
                    self._inbox.put(_Lost(str(exc)))
                finally:
                    self.is_open = False
                    self._link.close()
                self._clock.wait(self._stop, wait_s)
                wait_s = min(2 * wait_s, self._retry_s)
        except Exception as exc:  # noqa: BLE001 (handed to whoever reads: a thread's edge)
            self._failure = exc

    def _read_link(self) -> bool:
        """Read an open link until it is lost, or tell that it has ended."""
        part_bytes = max(1, round(_PART_S * self._rate_hz)) * self._decoder.frame_bytes
        part, began_us = bytearray(), self._clock.read().steady_us
        heard_us = began_us
        while not self._stop.is_set():
            chunk = self._link.read(_POLL_S)
            if chunk.is_overrun:
                self._inbox.put(_Lost("the sound card ran over: samples were lost"))
            part += chunk.data
            at = self._clock.read()
            if part and (len(part) >= part_bytes or not chunk.data or chunk.is_end):
                self._link_fault = None
                samples = self._decoder.push(bytes(part))
                part.clear()
                self._inbox.put(_Arrival(samples, at))
                self.n_arrived += len(samples)
            if chunk.is_end:
                self._inbox.put(_Lost("the input has ended", is_end=True))
                return True
            if chunk.data:
                heard_us = at.steady_us
            elif at.steady_us - heard_us > SILENT_S * US_PER_S:
                raise SourceLostError(f"nothing came for {SILENT_S:g} s")
        return False


class _Inbox:
    """A queue between two threads that holds so many samples, and counts those that found no room."""

    def __init__(self, most_samples: int) -> None:
        self._most = most_samples
        self._items: deque[_Arrival | _Lost] = deque()
        self._changed = threading.Condition()
        self._n_dropped_now = 0
        self.n_waiting = 0
        self.n_dropped = 0

    def put(self, item: _Arrival | _Lost) -> None:
        """Add an item; what finds no room is dropped and counted."""
        with self._changed:
            if isinstance(item, _Arrival):
                n = len(item.samples)
                room = self._most // 2 if self._n_dropped_now else self._most  # once full, wait for real room
                if self.n_waiting + n > room:
                    self._n_dropped_now += n
                    self.n_dropped += n
                    return
                self.n_waiting += n
            if self._n_dropped_now:
                reason = "samples came faster than they could be read"
                self._items.append(_Lost(reason, self._n_dropped_now))
                self._n_dropped_now = 0
            self._items.append(item)
            self._changed.notify()

    def get(self, timeout_s: float) -> _Arrival | _Lost | None:
        """Take the oldest item, waiting so long at most."""
        with self._changed:
            if not self._items:
                self._changed.wait(timeout_s)
            if not self._items:
                return None
            item = self._items.popleft()
            if isinstance(item, _Arrival):
                self.n_waiting -= len(item.samples)
            return item
