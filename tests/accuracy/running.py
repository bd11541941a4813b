"""Rows scored in worker processes."""

from __future__ import annotations

import multiprocessing
import os
from collections.abc import Callable, Sequence
from concurrent.futures import ProcessPoolExecutor, as_completed

from tests.accuracy.cases import Row
from tests.accuracy.scoring import Outcome, score

OnProgress = Callable[[int, int], None]


def run(
    rows: Sequence[Row],
    *,
    n_seeds: int | None = None,
    first_seed: int = 0,
    jobs: int = 2,
    on_progress: OnProgress = lambda done, n: None,
) -> list[Outcome]:
    """Score rows, each on so many seeds (its own number if not given); one outcome a row, in order."""
    # Each worker keeps to one core: the libraries read this when they are loaded there.
    os.environ["OPENBLAS_NUM_THREADS"] = os.environ["OMP_NUM_THREADS"] = "1"
    numbers = [number for number, row in enumerate(rows) for _ in range(n_seeds or row.seeds)]
    seeds = [first_seed + seed for row in rows for seed in range(n_seeds or row.seeds)]
    with ProcessPoolExecutor(jobs, mp_context=multiprocessing.get_context("spawn")) as pool:
        futures = [
            pool.submit(run_one, rows[number], seed) for number, seed in zip(numbers, seeds, strict=True)
        ]
        for done, _ in enumerate(as_completed(futures), start=1):
            on_progress(done, len(futures))
    # Summed in order of the seeds, whoever came first.
    sums = [Outcome() for _ in rows]
    for number, future in zip(numbers, futures, strict=True):
        sums[number] += future.result()
    return sums


def run_one(row: Row, seed: int) -> Outcome:
    """Make a case and score it."""
    return score(row.make(seed))
