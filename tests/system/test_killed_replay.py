"""A replay that is killed outright leaves whole spans, and started again gives the same rows."""

from __future__ import annotations

import signal
import sqlite3
import subprocess
import time
from contextlib import closing
from pathlib import Path

from tests.system.conftest import SETTINGS, command, environment, write_minute

SPANS = 4
POLL_S = 0.002
PATIENCE_S = 120.0


def dump(database: Path) -> list[str]:
    """Every table and row, as SQL text."""
    with closing(sqlite3.connect(database)) as connection:
        return list(connection.iterdump())


def passages_by_span(database: Path) -> dict[int, int]:
    """Number of passages in each span, by its start."""
    with closing(sqlite3.connect(database)) as connection:
        spans = connection.execute("SELECT started_us, ended_us FROM span").fetchall()
        count = "SELECT count(*) FROM passage WHERE started_us >= ? AND started_us < ?"
        return {start: int(connection.execute(count, (start, end)).fetchone()[0]) for start, end in spans}


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
    for number in range(SPANS):  # two minutes apart: a span each, with one walker
        write_minute(tmp_path / "captures", 2 * number, seed=number, duration_s=30.0)
    for name in ("calm", "killed"):
        (tmp_path / name).mkdir()
        (tmp_path / name / "ginnel.toml").write_text(SETTINGS, "utf-8")
    calm = start(tmp_path / "calm")
    assert calm.wait(PATIENCE_S) == 0
    expected = dump(tmp_path / "calm/ginnel.db")
    whole = passages_by_span(tmp_path / "calm/ginnel.db")
    assert len(whole) == SPANS
    assert all(whole.values()), "a walker in each, whatever else was found"

    database = tmp_path / "killed/ginnel.db"
    # each time after one more span than before; the first kill finds the second span half read
    for wanted in (1, 2, 3):
        replay = start(tmp_path / "killed")
        deadline = time.monotonic() + PATIENCE_S
        while spans_stored(database) < wanted:
            assert time.monotonic() < deadline
            assert replay.poll() is None, "it ended before it could be killed"
            time.sleep(POLL_S)
        replay.send_signal(signal.SIGKILL)
        assert replay.wait(PATIENCE_S) == -signal.SIGKILL
        left = [line for line in dump(database) if line.startswith("INSERT")]
        assert set(left) <= set(expected), "only whole, final rows"
        assert passages_by_span(database).items() <= whole.items(), "each span with all of its passages"

    last = start(tmp_path / "killed")
    assert last.wait(PATIENCE_S) == 0
    assert dump(database) == expected
