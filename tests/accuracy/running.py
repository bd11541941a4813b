"""Work shared out to worker processes, and rows scored there."""

from __future__ import annotations

import multiprocessing
import os
from collections.abc import Callable, Sequence
from concurrent.futures import ProcessPoolExecutor, as_completed
from typing import TypeVar

from tests.accuracy.cases import Row
from tests.accuracy.scoring import Outcome, score

Result = TypeVar("Result")
OnProgress = Callable[[int, int], None]


def in_workers(
    calls: Sequence[Callable[[], Result]], jobs: int, on_progress: OnProgress = lambda done, n: None
) -> list[Result]:
    """Results of calls that can be pickled, in their order, whoever comes first."""
    # Each worker keeps to one core: the libraries read this when they are loaded there.
    os.environ["OPENBLAS_NUM_THREADS"] = os.environ["OMP_NUM_THREADS"] = "1"
    with ProcessPoolExecutor(jobs, mp_context=multiprocessing.get_context("spawn")) as pool:
        futures = [pool.submit(call) for call in calls]
        for done, _ in enumerate(as_completed(futures), start=1):
            on_progress(done, len(futures))
        return [future.result() for future in futures]


def seeds_of(row: Row, n_seeds: int | None, first_seed: int) -> range:
    """Seeds of a row's scenes: so many, or its own number."""
    return range(first_seed, first_seed + (n_seeds or row.seeds))


def score_one(row: Row, seed: int) -> Outcome:
    """Make a case and score it."""
    return score(row.make(seed))
