"""Captures of one invented sensor, made by the simulator, and the program as a process."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from ginnel import sim
from ginnel.cli import main
from ginnel.words import US_PER_S, Direction, Mounting, Sensor

SENSOR = Sensor(name="lane", mounting=Mounting(height_m=2.4, tilt_deg=15.0))
SETTINGS = """
[site]
name = "Weir lane"
timezone = "Europe/Dublin"
[[sensor]]
name = "lane"
[sensor.mounting]
height_m = 2.4
tilt_deg = 15.0
"""
RATE_HZ = 2000.0
STARTED_US = 1_772_438_400 * US_PER_S  # 2026-03-02T08:00:00Z

Ginnel = Callable[..., Result]


def environment() -> dict[str, str]:
    """The environment without settings of whoever runs the tests."""
    return {key: value for key, value in os.environ.items() if not key.startswith("GINNEL_")}


def command(*arguments: str) -> list[str]:
    """The program as installed for this Python."""
    return [sys.executable, "-c", "from ginnel.cli import main; main(prog_name='ginnel')", *arguments]


@pytest.fixture
def ginnel(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Ginnel:
    """Run a command in the test's folder, whose settings are those above."""
    (tmp_path / "ginnel.toml").write_text(SETTINGS, "utf-8")
    monkeypatch.chdir(tmp_path)
    for name in set(os.environ) - set(environment()):
        monkeypatch.delenv(name)

    def run(*arguments: str) -> Result:
        return CliRunner().invoke(main, arguments, catch_exceptions=False)

    return run


def write_minute(folder: Path, minute: int, *, seed: int = 0, duration_s: float = 60.0) -> Path:
    """Write the capture of one minute or less: somebody approaches at 20 s, somebody leaves at 40 s."""
    folder.mkdir(exist_ok=True)
    scene = sim.Scene(
        sensor=SENSOR,
        duration_s=duration_s,
        sample_rate_hz=RATE_HZ,
        movers=(
            sim.walker(crossed_s=20.0, speed_mps=1.2, direction=Direction.APPROACHING, seed=2 * seed),
            sim.walker(crossed_s=40.0, speed_mps=1.5, direction=Direction.RECEDING, seed=2 * seed + 1),
        ),
        seed=seed,
    )
    name = sim.capture_name("lane", STARTED_US + minute * 60 * US_PER_S)
    return sim.write_wav(scene, folder / f"{name}.wav")
