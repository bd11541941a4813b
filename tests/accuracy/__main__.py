"""Score the chain on all scenarios and print the scoreboard in Markdown."""

from __future__ import annotations

import argparse
import fnmatch
import sys
import time
from collections.abc import Callable, Sequence
from functools import partial
from pathlib import Path

from tests.accuracy import calibration, rates, recorded
from tests.accuracy.board import ROWS, table
from tests.accuracy.cases import Kindness, Row
from tests.accuracy.running import in_workers, score_one, seeds_of
from tests.accuracy.scoring import Outcome

from ginnel.chain import CHAIN_VERSION
from ginnel.words import Channels

_RECORDED: tuple[Callable[[], str], ...] = (
    partial(recorded.corridor, Channels.MONO),
    partial(recorded.corridor, Channels.IQ),
    recorded.roadside,
    recorded.room,
)
_INTRODUCTION = """\
Made by `python -m tests.accuracy`; chain version {version}, {took:.0f} s. Each figure stands beside its goal.
*met* and **missed** say whether it was reached; with a question mark so few passages (or hours) do not
exclude the other at 95 % (Wilson). A true and a found crossing within 3 s are a pair, one to one.

In a *hard* scene the sensor hangs otherwise than the chain is told, and beam, bodies, limbs, ways, walls and
receiver are as `tests/accuracy/hardness.py` draws them. A peak SNR is there that of an average body at the
best place of an uneven beam: each walker's own lies about it, by 3 dB and more.
"""


def main() -> None:
    """Parse the arguments, do what is asked for, print and write the scoreboard."""
    parser = argparse.ArgumentParser(prog="python -m tests.accuracy", description=__doc__)
    parser.add_argument(
        "--rows", metavar="PATTERN", help="only rows whose title fits, e.g. '*mono*', and nothing else"
    )
    parser.add_argument("--seeds", type=int, metavar="N", help="scenes a row (default: as each row says)")
    parser.add_argument("--first-seed", type=int, default=0, metavar="N", help="seed of the first scene")
    parser.add_argument("--jobs", type=int, default=2, metavar="N", help="processes (default: 2)")
    parser.add_argument("--fast", action="store_true", help="one scene a row")
    parser.add_argument("--output", type=Path, metavar="FILE", help="also write the scoreboard there")
    given = parser.parse_args()
    if given.jobs < 1 or (given.seeds is not None and given.seeds < 1) or given.first_seed < 0:
        parser.error("--jobs and --seeds must be at least 1, --first-seed at least 0")
    rows = [row for row in ROWS if fnmatch.fnmatch(row.title, given.rows or "*")]
    if not rows:
        titles = "\n  ".join(row.title for row in ROWS)
        parser.error(f"no row's title fits {given.rows!r}; there are:\n  {titles}")
    text = board(
        rows,
        n_seeds=1 if given.fast else given.seeds,
        first_seed=given.first_seed,
        jobs=given.jobs,
        is_whole=given.rows is None,
    )
    print(text)
    if given.output:
        given.output.write_text(text, encoding="utf-8")


def board(rows: Sequence[Row], *, n_seeds: int | None, first_seed: int, jobs: int, is_whole: bool) -> str:
    """The scoreboard of some rows; the whole one also has sample rates and real data."""
    started = time.monotonic()
    of_row = [number for number, row in enumerate(rows) for _ in seeds_of(row, n_seeds, first_seed)]
    scenes = [partial(score_one, row, seed) for row in rows for seed in seeds_of(row, n_seeds, first_seed)]
    captures = [partial(rates.passages_at, rate_hz) for rate_hz in rates.RATES_HZ] if is_whole else []
    data = _RECORDED if is_whole else ()
    # What takes longest goes first: the others fill the gaps.
    calls: list[Callable[[], object]] = [*reversed(captures), *data, *scenes]
    results = iter(in_workers(calls, jobs, _show_progress))
    found = [next(results) for _ in captures][::-1]
    lines = [next(results) for _ in data]
    outcomes = [Outcome() for _ in rows]
    for number in of_row:
        outcomes[number] += next(results)  # type: ignore[operator]  # the scenes' results come last
    took_s = time.monotonic() - started
    parts = [
        "# How right the chain counts",
        _INTRODUCTION.format(version=CHAIN_VERSION, took=took_s).strip(),
        table(list(zip(rows, outcomes, strict=True))),
    ]
    if is_whole:
        parts += ["## One scene at several sample rates", rates.table(found)]  # type: ignore[arg-type]
        parts += ["## Real people and real recordings", recorded.table(lines)]  # type: ignore[arg-type]
    groups = [
        (str(kindness), [pair for row, one in zip(rows, outcomes, strict=True) for pair in one.pairs
                         if row.kindness is kindness])
        for kindness in Kindness
    ]  # fmt: skip
    parts += ["## Does it know how sure it is?", calibration.report(groups)]
    return "\n\n".join(parts) + "\n"


def _show_progress(done: int, n: int) -> None:
    if sys.stderr.isatty():
        print(f"\r{done}/{n}", end="\n" if done == n else "", file=sys.stderr)


if __name__ == "__main__":
    main()
