"""Hours of simulated signal through the whole daemon, as fast as it goes; what that costs.

::

    python -m tests.system.long_run --hours 48 --per-hour 20

The daemon is the real one, with its threads, jobs, store and a FIFO; only its clock is moved as samples come.
Prints a line for each hour: resident memory, threads, open files; and at the end a line of JSON.
"""

from __future__ import annotations

import argparse
import array
import fcntl
import json
import os
import resource
import tempfile
import termios
import threading
import time
from functools import cache
from pathlib import Path
from threading import Event

import numpy as np
from tests.unit.capture.fed_clock import FedClock

from ginnel import sim
from ginnel.config import Settings, load_settings
from ginnel.daemon.listen import Daemon
from ginnel.words import Channels, Direction, Mounting, Sensor

SETTINGS = """
[listen]
trust_clock = "always"
[[sensor]]
name = "lane"
channels = "{channels}"
[sensor.mounting]
height_m = 2.4
tilt_deg = 15.0
[sensor.source]
kind = "pipe"
path = "samples"
rate_hz = {rate_hz:g}
"""
PART_S = 1.0
#: So much may wait between the source and the chain, well below what the queue holds.
MOST_LAG_S = 20.0


class PacedClock(FedClock):
    """Waiting takes as long as the signal does."""

    def wait(self, event: Event, seconds: float) -> bool:
        until_us = self.read().steady_us + seconds * 1e6
        while self.read().steady_us < until_us:
            if event.wait(0.005):
                return True
        return event.is_set()


@cache
def turn(channels: str, rate_hz: float, per_hour: float) -> bytes:
    """One walker and the quiet around, 16 bit; the next one goes the other way."""
    sensor = Sensor(name="lane", mounting=Mounting(height_m=2.4, tilt_deg=15.0), channels=Channels(channels))
    half_s = 3600.0 / per_hour
    scene = sim.Scene(
        sensor=sensor,
        duration_s=2 * half_s,
        sample_rate_hz=rate_hz,
        movers=tuple(
            sim.walker(crossed_s=(number + 0.5) * half_s, speed_mps=1.3, direction=way, seed=number)
            for number, way in enumerate((Direction.APPROACHING, Direction.RECEDING))
        ),
        seed=3,
    )
    samples = np.concatenate(list(scene.blocks()))
    values = samples.view(np.float32) if channels == "iq" else samples
    whole: bytes = np.clip(np.rint(values * 32768.0), -32768, 32767).astype("<i2").tobytes()
    return whole


def resident_mb() -> float:
    pages = int(Path("/proc/self/statm").read_text().split()[1])
    return pages * os.sysconf("SC_PAGE_SIZE") / 1e6


def written_mb() -> float:
    lines = dict(line.split(": ") for line in Path("/proc/self/io").read_text().splitlines())
    return int(lines["write_bytes"]) / 1e6


def waiting_bytes(handle: int) -> int:
    count = array.array("i", [0])
    fcntl.ioctl(handle, termios.FIONREAD, count)
    return count[0]


def play(
    daemon: Daemon, clock: PacedClock, fifo: Path, data: bytes, part_bytes: int, hours: float, every_h: float
) -> list[dict[str, float]]:
    """Send so many hours; one sample of what the process needs for each part of them."""
    handle = os.open(fifo, os.O_RDWR)
    told: list[dict[str, float]] = []
    n_parts = round(hours * 3600 / PART_S)
    at = 0
    for number in range(n_parts + 1):
        while waiting_bytes(handle) or any(one.state.lag_s > MOST_LAG_S for one in daemon.listeners):
            time.sleep(0.0005)
        if number % round(every_h * 3600 / PART_S) == 0:
            told.append(
                {
                    "hours": number * PART_S / 3600,
                    "resident_mb": resident_mb(),
                    "threads": threading.active_count(),
                    "files": len(os.listdir("/proc/self/fd")),
                    "written_mb": written_mb(),
                    "cpu_s": sum(resource.getrusage(resource.RUSAGE_SELF)[:2]),
                }
            )
            print(json.dumps(told[-1]), flush=True)
        clock.pass_s(PART_S)
        part = (data[at : at + part_bytes] + data)[:part_bytes]
        at = (at + part_bytes) % len(data)
        os.write(handle, part)
    os.close(handle)
    return told


def run(folder: Path, hours: float, per_hour: float, channels: str, rate_hz: float, every_h: float) -> None:
    data = turn(channels, rate_hz, per_hour)
    os.mkfifo(folder / "samples")
    (folder / "ginnel.toml").write_text(SETTINGS.format(channels=channels, rate_hz=rate_hz), "utf-8")
    settings: Settings = load_settings(folder / "ginnel.toml")
    clock = PacedClock()
    daemon = Daemon(settings, lambda: settings, clock)
    part_bytes = round(PART_S * rate_hz) * 2 * (2 if channels == "iq" else 1)
    told: list[dict[str, float]] = []

    def feed() -> None:
        try:
            told.extend(play(daemon, clock, folder / "samples", data, part_bytes, hours, every_h))
        finally:
            daemon.stop()

    feeder = threading.Thread(target=feed)
    feeder.start()
    daemon.run()
    feeder.join()
    # what it was like once everything had been used for a while, against the end
    settled = told[min(1, len(told) - 2)] if len(told) > 1 else told[0]
    last = told[-1]
    lasted_h = last["hours"] - settled["hours"]
    print(
        json.dumps(
            {
                "hours": last["hours"],
                "resident_mb": round(last["resident_mb"], 1),
                "grown_mb": round(last["resident_mb"] - settled["resident_mb"], 1),
                "threads": [settled["threads"], last["threads"]],
                "files": [settled["files"], last["files"]],
                "written_mb_a_day": round((last["written_mb"] - settled["written_mb"]) / lasted_h * 24, 1),
                "cpu_share": round((last["cpu_s"] - settled["cpu_s"]) / lasted_h / 3600, 5),
            }
        )
    )


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawTextHelpFormatter)
    parser.add_argument("--hours", type=float, default=48.0)
    parser.add_argument("--per-hour", type=float, default=20.0)
    parser.add_argument("--channels", choices=["mono", "iq"], default="mono")
    parser.add_argument("--rate-hz", type=float, default=2000.0)
    parser.add_argument("--every-h", type=float, default=1.0)
    given = parser.parse_args()
    with tempfile.TemporaryDirectory() as folder:
        run(Path(folder), given.hours, given.per_hour, given.channels, given.rate_hz, given.every_h)


if __name__ == "__main__":
    main()
