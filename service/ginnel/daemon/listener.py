"""One sensor's life: samples from its source through the chain to the outbox, and nothing forgotten."""

from __future__ import annotations

import logging
from collections.abc import Callable
from threading import Event, Thread

from ginnel.capture import (
    Break,
    Dated,
    FileRead,
    FolderPlace,
    FolderSource,
    Heard,
    Idle,
    Source,
    SourceState,
)
from ginnel.clock import Clock
from ginnel.config import SensorSettings, SourceKind
from ginnel.daemon.checkpoint import Checkpoint, load, save
from ginnel.daemon.deliveries import Delivery
from ginnel.daemon.health import Gauge
from ginnel.daemon.open_span import OpenSpan
from ginnel.daemon.outbox import Outbox
from ginnel.daemon.places import Places
from ginnel.daemon.sources import make_folder_source, make_stream_source
from ginnel.times import utc_text
from ginnel.words import US_PER_S, Block

log = logging.getLogger(__name__)

#: After a kill, at most so much of what was heard is missing.
CHECKPOINT_S = 2.0
#: How long a listener that failed waits before it begins anew.
_AGAIN_S = 5.0


class Listener:
    """Listens to one sensor in a thread of its own.

    Parameters
    ----------
    stored_until_us : end of what the store holds of this sensor; asked once, at the start
    """

    def __init__(
        self,
        settings: SensorSettings,
        outbox: Outbox,
        places: Places,
        clock: Clock,
        stored_until_us: Callable[[str], int | None],
    ) -> None:
        self.settings = settings
        self.name = settings.name
        self.is_folder = settings.source.kind is SourceKind.FOLDER
        self.gauge = Gauge(settings.to_sensor(), is_steady=not self.is_folder)
        self._outbox, self._clock = outbox, clock
        self._stored_until_us = stored_until_us
        self._checkpoint_path = places.checkpoint(self.name, is_lasting=self.is_folder)
        self._span: OpenSpan | None = None
        self._source: Source | None = None
        self._dropped_samples = 0
        self._saved_us = 0
        self._told_fault: str | None = None
        self._is_forgetful = False  # whether the last checkpoint could not be written
        self._stop = Event()
        self._thread = Thread(target=self._run, name=f"ginnel-{self.name}", daemon=True)
        #: Steady time at which it last showed a sign of life, and at which it last heard samples.
        self.alive_us = self.heard_us = clock.read().steady_us
        self.has_ended = False
        self._make_source(None, None)  # what is missing is told before anything has begun

    @property
    def state(self) -> SourceState:
        """How its source is doing."""
        return SourceState(fault="not opened yet") if self._source is None else self._source.state

    def start(self) -> None:
        """Begin to listen."""
        self._thread.start()

    def stop(self) -> None:
        """Ask it to stop; `join` waits until it has."""
        self._stop.set()

    def join(self) -> None:
        """Wait until it has handed on all that it heard."""
        if self._thread.is_alive():
            self._thread.join()

    def _run(self) -> None:
        """Listen until stopped; what nobody foresaw is told, and listening begins anew."""
        while not self._stop.is_set() and not self.has_ended:
            try:
                self._listen()
            except Exception:  # (a thread's edge: one sensor's trouble is not the others')
                log.exception("%s: listening failed and begins anew", self.name)
                self.gauge.lost("listening failed, see the log")
                self._span = None
                self._clock.wait(self._stop, _AGAIN_S)
            finally:
                if self._source is not None:
                    self._source.close()

    def _listen(self) -> None:
        place, until_us = self._recover()
        self._source = self._make_source(place, until_us)
        for heard in self._source.iter_heard(self._stop):
            self._take(heard)
        self.has_ended = not self._stop.is_set()
        if self._span is not None and self.is_folder:
            self._outbox.put(self._span.take())  # the next run reads the file at hand anew
        elif self._span is not None:
            self._end_span("stopped")

    def _make_source(self, place: FolderPlace | None, until_us: int | None) -> Source:
        if self.is_folder:
            return make_folder_source(self.settings, self._clock, place)
        return make_stream_source(self.settings, self._clock, until_us)

    def _recover(self) -> tuple[FolderPlace | None, int | None]:
        """Take up what the last run left: where it was in the folder, or how far it had heard."""
        until_us = [self._stored_until_us(self.name)]
        left = load(self._checkpoint_path)
        if left is None:
            return None, until_us[0]
        self._outbox.put(*left.deliveries)
        deliveries = list(left.deliveries)
        place = left.place
        if self.is_folder:
            self._span = left.span
            if left.span is not None and left.span.sensor != self.settings.to_sensor(left.span.key[1]):
                self._end_span("the settings are others now")
                place = _without_span(place)
        elif left.span is not None:
            log.info("%s: goes on after an abrupt end", self.name)
            deliveries.append(left.span.finish())
            self._save(None, deliveries[-1])
            self._outbox.put(deliveries[-1])
        until_us += [one.span.ended_us for one in deliveries if one.span.clock_trusted]
        return place, max((us for us in until_us if us is not None), default=None)

    def _take(self, heard: Heard) -> None:
        """Do what is due for one thing heard."""
        self.alive_us = self._clock.read().steady_us
        match heard:
            case Block():
                self._hear(heard)
            case Break():
                self._dropped_samples = heard.dropped_samples
                self.gauge.dropped(heard.dropped_samples)
                self._end_span(heard.reason)
            case Dated():
                if self._span is not None:
                    self._span.move(heard.moved_by_us)
                    began = utc_text(self._span.key[1])
                    log.info("%s: the clock is set; the span began at %s", self.name, began)
            case FileRead():
                self._finish_file(heard)
            case Idle():
                self._look_at_source()

    def _hear(self, block: Block) -> None:
        """Push a block through the chain, beginning a span where there is none."""
        self.heard_us = self.alive_us
        self.gauge.heard(block)
        state = self.state
        self.gauge.lags(state.lag_s)
        if self.is_folder:
            while self._outbox.is_full and not self._clock.wait(self._stop, 1.0):
                self.alive_us = self._clock.read().steady_us  # files can wait
            span = self._span or self._begin_span(block)
            span.push(block)
            if span.has_found:
                self._outbox.put(span.take())
            return
        if self._span is not None and (reason := self._why_begin_anew(self._span, block)):
            self._end_span(reason)
        if self._outbox.is_full:
            self._rest(block)
            return
        span = self._span or self._begin_span(block)
        span.push(block)
        span.drift_ppm = state.drift_ppm
        if span.has_found or self.alive_us - self._saved_us >= CHECKPOINT_S * US_PER_S:
            self._hand_on(span.take())

    def _why_begin_anew(self, span: OpenSpan, block: Block) -> str | None:
        if self._outbox.is_refused(span.key):
            return "the store refused it"
        if self.settings.to_sensor(block.started_us).mounting != span.sensor.mounting:
            return "from now on the sensor is mounted otherwise"
        return None

    def _begin_span(self, block: Block) -> OpenSpan:
        self._span = OpenSpan(
            self.settings.to_sensor(block.started_us),
            block,
            is_clock_trusted=self.state.is_clock_trusted,
            dropped_samples=self._dropped_samples,
        )
        self._dropped_samples = 0
        doubt = "" if self.state.is_clock_trusted else " (the clock is not set: the date is in doubt)"
        log.info("%s: listening since %s%s", self.name, utc_text(block.started_us), doubt)
        return self._span

    def _end_span(self, reason: str) -> None:
        if self._span is None:
            return
        span, self._span = self._span, None
        delivery = span.finish()
        self._hand_on(delivery)
        log.info(
            "%s: listened until %s, %d movers: %s",
            self.name,
            utc_text(delivery.span.ended_us),
            span.n_passages,
            reason,
        )

    def _rest(self, block: Block) -> None:
        """Nothing can be kept, so nothing is heard, and the coverage shows it."""
        self._end_span("there is no room for what is heard, neither in the store nor beside it")
        self.gauge.dropped(len(block.samples))
        self._dropped_samples += len(block.samples)

    def _finish_file(self, heard: FileRead) -> None:
        """Make sure of what was in a file, then let go of it."""
        if self._span is not None:
            self._hand_on(self._span.take())
        if isinstance(self._source, FolderSource):
            if self._span is not None and self._outbox.is_refused(self._span.key):
                self._end_span("the store refused it")
                self._source.place = _without_span(self._source.place)
            self._source.let_go(heard.path)
        log.info("%s: heard %s", self.name, heard.path.name)

    def _hand_on(self, delivery: Delivery) -> None:
        """Remember first, then give away: see `checkpoint`."""
        self._save(self._span, delivery)
        self._outbox.put(delivery)

    def _save(self, span: OpenSpan | None, *new: Delivery) -> None:
        self._saved_us = self._clock.read().steady_us
        place = self._source.place if isinstance(self._source, FolderSource) else None
        pending = (*self._outbox.pending(self.name), *new)
        checkpoint = Checkpoint(deliveries=pending, span=span, place=place)
        try:
            save(self._checkpoint_path, checkpoint, is_lasting=self.is_folder)
        except OSError as exc:
            # an old one must not be taken for this one
            self._checkpoint_path.unlink(missing_ok=True)
            if not self._is_forgetful:
                log.error("%s cannot be written (%s): a kill now would lose more", self._checkpoint_path, exc)
            self._is_forgetful = True
        else:
            self._is_forgetful = False

    def _look_at_source(self) -> None:
        fault = self.state.fault
        if fault is not None:
            self.gauge.lost(fault)
            if fault != self._told_fault:
                log.warning("%s: hears nothing: %s", self.name, fault)
        self._told_fault = fault


def _without_span(place: FolderPlace | None) -> FolderPlace:
    """The same files done with, and whatever follows begins a span."""
    return FolderPlace() if place is None else FolderPlace(read_names=place.read_names)
