"""The README's tour, typed as it stands."""

from __future__ import annotations

import os
import re
import shutil
import signal
import subprocess
import sys
from pathlib import Path

import pytest
from tests.system.conftest import environment

ROOT = Path(__file__).parents[2]


def test_the_tour_works_as_typed(tmp_path: Path) -> None:
    section = (ROOT / "README.md").read_text("utf-8").split("## A short tour")[1].split("\n## ")[0]
    lines = [
        line for block in re.findall(r"```sh\n(.*?)```", section, re.DOTALL) for line in block.splitlines()
    ]
    assert lines[0] == ". .venv/bin/activate"
    assert lines[-1] == "ginnel serve"
    bin_folder = Path(sys.executable).parent
    if shutil.which("ginnel", path=str(bin_folder)) is None:
        pytest.skip("ginnel is not installed beside this Python")
    path = f"{bin_folder}{os.pathsep}{os.environ['PATH']}"
    # the environment of the tests stands for .venv, and the dashboard takes a free port
    script = "\n".join(["set -e", *lines[1:-1], "exec ginnel serve --port 0"])
    tour = subprocess.Popen(
        ["bash", "-c", script],
        cwd=tmp_path,
        env=environment() | {"PATH": path, "PYTHONUNBUFFERED": "1"},
        stdout=subprocess.PIPE,
        stderr=subprocess.STDOUT,
        text=True,
    )
    with tour:
        assert tour.stdout is not None
        said = []
        for line in tour.stdout:  # ends at the dashboard's address, or with a script that failed before it
            said.append(line)
            if line.startswith("The dashboard is at http://127.0.0.1:"):
                break
        tour.send_signal(signal.SIGINT)
    assert said, "the tour said nothing"
    assert said[-1].startswith("The dashboard is at http://127.0.0.1:"), "".join(said)
    counts = (tmp_path / "ropewalk/counts.csv").read_text("utf-8").splitlines()
    assert counts[0].startswith("sensor,interval_start,")
    assert (tmp_path / "ropewalk/counts.datapackage.json").is_file()
    assert any(line.startswith("sensor-1,") for line in counts[1:])
