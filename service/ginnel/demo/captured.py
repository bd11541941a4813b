"""An invented day at an invented place: captures, the real chain over them, and how well it counted.

The corridor is recorded from seven to seven, with twelve minutes that nobody recorded, the yard gate early
in the morning only. An hour is in a file. Who walks there is drawn from a seed: everybody sees the same day.
"""

from __future__ import annotations

import multiprocessing
import signal
from collections.abc import Callable, Iterable, Iterator, Sequence
from concurrent.futures import FIRST_COMPLETED, Future, ProcessPoolExecutor, wait
from contextlib import contextmanager
from dataclasses import dataclass
from multiprocessing.queues import SimpleQueue
from multiprocessing.synchronize import Event
from pathlib import Path
from typing import TypeAlias, TypeVar

from ginnel import sim
from ginnel.capture import RecordedSpan, arrange, find_captures, open_recording
from ginnel.chain import CHAIN_VERSION
from ginnel.config import Settings
from ginnel.errors import GinnelError
from ginnel.replay import find_passages
from ginnel.store import open_store, record_span
from ginnel.words import US_PER_S, Channels, Direction, Passage, Sensor, Story

#: Enough for a walker's limbs at each carrier, and captures that stay small.
SAMPLE_RATE_HZ = {"north-corridor": 1000.0, "yard-gate": 2000.0}
STARTED_US = 1_776_664_800 * US_PER_S  # Monday 2026-04-20, 07:00 in Dublin
#: By sensor: minute of the day's start and length in minutes, walkers an hour, share of them approaching.
HOURS = {
    "north-corridor": (
        (0, 60, 3, 0.8),
        (60, 48, 7, 0.8),
        (120, 60, 2, 0.6),
        (180, 60, 1, 0.5),
        (240, 60, 1, 0.5),
        (300, 60, 2, 0.3),
        (360, 60, 2, 0.6),
        (420, 60, 1, 0.5),
        (480, 60, 1, 0.5),
        (540, 60, 2, 0.2),
        (600, 60, 4, 0.2),
        (660, 60, 1, 0.3),
    ),
    "yard-gate": ((0, 60, 7, 0.8), (60, 48, 12, 0.7)),
}
EDGE_S = 15.0
CHAIN_WORK = 6.0  # reading a second costs about so many times what making it does; only the bar asks

OnProgress = Callable[[float], None]
_Told: TypeAlias = "SimpleQueue[float]"
_Result = TypeVar("_Result")

_told: _Told | None = None  # in a working process, where progress is told to
_stop: Event | None = None  # and whether what it does is wanted no longer


@dataclass(frozen=True, slots=True, kw_only=True)
class Tally:
    """What really passed a sensor, and what was counted."""

    sensor: Sensor
    true: dict[Direction, int]
    counted: dict[Direction, int]
    listened_s: float


def work_s() -> float:
    """How much `run` has to do, in the unit of its progress."""
    return sum(60.0 * minutes for hours in HOURS.values() for _, minutes, _, _ in hours) * (1 + CHAIN_WORK)


def run(settings: Settings, on_progress: OnProgress, meanwhile: Callable[[], None]) -> list[Tally]:
    """Make all captures, read them, store what was found, and compare; two processes share the work.

    ``meanwhile`` is done in this process while those two make captures.

    Raises
    ------
    GinnelError
        Something failed; the message says what.
    """
    sensors = {config.name: config.to_sensor() for config in settings.sensor}
    folders = {config.name: Path(config.source.path) for config in settings.sensor}
    true: dict[str, list[sim.TrueMover]] = {name: [] for name in sensors}
    found: dict[str, list[Passage]] = {name: [] for name in sensors}
    listened_s = dict.fromkeys(sensors, 0.0)
    spawn = multiprocessing.get_context("spawn")
    told: _Told = spawn.SimpleQueue()
    stop = spawn.Event()
    with (
        ProcessPoolExecutor(2, mp_context=spawn, initializer=_begin, initargs=(told, stop)) as pool,
        _stopping(pool, stop),
        open_store(settings.store.url) as store,
    ):
        making = {
            pool.submit(make_capture, sensors[name], folders[name], hour): name
            for name in sensors
            for hour in range(len(HOURS[name]))
        }
        meanwhile()
        for made in _finished(making, told, on_progress):
            true[making[made]] += made.result()
        spans = [(name, span) for name in sensors for span in recorded_spans(sensors[name], folders[name])]
        spans.sort(key=lambda one: -one[1].n_samples)
        reading = {pool.submit(_read, sensors[name], span): (name, span) for name, span in spans}
        for read in _finished(reading, told, on_progress):
            name, recorded = reading[read]
            span, passages = recorded.to_span(), read.result()
            record_span(store, sensors[name], span, passages, CHAIN_VERSION)
            found[name] += passages
            listened_s[name] += span.listened_s
    return [_tally(sensors[name], true[name], found[name], listened_s[name]) for name in sensors]


def make_capture(sensor: Sensor, folder: Path, hour: int) -> list[sim.TrueMover]:
    """Write the capture of one hour, and its truth beside it; gives the truth."""
    minute, minutes, per_hour, share_approaching = HOURS[sensor.name][hour]
    started_us, duration_s = STARTED_US + 60 * minute * US_PER_S, 60.0 * minutes
    seed = 10 * hour + (sensor.channels is Channels.IQ)
    walkers = sim.poisson_walkers(
        duration_s=duration_s,
        per_hour=per_hour,
        share_approaching=share_approaching,
        centre_m=sensor.mounting.offset_m,
        edge_s=EDGE_S,
        seed=seed,
    )
    scene = sim.Scene(
        sensor=sensor,
        duration_s=duration_s,
        sample_rate_hz=SAMPLE_RATE_HZ[sensor.name],
        movers=walkers,
        seed=seed,
    )
    try:
        folder.mkdir(parents=True, exist_ok=True)
        stem = sim.capture_name(sensor.name, started_us)
        sim.write_wav(scene, folder / f"{stem}.wav", on_progress=_tell)
        sim.write_truth(scene, folder / f"{stem}-truth.csv", started_us)
    except OSError as exc:
        raise GinnelError(f"{folder} cannot be written: {exc.strerror or exc}") from exc
    return scene.truth()


def recorded_spans(sensor: Sensor, folder: Path) -> tuple[RecordedSpan, ...]:
    """Put a sensor's captures together."""
    return arrange([open_recording(path, sensor) for path in find_captures([folder])]).spans


def _read(sensor: Sensor, recorded: RecordedSpan) -> tuple[Passage, ...]:
    return find_passages(sensor, recorded, lambda done_s: _tell(CHAIN_WORK * done_s))


@contextmanager
def _stopping(pool: ProcessPoolExecutor, stop: Event) -> Iterator[None]:
    """Let the working processes stop soon when something fails or Ctrl-C comes; the pool waits for them."""
    try:
        yield
    except BaseException:
        stop.set()
        pool.shutdown(cancel_futures=True)
        raise


def _begin(told: _Told, stop: Event) -> None:
    """Begin a working process: how to tell progress, and to end at once and silently on Ctrl-C."""
    global _told, _stop
    _told, _stop = told, stop
    signal.signal(signal.SIGINT, signal.SIG_DFL)


def _tell(done: float) -> None:
    if _stop is not None and _stop.is_set():
        raise GinnelError("the demo was stopped")
    if _told is not None:
        _told.put(done)


def _finished(
    futures: Iterable[Future[_Result]], told: _Told, on_progress: OnProgress
) -> Iterator[Future[_Result]]:
    """Give each piece of work when it is done, and pass on progress meanwhile."""
    pending = set(futures)
    while pending:
        done, pending = wait(pending, timeout=0.2, return_when=FIRST_COMPLETED)
        while not told.empty():
            on_progress(told.get())
        yield from done


def _tally(
    sensor: Sensor, true: Sequence[sim.TrueMover], found: Sequence[Passage], listened_s: float
) -> Tally:
    passed = [
        mover.direction for mover in true if mover.story is Story.PASSAGE and mover.crossed_s is not None
    ]
    counted = [passage.direction for passage in found if passage.story is Story.PASSAGE]
    return Tally(
        sensor=sensor,
        true={direction: passed.count(direction) for direction in Direction},
        counted={direction: counted.count(direction) for direction in Direction},
        listened_s=listened_s,
    )
