"""Score the chain on all scenarios and print the table in Markdown: `python -m tests.accuracy --help`."""

from __future__ import annotations

import argparse
import fnmatch
import sys
import time
from pathlib import Path

from tests.accuracy.board import ROWS, table
from tests.accuracy.running import run

from ginnel.chain import CHAIN_VERSION


def main() -> None:
    """Parse the arguments, run what is asked for, print and write the table."""
    parser = argparse.ArgumentParser(prog="python -m tests.accuracy", description=__doc__)
    parser.add_argument("--rows", default="*", metavar="PATTERN", help="rows whose title fits, e.g. '*mono*'")
    parser.add_argument("--seeds", type=int, metavar="N", help="scenes a row (default: as each row says)")
    parser.add_argument("--first-seed", type=int, default=0, metavar="N", help="seed of the first scene")
    parser.add_argument("--jobs", type=int, default=2, metavar="N", help="processes")
    parser.add_argument("--fast", action="store_true", help="one scene a row")
    parser.add_argument("--output", type=Path, metavar="FILE", help="also write the table there")
    given = parser.parse_args()
    rows = [row for row in ROWS if fnmatch.fnmatch(row.title, given.rows)]
    if not rows:
        parser.error(f"no row's title fits {given.rows!r}; there are: {'; '.join(row.title for row in ROWS)}")
    n_seeds = 1 if given.fast else given.seeds
    started = time.monotonic()
    outcomes = run(
        rows, n_seeds=n_seeds, first_seed=given.first_seed, jobs=given.jobs, on_progress=_show_progress
    )
    results = list(zip(rows, outcomes, strict=True))
    text = f"Chain version {CHAIN_VERSION}, {time.monotonic() - started:.0f} s.\n\n{table(results)}\n"
    print(text)
    if given.output:
        given.output.write_text(text)


def _show_progress(done: int, n: int) -> None:
    if sys.stderr.isatty():
        print(f"\r{done}/{n}", end="\n" if done == n else "", file=sys.stderr)


if __name__ == "__main__":
    main()
