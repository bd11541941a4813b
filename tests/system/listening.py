"""`ginnel listen` as a process, and sources that feed it."""

from __future__ import annotations

import os
import sqlite3
import subprocess
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import closing, contextmanager, suppress
from functools import cache
from pathlib import Path

import numpy as np
from tests.system.conftest import RATE_HZ, SENSOR, command, environment

from ginnel import sim
from ginnel.words import Direction

PATIENCE_S = 90.0
#: A walker crosses every so many seconds, one way and the other by turns.
EVERY_S = 8.0
TURN_S = 80.0

SETTINGS = """
[site]
name = "Weir lane"
timezone = "Europe/Dublin"
[store]
url = "{url}"
[listen]
store_every_s = 1
trust_clock = "always"
[[sensor]]
name = "lane"
[sensor.mounting]
height_m = 2.4
tilt_deg = 15.0
[sensor.source]
{source}
"""
PIPE = 'kind = "pipe"\npath = "samples"\nrate_hz = 2000\nreconnect_s = 1'
FOLDER = 'kind = "folder"\npath = "captures"\nsettle_s = 0.2'


def write_settings(folder: Path, source: str, url: str = "sqlite:///ginnel.db") -> None:
    (folder / "ginnel.toml").write_text(SETTINGS.format(url=url, source=source), "utf-8")


def wait_until(
    claim: Callable[[], object],
    process: subprocess.Popen[str] | None = None,
    patience_s: float = PATIENCE_S,
) -> None:
    deadline = time.monotonic() + patience_s
    while not claim():
        assert time.monotonic() < deadline
        assert process is None or process.poll() is None, "it has ended"
        time.sleep(0.01)


@cache
def walkers() -> bytes:
    """A turn of walkers that can be repeated for ever, 16 bit."""
    movers = tuple(
        sim.walker(
            crossed_s=EVERY_S * (number + 0.5),
            speed_mps=1.3,
            direction=Direction.RECEDING if number % 2 else Direction.APPROACHING,
            seed=number,
        )
        for number in range(round(TURN_S / EVERY_S))
    )
    scene = sim.Scene(sensor=SENSOR, duration_s=TURN_S, sample_rate_hz=RATE_HZ, movers=movers, seed=3)
    samples = np.concatenate(list(scene.blocks()))
    whole: bytes = np.clip(np.rint(samples * 32768.0), -32768, 32767).astype("<i2").tobytes()
    return whole


class Recorder:
    """A device that never waits: what nobody takes from the pipe is lost, as with a sound card."""

    def __init__(self, fifo: Path) -> None:
        os.mkfifo(fifo)
        self._fifo = fifo
        self._done = threading.Event()
        self._thread = threading.Thread(target=self._play)
        self.is_silent = False
        self.began_s = 0.0  # wall clock

    def _play(self) -> None:
        handle = os.open(self._fifo, os.O_RDWR | os.O_NONBLOCK)
        data, began, at = walkers(), time.monotonic(), 0
        self.began_s = time.time()
        while not self._done.wait(0.05):
            until = round((time.monotonic() - began) * RATE_HZ) * 2
            part = bytes(data[i % len(data)] for i in range(at, until)) if until - at < 4000 else b""
            at = until
            if part and not self.is_silent:
                try:
                    os.write(handle, part)
                except BlockingIOError:
                    # nobody reads: empty it, so that a reader finds fresh samples, never a backlog
                    while len(os.read(handle, 1 << 16)) == 1 << 16:
                        pass
        os.close(handle)

    def __enter__(self) -> Recorder:
        self._thread.start()
        return self

    def __exit__(self, *_: object) -> None:
        self._done.set()
        self._thread.join()


@contextmanager
def listening(folder: Path, *, log: str = "log", **variables: str) -> Iterator[subprocess.Popen[str]]:
    """The daemon, in a folder with settings; it is killed at the end if it is still there."""
    with (folder / log).open("a", encoding="utf-8") as lines:
        process = subprocess.Popen(
            command("listen"),
            cwd=folder,
            env=environment() | {"OPENBLAS_NUM_THREADS": "1"} | variables,
            stdin=subprocess.DEVNULL,
            stdout=subprocess.DEVNULL,
            stderr=lines,
            text=True,
        )
        try:
            yield process
        finally:
            process.kill()
            process.wait()


def said(folder: Path, log: str = "log") -> str:
    return (folder / log).read_text("utf-8") if (folder / log).exists() else ""


def rows(folder: Path, query: str) -> list[tuple[int, ...]]:
    """Rows of the SQLite store, as whoever else reads it sees them; none where there is no table yet."""
    if not (folder / "ginnel.db").exists():
        return []
    with (
        closing(sqlite3.connect(f"file:{folder / 'ginnel.db'}?mode=ro", uri=True, timeout=60)) as store,
        suppress(sqlite3.OperationalError),  # no tables yet
    ):
        return store.execute(query).fetchall()
    return []


def passages(folder: Path) -> list[tuple[int, ...]]:
    return rows(
        folder, "SELECT crossed_us, direction, speed_umps, started_us, ended_us FROM passage ORDER BY 1"
    )


def spans(folder: Path) -> list[tuple[int, ...]]:
    return rows(folder, "SELECT started_us, ended_us FROM span ORDER BY 1")
