"""`ginnel demo`, whole: it ends in time, counts nearly as many as passed, and shows them."""

from __future__ import annotations

import re
import signal
import subprocess
import time
from pathlib import Path
from urllib.request import urlopen

import pytest
from tests.system.conftest import command, environment


@pytest.mark.slow
def test_the_demo_counts_what_passed_and_serves_it(tmp_path: Path) -> None:
    started = time.monotonic()
    with subprocess.Popen(
        command("demo", "--dir", str(tmp_path / "demo"), "--port", "0"),
        cwd=tmp_path,
        env=environment(),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    ) as demo:
        assert demo.stdout is not None
        assert demo.stderr is not None
        lines: list[str] = []
        for line in demo.stdout:
            lines.append(line)
            if "dashboard is at" in line:
                break
        took_s = time.monotonic() - started
        try:
            text = "".join(lines)
            address = re.search(r"http://127\.0\.0\.1:\d+/", text)
            assert address is not None, text + demo.stderr.read()
            with urlopen(f"{address[0]}busy?sensor=north-corridor") as answer:
                page = answer.read().decode()
        finally:
            demo.send_signal(signal.SIGINT)
            demo.wait(20)
        assert demo.stderr.read() == "", "no progress bar in a pipe"
    print(text, f"{took_s:.1f} s")
    assert "Tannery annex" in page
    totals = re.findall(r"(\S+) +in (?:11\.8|1\.8) h listened +(\d+) +(\d+)", text)
    assert [name for name, _, _ in totals] == ["north-corridor", "yard-gate"]
    for name, counted, passed in totals:
        assert int(passed) > 15
        # 5 %, or two, is our own aim for a demo (common practice, no source)
        assert abs(int(counted) - int(passed)) <= max(0.05 * int(passed), 2), name


def test_the_demo_does_not_write_over_other_settings(tmp_path: Path) -> None:
    (tmp_path / "ginnel.toml").write_text("# mine\n", "utf-8")
    done = subprocess.run(
        command("demo", "--dir", str(tmp_path), "--no-serve"), capture_output=True, text=True, timeout=60
    )
    assert done.returncode == 1
    assert "give the demo a folder of its own" in done.stderr
    assert (tmp_path / "ginnel.toml").read_text("utf-8") == "# mine\n"


def test_ctrl_c_ends_the_demo_soon_and_quietly(tmp_path: Path) -> None:
    deadline = time.monotonic() + 60
    with subprocess.Popen(
        command("demo", "--dir", str(tmp_path / "morning"), "--no-serve"),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    ) as demo:
        # the first capture has begun, so both working processes are busy
        while not list(tmp_path.glob("morning/captures/*/*.wav")):
            assert time.monotonic() < deadline
            assert demo.poll() is None
            time.sleep(0.01)
        demo.send_signal(signal.SIGINT)
        # what is left would take ten times as long
        out, err = demo.communicate(timeout=15)
    assert (demo.returncode, out, err.strip()) == (1, "", "Aborted!")
