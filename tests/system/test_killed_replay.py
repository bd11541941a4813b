"""A replay that is killed outright leaves whole spans, and started again gives the same rows."""

from __future__ import annotations

import signal
import sqlite3
import subprocess
import time
from contextlib import closing
from pathlib import Path

from tests.system.conftest import SETTINGS, command, environment, write_minute

SPANS = 6
POLL_S = 0.002
PATIENCE_S = 120.0


def dump(database: Path) -> list[str]:
    """Every table and row, as SQL text."""
    with closing(sqlite3.connect(database)) as connection:
        return list(connection.iterdump())


def spans_stored(database: Path) -> int:
    if not database.exists():
        return 0
    try:
        with closing(sqlite3.connect(f"file:{database}?mode=ro", uri=True)) as connection:
            return int(connection.execute("SELECT count(*) FROM span").fetchone()[0])
    except sqlite3.OperationalError:  # no tables yet
        return 0


def start(folder: Path) -> subprocess.Popen[bytes]:
    return subprocess.Popen(
        command("replay", "../captures", "--quiet"),
        cwd=folder,
        env=environment(),
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
    )


def test_killed_and_started_again_gives_the_same_rows(tmp_path: Path) -> None:
    for number in range(SPANS):  # two minutes apart: a span each
        write_minute(tmp_path / "captures", 2 * number, seed=number)
    for name in ("calm", "killed"):
        (tmp_path / name).mkdir()
        (tmp_path / name / "ginnel.toml").write_text(SETTINGS, "utf-8")
    calm = start(tmp_path / "calm")
    assert calm.wait(PATIENCE_S) == 0
    expected = dump(tmp_path / "calm/ginnel.db")
    assert sum(line.startswith('INSERT INTO "passage"') for line in expected) == 2 * SPANS

    database = tmp_path / "killed/ginnel.db"
    # once before anything is stored, then each time after one more span
    for wanted in (0, 1, 2, 3):
        replay = start(tmp_path / "killed")
        deadline = time.monotonic() + PATIENCE_S
        while spans_stored(database) < wanted or not database.exists():
            assert time.monotonic() < deadline
            assert replay.poll() is None, "it ended before it could be killed"
            time.sleep(POLL_S)
        replay.send_signal(signal.SIGKILL)
        assert replay.wait(PATIENCE_S) == -signal.SIGKILL
        left = [line for line in dump(database) if line.startswith("INSERT")]
        assert set(left) <= set(expected), "only whole, final rows"
        passages = sum(line.startswith('INSERT INTO "passage"') for line in left)
        assert passages == 2 * spans_stored(database), "each span with all of its passages"

    last = start(tmp_path / "killed")
    assert last.wait(PATIENCE_S) == 0
    assert dump(database) == expected
