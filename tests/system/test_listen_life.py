"""How `ginnel listen` begins, ends, and is refused."""

from __future__ import annotations

import signal
import socket
import subprocess
import time
from pathlib import Path

import pytest
from tests.system.conftest import command, environment, write_minute
from tests.system.listening import (
    FOLDER,
    PIPE,
    Recorder,
    listening,
    passages,
    rows,
    said,
    spans,
    wait_until,
    write_settings,
)

from ginnel.words import US_PER_S


def test_sigterm_stores_all_that_was_heard_and_sighup_begins_anew_what_changed(tmp_path: Path) -> None:
    write_settings(tmp_path, PIPE)
    with Recorder(tmp_path / "samples"), listening(tmp_path) as process:
        wait_until(lambda: spans(tmp_path), process)
        # nothing changed: it listens on
        process.send_signal(signal.SIGHUP)
        wait_until(lambda: "settings read again: no change" in said(tmp_path), process)
        # a mistake: the settings stay as they were
        good = (tmp_path / "ginnel.toml").read_text("utf-8")
        (tmp_path / "ginnel.toml").write_text(good.replace("tilt_deg", "tlit_deg"), "utf-8")
        process.send_signal(signal.SIGHUP)
        wait_until(lambda: "did you mean tilt_deg?" in said(tmp_path), process)
        assert said(tmp_path).count("listening since") == 1
        # another mounting: another span
        (tmp_path / "ginnel.toml").write_text(good.replace("height_m = 2.4", "height_m = 2.6"), "utf-8")
        process.send_signal(signal.SIGHUP)
        wait_until(lambda: said(tmp_path).count("listening since") == 2, process)
        assert "settings read again: lane begins anew" in said(tmp_path)
        # long enough for what is heard to count as heard
        wait_until(lambda: len(spans(tmp_path)) == 2 and passages(tmp_path), process)
        told_at_us = round(time.time() * US_PER_S)
        process.terminate()
        assert process.wait(60) == 0
    assert said(tmp_path).rstrip().endswith("ended")
    assert len(rows(tmp_path, "SELECT DISTINCT reading_id FROM span")) == 2
    # the span reaches to the very end, give or take a part of a second
    assert abs(spans(tmp_path)[1][1] - told_at_us) < 2 * US_PER_S
    assert not list((tmp_path / "listening").glob("undelivered*"))


def test_a_second_one_is_refused(tmp_path: Path) -> None:
    (tmp_path / "captures").mkdir()
    write_settings(tmp_path, FOLDER)
    with listening(tmp_path) as process:
        wait_until(lambda: "listening to lane" in said(tmp_path), process)
        done = subprocess.run(
            command("listen"),
            cwd=tmp_path,
            env=environment(),
            capture_output=True,
            text=True,
            timeout=120,
            check=False,
        )
    assert done.returncode == 1
    line = f"ginnel: ginnel listen is running already with {tmp_path / 'listening'} (process {process.pid}): "
    assert done.stderr == line + "end it first\n"


def test_systemd_is_told_when_it_is_ready_and_the_watchdog_is_fed_while_samples_flow(tmp_path: Path) -> None:
    write_settings(tmp_path, PIPE)
    with socket.socket(socket.AF_UNIX, socket.SOCK_DGRAM) as ear, Recorder(tmp_path / "samples") as recorder:
        ear.bind(str(tmp_path / "notify"))
        ear.settimeout(60)
        variables = {"NOTIFY_SOCKET": str(tmp_path / "notify"), "WATCHDOG_USEC": "3000000"}
        with listening(tmp_path, **variables) as process:
            assert ear.recv(1000) == b"READY=1\nSTATUS=listening"
            assert ear.recv(1000) == b"WATCHDOG=1"
            assert ear.recv(1000) == b"WATCHDOG=1"
            recorder.is_silent = True
            # whatever was under way is over, then it is hungry
            ear.settimeout(4)
            with pytest.raises(TimeoutError):
                list(iter(lambda: ear.recv(1000), b""))
            ear.settimeout(60)
            recorder.is_silent = False
            assert ear.recv(1000) == b"WATCHDOG=1"
            process.terminate()
            assert process.wait(60) == 0
            heard = b""
            while heard != b"STOPPING=1":
                heard = ear.recv(1000)


def test_a_folder_that_may_only_be_read_is_heard_all_the_same(tmp_path: Path) -> None:
    captures = tmp_path / "captures"
    write_minute(captures, 0)
    write_settings(tmp_path, FOLDER + '\nafter = "archive"\narchive = "/proc/nowhere"')
    with listening(tmp_path) as process:
        wait_until(lambda: len(passages(tmp_path)) == 2, process)
        wait_until(lambda: "what was heard cannot be taken away" in said(tmp_path), process)
    assert len(list(captures.iterdir())) == 1
