"""Memory, threads and files of a daemon that runs on and on, for GINNEL_HOURS (a half without it)."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import pytest
from tests.system.conftest import environment

ROOT = Path(__file__).parents[2]
HOURS = float(os.environ.get("GINNEL_HOURS", "0.5"))


@pytest.mark.slow
def test_memory_is_flat_and_nothing_piles_up(record_property: Callable[[str, object], None]) -> None:
    done = subprocess.run(
        [
            sys.executable,
            "-m",
            "tests.system.long_run",
            *("--hours", str(HOURS), "--per-hour", "12", "--every-h", str(min(1.0, HOURS / 4))),
        ],
        cwd=ROOT,
        env=environment() | {"OPENBLAS_NUM_THREADS": "1", "PYTHONPATH": str(ROOT)},
        capture_output=True,
        text=True,
        timeout=600 + 120 * HOURS,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    told = json.loads(done.stdout.splitlines()[-1])
    record_property("table", f"{HOURS:g} h of simulated signal through the daemon: {told}")
    assert told["hours"] == HOURS
    assert told["grown_mb"] < 5.0
    assert told["threads"][1] <= told["threads"][0] + 1  # a pool may start its second thread late
    assert told["files"][1] <= told["files"][0] + 3
    assert told["written_mb_a_day"] < 50.0
