"""`ginnel listen` killed outright, again and again: nothing doubled, nothing that was stored lost.

GINNEL_KILLS says how often (10 without it); the long form is GINNEL_KILLS=200.
"""

from __future__ import annotations

import os
import random
import signal
import sqlite3
import subprocess
import time
from collections.abc import Callable
from contextlib import closing
from itertools import pairwise
from pathlib import Path

import pytest
from tests.system.conftest import command, environment, write_minute
from tests.system.listening import (
    EVERY_S,
    FOLDER,
    PIPE,
    Recorder,
    listening,
    passages,
    said,
    spans,
    wait_until,
    write_settings,
)

from ginnel.store.codes import FLAG_BITS, STORY_CODES
from ginnel.words import US_PER_S, Flag, Story

#: As the store writes them: a story, and the flag of what the end of a span has cut.
PASSAGE, CUT = STORY_CODES[Story.PASSAGE], FLAG_BITS[Flag.CUT]
KILLS = int(os.environ.get("GINNEL_KILLS", "10"))
Tell = Callable[[str, object], None]


def kill(process: subprocess.Popen[str]) -> None:
    process.send_signal(signal.SIGKILL)
    assert process.wait(60) == -signal.SIGKILL


@pytest.mark.slow
def test_a_pipe_loses_only_what_nobody_could_hear(tmp_path: Path, record_property: Tell) -> None:
    write_settings(tmp_path, PIPE)
    chance = random.Random(4)
    down: list[tuple[float, float]] = []  # killed, and next heard
    kept: set[tuple[int, ...]] = set()
    with Recorder(tmp_path / "samples") as recorder:
        killed_at = 0.0
        for number in range(KILLS + 1):
            with listening(tmp_path) as process:
                begun = said(tmp_path).count("listening since")
                if number and number % 3 == 0:  # now and then before it has come to hear anything
                    time.sleep(chance.uniform(0.0, 2.0))
                    kill(process)
                    continue
                wait_until(lambda: said(tmp_path).count("listening since") > begun, process)  # noqa: B023
                if killed_at:
                    down.append((killed_at, time.time()))
                if number == KILLS:
                    n_before = len(passages(tmp_path))
                    wait_until(lambda: len(passages(tmp_path)) > n_before, process)  # noqa: B023
                    process.terminate()
                    assert process.wait(60) == 0
                    break
                time.sleep(chance.uniform(0.5, EVERY_S))
                killed_at = time.time()
                kill(process)
            stored = set(passages(tmp_path))
            assert kept <= stored, "what was stored is never lost or changed"
            kept = stored
    found, heard = passages(tmp_path), spans(tmp_path)
    # each once: who was heard whole from one side to the other is one walker of those that there were
    whole = [row for row in found if row[1] == PASSAGE and not row[2] & CUT]
    which = [round((row[0] / 1e6 - recorder.began_s) / EVERY_S - 0.5) for row in whole]
    assert len(set(which)) == len(which), found
    assert all(a[1] <= b[0] for a, b in pairwise(heard)), "spans never overlap"
    gaps = [(b[0] - a[1]) / US_PER_S for a, b in pairwise(heard)]
    # the gap is seen: each time nobody listened is missing, and hardly more than that
    beyond = [gap - _overlap_s(a[1], b[0], down) for gap, (a, b) in zip(gaps, pairwise(heard), strict=True)]
    record_property(
        "table",
        f"pipe: killed {KILLS} times, {len(found)} movers, none twice; gaps of {min(gaps):.1f} to "
        f"{max(gaps):.1f} s, at most {max(beyond):.1f} s more than the time without a process",
    )
    assert max(beyond) <= 10.0


def _overlap_s(start_us: int, end_us: int, down: list[tuple[float, float]]) -> float:
    """How much of a gap the process was not there, or not yet listening."""
    return sum(max(0.0, min(end_us / 1e6, up) - max(start_us / 1e6, gone)) for gone, up in down)


@pytest.mark.slow
def test_a_folder_misses_nothing_at_all(tmp_path: Path, record_property: Tell) -> None:
    calm, killed = tmp_path / "calm", tmp_path / "killed"
    for folder in (calm, killed):
        folder.mkdir()
        write_settings(folder, FOLDER.replace("captures", "../captures"))
    n_files = 5 if KILLS <= 10 else 40
    for minute in range(n_files):  # unbroken, but for one hole
        write_minute(tmp_path / "captures", minute + (minute > n_files // 2), seed=minute % 8)
    done = subprocess.run(
        command("replay", "../captures", "--quiet"), cwd=calm, env=environment(), timeout=600, check=False
    )
    assert done.returncode == 0
    expected = passages(calm)
    chance = random.Random(5)
    n_kills = 0
    for _ in range(KILLS):
        with listening(killed) as process:
            if chance.random() < 0.7:  # in the midst of reading; else before it has begun
                wait_until(lambda: "listening to lane" in said(killed), process)
            time.sleep(chance.uniform(0.0, 1.5))
            kill(process)
            n_kills += 1
        (killed / "log").rename(killed / f"log-{n_kills}")
        left = passages(killed)
        assert len({row[0] for row in left}) == len(left)
        assert set(left) <= set(expected), "nothing that a replay would not find"
    with listening(killed) as process:
        wait_until(lambda: passages(killed) == expected, process, patience_s=90.0 + 20.0 * n_files)
        process.terminate()
        assert process.wait(60) == 0
    assert passages(killed) == expected
    missing_s = sum(b - a for a, b in spans(calm)) - sum(b - a for a, b in spans(killed))
    record_property(
        "table",
        f"folder: killed {n_kills} times in {n_files} minutes of capture, {len(expected)} passages, all "
        f"equal to the replay's; {missing_s / US_PER_S:.1f} s at the open end of the last file still to come",
    )
    # every second of coverage is there, but for the end of the last file, which the next may go on from
    assert spans(killed)[0] == spans(calm)[0]
    assert missing_s <= 10 * US_PER_S
    with closing(sqlite3.connect(killed / "ginnel.db")) as store:
        assert store.execute("PRAGMA integrity_check").fetchone() == ("ok",)
