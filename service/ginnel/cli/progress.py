"""A progress bar on a terminal; nothing in a pipe or with --quiet."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager

import click


@contextmanager
def progress(label: str, total: float, *, quiet: bool) -> Iterator[Callable[[float], None]]:
    """Show how much of a total is done; the function given takes what was done since the last call."""
    if quiet or not sys.stderr.isatty():
        yield lambda done: None
        return
    steps = 1000
    shown = 0.0
    with click.progressbar(length=steps, label=label, file=sys.stderr, show_pos=False) as bar:

        def advance(done: float) -> None:
            nonlocal shown
            before = int(shown)
            shown = min(shown + steps * done / max(total, 1e-9), steps)
            bar.update(int(shown) - before)

        yield advance
        bar.update(steps - int(shown))
