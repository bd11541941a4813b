"""`ginnel export`: the log as files that others can read."""

from __future__ import annotations

import sys
from datetime import datetime
from pathlib import Path

import click

from ginnel.cli.options import Moment, config_option, moment_us

_INTERVALS = ["5min", "15min", "hour", "day", "week", "month"]


@click.command()
@click.argument("table", type=click.Choice(["passages", "counts", "speeds"]))
@config_option
@click.option("--sensor", "sensors", metavar="NAME", multiple=True, help="Only this sensor; may be repeated.")
@click.option("--from", "start", type=Moment(), help="First moment; site time unless it has an offset.")
@click.option(
    "--to", "end", type=Moment(), help="First moment that is left out; a day alone is its midnight."
)
@click.option(
    "--every", type=click.Choice(_INTERVALS), default="hour", show_default=True, help="Length of an interval."
)
@click.option(
    "--format", "kind", type=click.Choice(["csv"]), default="csv", show_default=True, help="Kind of file."
)
@click.option("--uncounted", is_flag=True, help="Passages: turn-backs and fidgeting too, which do not count.")
@click.option(
    "--output", type=click.Path(path_type=Path, dir_okay=False), help="The file; without it, standard output."
)
def export(
    table: str,
    config_file: Path | None,
    sensors: tuple[str, ...],
    start: datetime | None,
    end: datetime | None,
    every: str,
    kind: str,
    uncounted: bool,
    output: Path | None,
) -> None:
    """Write TABLE, one of passages, counts and speeds, as CSV.

    Beside a file NAME.csv comes NAME.datapackage.json, which says what the columns are. An interval that
    nobody listened to has a blank count, not zero.
    """
    from ginnel import export as files
    from ginnel.config import load_settings
    from ginnel.reports import Every, site
    from ginnel.store import open_store

    if uncounted and table != "passages":
        raise click.UsageError("--uncounted goes with passages only")
    with open_store(load_settings(config_file).store.url, read_only=True) as store:
        zone = site(store).timezone
        start_us = None if start is None else moment_us(start, zone)
        end_us = None if end is None else moment_us(end, zone)
        if start_us is not None and end_us is not None and start_us >= end_us:
            raise click.UsageError("--to must be later than --from")
        names = list(sensors) or None
        target = output if output is not None else sys.stdout
        if table == "passages":
            n_rows = files.export_passages(store, target, names, start_us, end_us, with_uncounted=uncounted)
        elif table == "counts":
            n_rows = files.export_counts(store, target, names, start_us, end_us, Every(every))
        else:
            n_rows = files.export_speeds(store, target, names, start_us, end_us, Every(every))
    if output is not None:
        click.echo(f"{output}: {n_rows} rows", err=True)
