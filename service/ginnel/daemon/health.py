"""How a sensor and its computer do, minute by minute."""

from __future__ import annotations

import os
import shutil
from dataclasses import dataclass
from pathlib import Path
from threading import Lock

from ginnel.doppler.input_meter import InputMeter
from ginnel.doppler.kinematics import hz_per_mps
from ginnel.words import Block, HealthSample, Sensor


@dataclass(frozen=True, slots=True, kw_only=True)
class SensorMinute:
    """A sensor's last minute, and what else conditions need to know of it."""

    sensor: Sensor
    sample: HealthSample
    is_constant: bool  # the input gave one value only
    lost: str | None  # why there is no source; None: there is
    is_steady: bool  # samples are due all the time, as from a sound card, not from a folder of files


@dataclass(frozen=True, slots=True, kw_only=True)
class ComputerHealth:
    """How the computer does; None: the system does not show it."""

    disk_free_bytes: int | None = None
    disk_size_bytes: int | None = None
    resident_bytes: int | None = None
    temperature_c: float | None = None


class Gauge:
    """What the listen loop tells of one sensor; read by the minute's job. Safe between threads.

    ``heard`` costs some hundredths of a percent of a core at 8 kHz.
    """

    def __init__(self, sensor: Sensor, *, is_steady: bool = True) -> None:
        self.sensor = sensor
        self._is_steady = is_steady
        self._lock = Lock()
        self._meter: InputMeter | None = None
        self._rate_hz = 0.0
        self._listened_s = 0.0
        self._dropped_samples = 0
        self._lag_s: float | None = None
        self._lost: str | None = None

    def heard(self, block: Block) -> None:
        """Samples came; so there is a source."""
        with self._lock:
            if self._meter is None or block.sample_rate_hz != self._rate_hz:
                self._meter = InputMeter(self.sensor, block.sample_rate_hz)
                self._rate_hz = block.sample_rate_hz
            self._meter.push(block.samples)
            self._listened_s += len(block.samples) / block.sample_rate_hz
            self._lost = None

    def dropped(self, n_samples: int) -> None:
        """So many samples were lost."""
        with self._lock:
            self._dropped_samples += n_samples

    def lags(self, lag_s: float) -> None:
        """Tell how old the newest sample was when its turn came; the worst of a minute counts."""
        with self._lock:
            self._lag_s = max(lag_s, self._lag_s or 0.0)

    def lost(self, reason: str) -> None:
        """There is no source, and why; until samples come again."""
        with self._lock:
            self._lost = reason

    def take(self, at_us: int, computer: ComputerHealth) -> SensorMinute:
        """Close the minute that ends now."""
        with self._lock:
            health = None if self._meter is None else self._meter.take()
            listened_s, self._listened_s = self._listened_s, 0.0
            dropped_samples, self._dropped_samples = self._dropped_samples, 0
            lag_s, self._lag_s = self._lag_s, None
            lost = self._lost
        lamp = health.lamp if health else None
        return SensorMinute(
            sensor=self.sensor,
            sample=HealthSample(
                at_us=at_us,
                listened_s=listened_s,
                level_dbfs=health.level_dbfs if health else None,
                noise_dbfs_hz=health.noise_dbfs_hz if health else None,
                hum_db=health.hum.over_noise_db if health and health.hum else None,
                lamp_db=lamp.over_noise_db if lamp else None,
                lamp_mps=lamp.frequency_hz / hz_per_mps(self.sensor.carrier_hz) if lamp else None,
                clipped_share=health.clipped_share if health else None,
                dropped_samples=dropped_samples,
                lag_s=lag_s,
                disk_free_bytes=computer.disk_free_bytes,
                disk_size_bytes=computer.disk_size_bytes,
                resident_bytes=computer.resident_bytes,
                temperature_c=computer.temperature_c,
            ),
            is_constant=health.is_constant if health else False,
            lost=lost,
            is_steady=self._is_steady,
        )


def computer_health(
    folder: Path, sys_root: Path = Path("/sys"), proc_root: Path = Path("/proc")
) -> ComputerHealth:
    """How the computer does, and how full the disk is on which a folder lies."""
    free_bytes, size_bytes = disk_bytes(folder)
    return ComputerHealth(
        disk_free_bytes=free_bytes,
        disk_size_bytes=size_bytes,
        resident_bytes=_resident_bytes(proc_root),
        temperature_c=_temperature_c(sys_root),
    )


def disk_bytes(folder: Path) -> tuple[int | None, int | None]:
    """Bytes free for us, and bytes in all, on the disk of a folder; None where nobody can tell."""
    try:
        usage = shutil.disk_usage(folder)
    except OSError:
        return None, None
    return usage.free, usage.total


def _resident_bytes(proc_root: Path) -> int | None:
    try:
        pages = int((proc_root / "self" / "statm").read_text().split()[1])
    except (OSError, ValueError, IndexError):
        return None
    return pages * os.sysconf("SC_PAGE_SIZE")


def _temperature_c(sys_root: Path) -> float | None:
    """Get the hottest zone; the kernel tells thousandths of a degree."""
    found: list[float] = []
    for zone in (sys_root / "class" / "thermal").glob("thermal_zone*/temp"):
        try:
            found.append(int(zone.read_text()) / 1000)
        except (OSError, ValueError):
            continue
    return max(found, default=None)
