"""How fast passages are exported, as a share of what DuckDB's COPY needs for the same rows, in the same run.

    pytest tests/bench/bench_export.py -n 0 -s

The baseline has the rows in memory already, typed; ours reads them from SQLite. DuckDB works with one thread,
as ours does. The goal for CSV is a ratio of at least 0.2. ``GINNEL_BENCH_ROWS`` sets the number of rows
(200 000), and with 10 000 000 shows that memory does not grow: the last line tells the peak of a process.
"""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import duckdb
import numpy as np
import pytest
from sqlalchemy import insert

from ginnel.export import Format, Question, passages_table, write
from ginnel.store import Store, open_store, put_site, record_span
from ginnel.store.tables import PassageRow
from ginnel.words import Sensor, Site, Span

N_ROWS = int(os.environ.get("GINNEL_BENCH_ROWS", "200000"))
STARTED_US = 1_772_323_200_000_000  # 2026-03-01
ENDED_US = STARTED_US + 2 * 365 * 86_400_000_000
SENSORS = ("north", "south")
AT_ONCE = 100_000


@pytest.fixture(scope="module")
def file(tmp_path_factory: pytest.TempPathFactory) -> Path:
    path = tmp_path_factory.mktemp("bench") / "ginnel.db"
    rng = np.random.default_rng(1)
    with open_store(f"sqlite:///{path}", create=True) as store:
        put_site(store, Site(name="Tannery annex", timezone="Europe/Dublin"))
        for number, name in enumerate(SENSORS, start=1):
            span = Span(started_us=STARTED_US, ended_us=ENDED_US, sample_rate_hz=8000.0)
            record_span(store, Sensor(name=name), span, [], "1")
            for crossed_us in np.array_split(_moments(rng), max(N_ROWS // 2 // AT_ONCE, 1)):
                with store.writing() as connection:
                    connection.execute(insert(PassageRow), _rows(rng, number, crossed_us))
    return path


def _moments(rng: np.random.Generator) -> np.ndarray[Any, np.dtype[np.int64]]:
    gaps_us = rng.exponential((ENDED_US - STARTED_US) / (N_ROWS // 2 + 1), N_ROWS // 2).astype(np.int64) + 1
    return STARTED_US + np.cumsum(gaps_us)


def _rows(
    rng: np.random.Generator, sensor_id: int, crossed_us: np.ndarray[Any, np.dtype[np.int64]]
) -> list[dict[str, int]]:
    n = len(crossed_us)
    columns = {
        "sensor_id": np.full(n, sensor_id),
        "crossed_us": crossed_us,
        "started_us": crossed_us - 1_500_000,
        "ended_us": crossed_us + 1_500_000,
        "reading_id": np.full(n, sensor_id),
        "story": np.zeros(n, np.int64),
        "direction": rng.integers(0, 3, n),
        "mover": rng.integers(1, 3, n),
        "flags": rng.choice([0, 0, 0, 4, 6], n),
        "direction_confidence_ppm": rng.integers(500_000, 1_000_000, n),
        "speed_umps": rng.integers(300_000, 3_000_000, n),
        "speed_se_umps": rng.integers(1_000, 90_000, n),
        "snr_mdb": rng.integers(-5_000, 30_000, n),
    }
    return [
        dict(zip(columns, row, strict=True))
        for row in zip(*(c.tolist() for c in columns.values()), strict=True)
    ]


@pytest.fixture
def store(file: Path) -> Iterator[Store]:
    with open_store(f"sqlite:///{file}", read_only=True) as opened:
        yield opened


@pytest.fixture(scope="module")
def baseline(file: Path) -> Iterator[Callable[[Path, str], None]]:
    """DuckDB with the rows in memory, and its COPY to a file."""
    csv = file.with_name("rows.csv")
    with open_store(f"sqlite:///{file}", read_only=True) as store:
        write(store, [passages_table(store, Question())], csv)
    with duckdb.connect() as connection:
        connection.execute("set threads = 1")
        connection.execute(f"create table rows as select * from read_csv('{csv}')")

        def copy(path: Path, options: str) -> None:
            connection.execute(f"copy rows to '{path}' ({options})")

        yield copy


@pytest.mark.parametrize(
    ("kind", "options"),
    [(Format.CSV, "format csv, header"), (Format.JSONL, "format json"), (Format.PARQUET, "format parquet")],
)
def test_export_beside_duckdb(
    benchmark: Any,
    store: Store,
    baseline: Callable[[Path, str], None],
    tmp_path: Path,
    kind: Format,
    options: str,
) -> None:
    from time import perf_counter

    def best(work: Callable[[], object]) -> float:
        times = []
        for _ in range(3):
            started = perf_counter()
            work()
            times.append(perf_counter() - started)
        return min(times)

    baseline_s = best(lambda: baseline(tmp_path / "baseline", options))
    n_rows = benchmark.pedantic(
        lambda: write(store, [passages_table(store, Question())], tmp_path / "ours", kind), rounds=3
    )
    ours_s = benchmark.stats.stats.min
    assert n_rows == N_ROWS
    benchmark.extra_info |= {"rows_per_s": round(n_rows / ours_s), "of_duckdb": round(baseline_s / ours_s, 3)}
    print(f"\n{kind.value}: {n_rows / ours_s:,.0f} rows/s, {baseline_s / ours_s:.2f} of DuckDB's COPY")


def test_memory_of_an_export(file: Path, tmp_path: Path) -> None:
    code = (
        "import re, sys\n"
        "from pathlib import Path\n"
        "from ginnel.export import Question, passages_table, write\n"
        "from ginnel.store import open_store\n"
        "store = open_store(sys.argv[1], read_only=True)\n"
        "status = Path('/proc/self/status')\n"
        "peak = lambda: int(re.search(r'VmHWM:\\s*(\\d+)', status.read_text())[1]) // 1024\n"
        "before = peak()\n"
        "n = write(store, [passages_table(store, Question())], Path(sys.argv[2]))\n"
        "print(n, before, peak())\n"
    )
    arguments = [sys.executable, "-c", code, f"sqlite:///{file}", str(tmp_path / "rows.csv")]
    n, before, peak = map(int, subprocess.run(arguments, capture_output=True, check=True).stdout.split())
    assert n == N_ROWS
    print(f"\nCSV of {n:,} rows: {before} MB with all imported, {peak} MB at the peak")
