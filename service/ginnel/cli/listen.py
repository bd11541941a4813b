"""`ginnel listen`: the daemon."""

from __future__ import annotations

import os
from pathlib import Path

import click

from ginnel.cli.options import config_option


@click.command()
@config_option
@click.option("--quiet", "-q", is_flag=True, help="Warnings and errors only.")
def listen(config_file: Path | None, quiet: bool) -> None:
    """Listen to all sensors of the settings, and log who passes, until stopped.

    SIGTERM and Ctrl-C end it in good order; SIGHUP makes it read the settings again. It tells what it does
    on standard error, fit for the journal.
    """
    # sensors run side by side already; more threads inside each would only cost memory
    os.environ.setdefault("OPENBLAS_NUM_THREADS", "1")
    from ginnel.daemon.journal import log_to_stderr
    from ginnel.daemon.listen import listen as run

    log_to_stderr(is_quiet=quiet)
    if not run(config_file):
        click.get_current_context().exit(1)
