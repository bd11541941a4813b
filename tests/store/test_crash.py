"""Killed writers and writers at once: the log is always a whole one."""

from __future__ import annotations

import signal
import subprocess
import sys
import threading
from dataclasses import replace

import pytest

from ginnel.errors import StoreError
from ginnel.store import SpanChange, Store, iter_passages, open_store, put_sensor, record_span, spans
from ginnel.words import Direction, Passage, Sensor, Span

S = 1_000_000
NORTH = Sensor(name="north")
SPAN = Span(started_us=0, ended_us=1000 * S, sample_rate_hz=8000.0)
PASSAGES = [
    Passage(
        started_us=i * S,
        crossed_us=i * S,
        ended_us=i * S + 1,
        direction=Direction.APPROACHING,
        direction_confidence=None,
        speed_mps=(1000 + i) / 1000,
        speed_se_mps=None,
        snr_db=None,
    )
    for i in range(500)
]

# A writer that stops in the middle of its transaction, after rows went out, and waits to be killed.
HALF_WAY = """
import sys, time
from sqlalchemy import event
from ginnel.store import open_store, record_span
from ginnel.words import Sensor, Span, Passage, Direction
passages = [
    Passage(started_us=i, crossed_us=i, ended_us=i, direction=Direction.UNKNOWN, direction_confidence=None,
            speed_mps=None, speed_se_mps=None, snr_db=None)
    for i in range(5)
]
store = open_store(sys.argv[1])

@event.listens_for(store._engine, "commit")
def stop(connection):
    print("half way", flush=True)
    time.sleep(600)

span = Span(started_us=0, ended_us=1000, sample_rate_hz=8000.0)
record_span(store, Sensor(name="north"), span, passages, "2")
"""


def test_a_writer_killed_before_its_commit_leaves_the_log_as_it_was(store: Store, store_url: str) -> None:
    record_span(store, NORTH, replace(SPAN, ended_us=1000), [], "1")
    child = subprocess.Popen(
        [sys.executable, "-c", HALF_WAY, store_url], stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True
    )
    with child:
        assert child.stdout is not None
        assert child.stderr is not None
        told = child.stdout.readline()
        child.send_signal(signal.SIGKILL)
        assert told == "half way\n", child.stderr.read()
    assert [(one.span.ended_us, one.chain_version) for one in spans(store)] == [(1000, "1")]
    assert list(iter_passages(store)) == []
    # and the next writer is not kept out
    assert record_span(store, NORTH, SPAN, PASSAGES, "2") == SpanChange(added=500)
    assert [one.passage for one in iter_passages(store)] == PASSAGES


@pytest.mark.parametrize("known", [True, False], ids=["known sensor", "new sensor"])
def test_a_replay_run_twice_at_once_stores_each_passage_once(
    store: Store, store_url: str, known: bool
) -> None:
    if known:
        put_sensor(store, NORTH)
    start = threading.Barrier(3)
    changes: list[SpanChange | StoreError] = []

    def replay() -> None:
        with open_store(store_url) as own:
            start.wait()
            try:
                changes.append(record_span(own, NORTH, SPAN, PASSAGES, "1"))
            except StoreError as error:
                changes.append(error)

    threads = [threading.Thread(target=replay) for _ in range(3)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert sorted(changes, key=str) == [
        SpanChange(added=500),
        SpanChange(kept=500, already_stored=True),
        SpanChange(kept=500, already_stored=True),
    ]
    assert [one.passage for one in iter_passages(store)] == PASSAGES
    assert len(spans(store)) == 1


@pytest.mark.parametrize("cut", [1, 250, 499])
def test_a_replay_stopped_between_spans_and_run_again_gives_the_same_rows(store: Store, cut: int) -> None:
    parts = [
        (replace(SPAN, ended_us=cut * S), PASSAGES[:cut]),
        (replace(SPAN, started_us=cut * S), PASSAGES[cut:]),
    ]
    parts[0] = (parts[0][0], [replace(one, ended_us=min(one.ended_us, cut * S)) for one in parts[0][1]])
    record_span(store, NORTH, *parts[0], "1")  # then it was stopped
    for span, passages in parts:
        record_span(store, NORTH, span, passages, "1")
    assert [one.passage for one in iter_passages(store)] == PASSAGES
    assert [one.span for one in spans(store)] == [span for span, _ in parts]
