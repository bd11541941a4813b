"""Server time of every page over years of passages, and how the database finds what they ask for.

    GINNEL_BENCH_PASSAGES=10000000 GINNEL_BENCH_DIR=/var/tmp pytest tests/bench/test_pages.py -n 0 -s

Times are printed, not judged: machines differ. What is judged is that no question walks through all passages.
"""

from __future__ import annotations

import os
import sqlite3
import statistics
import time
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest
from sqlalchemy import event
from tests.bench.years import SENSOR, build

from ginnel.config import Settings, load_settings
from ginnel.store.engine import Store
from ginnel.web.app import create_app

N_PASSAGES = int(os.environ.get("GINNEL_BENCH_PASSAGES", "20000"))
TURNS = 6 if "GINNEL_BENCH_PASSAGES" in os.environ else 2
ADDRESSES = (
    "/",
    *(
        f"/{page}?sensor={SENSOR.name}&show={show}&on=2025-03-05"
        for page in ("busy", "fast", "full", "one-by-one", "sure", "take-away", "side-by-side")
        for show in ("day", "week", "month", "year")
    ),
    *(
        f"/{page}?sensor={SENSOR.name}&show=range&on=2021-01-04&to=2025-12-30"
        for page in ("busy", "fast", "sure")
    ),
)


@pytest.fixture(scope="module")
def settings(tmp_path_factory: pytest.TempPathFactory) -> Settings:
    folder = Path(os.environ.get("GINNEL_BENCH_DIR") or tmp_path_factory.mktemp("years"))
    file = tmp_path_factory.mktemp("settings") / "ginnel.toml"
    file.write_text(f'[store]\nurl = "{build(folder, N_PASSAGES)}"\n', "utf-8")
    return load_settings(file)


def asked_of(store: Store, act: Callable[[], object]) -> list[tuple[str, Any]]:
    """Statements that an act sends to the database, with their values."""
    heard: list[tuple[str, Any]] = []

    def listen(_connection: object, _cursor: object, statement: str, values: Any, *_: object) -> None:
        heard.append((statement, values))

    engine = store._engine
    event.listen(engine, "before_cursor_execute", listen)
    try:
        act()
    finally:
        event.remove(engine, "before_cursor_execute", listen)
    return heard


@pytest.mark.slow
def test_pages_over_years(settings: Settings, record_property: Callable[[str, object], None]) -> None:
    app = create_app(settings)
    client = app.test_client()
    store: Store = app.extensions["ginnel.store"]
    file = settings.store.url.removeprefix("sqlite:///")
    lines = [
        f"Server time over {N_PASSAGES} passages and five years, ms: median of the later turns, and the first"
    ]
    walks = set()
    with sqlite3.connect(file) as plain:
        for address in ADDRESSES:
            times_ms = []
            for turn in range(TURNS):
                started = time.perf_counter()
                if turn == 0:
                    for statement, values in asked_of(store, lambda: client.get(address)):  # noqa: B023 (at once)
                        for row in plain.execute(f"EXPLAIN QUERY PLAN {statement}", values):
                            if row[3].startswith(("SCAN passage", "SCAN hour_passages", "SCAN health")):
                                walks.add((address.split("?")[0], statement[:120], row[3]))
                else:
                    assert client.get(address).status_code == 200
                times_ms.append(1000 * (time.perf_counter() - started))
            lines.append(f"{statistics.median(times_ms[1:]):8.1f} {times_ms[0]:8.1f}  {address}")
    store.close()
    record_property("table", "\n".join(lines))
    assert walks == set()
