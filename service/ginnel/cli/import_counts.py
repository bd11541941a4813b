"""`ginnel store import-counts`: counts that others made, to compare the log with."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import click

from ginnel.cli.options import config_option, quiet_option
from ginnel.words import Direction

if TYPE_CHECKING:
    from ginnel.counts_file import Label
    from ginnel.stats.counts import IntArray
    from ginnel.words import FloatArray

_LENGTHS_S = {"5min": 300, "15min": 900, "hour": 3600, "day": 86_400}
_MOST_PROBLEMS = 10  # that are told one by one


@click.command("import-counts")
@click.argument("file", type=click.Path(path_type=Path, dir_okay=False))
@config_option
@quiet_option
@click.option("--series", required=True, metavar="NAME", help="What to call them; replaces one of that name.")
@click.option(
    "--time", "time_column", default="interval_start", show_default=True, help="Column of when each begins."
)
@click.option("--hour", "hour_column", help="Column of the hour, where the time column holds the day only.")
@click.option(
    "--count",
    "count_columns",
    metavar="COLUMN[=DIRECTION]",
    multiple=True,
    default=["count"],
    show_default=True,
    help="Column of counts and which way it counts: approaching, receding, unknown. May be repeated.",
)
@click.option("--direction", "direction_column", help="Column that says which way.")
@click.option(
    "--every", type=click.Choice(list(_LENGTHS_S)), default="hour", show_default=True, help="Their length."
)
def import_counts(
    file: Path,
    config_file: Path | None,
    quiet: bool,
    series: str,
    time_column: str,
    hour_column: str | None,
    count_columns: tuple[str, ...],
    direction_column: str | None,
    every: str,
) -> None:
    """Keep counts that others made beside the log, from a CSV FILE of any columns.

    A blank count is no count, not zero. A line that makes no sense is told and left out. What looks wrong in
    the labels of hourly counts (days that begin at six, clock changes not followed, long zeros) is told.
    """
    from ginnel import store as log
    from ginnel.config import load_settings
    from ginnel.counts_file import ColumnMap, read_counts
    from ginnel.reports import zone
    from ginnel.reports.labels import check_labels

    columns = ColumnMap(
        time=time_column,
        counts=tuple(_counts_column(text) for text in count_columns),
        direction=direction_column,
        hour=hour_column,
    )
    with log.open_store(load_settings(config_file).store.url) as store:
        local = zone(store)
        read = read_counts(file, columns, _LENGTHS_S[every], local)
        if read.counts:
            log.put_series(store, series, file.name, read.counts)
    for problem in read.problems[:_MOST_PROBLEMS]:
        click.echo(f"ginnel: {problem}", err=True)
    if (more := len(read.problems) - _MOST_PROBLEMS) > 0:
        click.echo(f"ginnel: {more} more lines of {file} make no sense either", err=True)
    if every == "hour" and direction_column is None:
        for fault in check_labels(*_hours(read.labels), local):
            click.echo(f"{file} {fault.day} {fault.hour:02}:00, {fault.kind}: {fault.reason}", err=True)
    if not quiet:
        click.echo(f"{series}: {len(read.counts)} counts")
    if read.problems or not read.counts:
        raise SystemExit(1)


def _hours(labels: Sequence[Label]) -> tuple[IntArray, IntArray, FloatArray]:
    """Days, hours and counts of labels, as the check of labels takes them."""
    import numpy as np

    return (
        np.array([label.moment.toordinal() for label in labels], np.int64),
        np.array([label.moment.hour for label in labels], np.int64),
        np.array([np.nan if label.count is None else label.count for label in labels], float),
    )


def _counts_column(text: str) -> tuple[str, Direction]:
    name, mark, way = text.rpartition("=")
    if not mark:
        return text, Direction.UNKNOWN
    if way not in tuple(Direction):
        raise click.UsageError(f"--count {text}: {way!r} is none of {', '.join(Direction)}")
    return name, Direction(way)
