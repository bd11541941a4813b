"""`ginnel export`: the log as files that others can read."""

from __future__ import annotations

import sys
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING

import click

from ginnel.cli.options import Moment, config_option, moment_us

if TYPE_CHECKING:
    from collections.abc import Mapping

    from ginnel.config import StationSettings
    from ginnel.export import Question
    from ginnel.store import Store

_TABLES = ["passages", "counts", "speeds", "occupancy", "health", "summary"]
_FORMATS = ["csv", "jsonl", "parquet", "xlsx", "tmg"]
_SUMMARY_FORMATS = ["html", "pdf"]
_INTERVALS = ["5min", "15min", "hour", "day", "week", "month"]


@click.command()
@click.argument("tables", metavar="TABLE...", type=click.Choice(_TABLES), nargs=-1, required=True)
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
    "--format",
    "kind",
    type=click.Choice(_FORMATS + _SUMMARY_FORMATS),
    help="Kind of file.  [default: csv; html for a summary]",
)
@click.option("--uncounted", is_flag=True, help="Passages: turn-backs and fidgeting too, which do not count.")
@click.option(
    "--partitioned",
    is_flag=True,
    help="Passages as Parquet: a folder, with a part for each sensor and month.",
)
@click.option("--output", type=click.Path(path_type=Path), help="The file; without it, standard output.")
def export(
    tables: tuple[str, ...],
    config_file: Path | None,
    sensors: tuple[str, ...],
    start: datetime | None,
    end: datetime | None,
    every: str,
    kind: str | None,
    uncounted: bool,
    partitioned: bool,
    output: Path | None,
) -> None:
    """Write TABLE, one of passages, counts, speeds, occupancy and health, as a file; or a summary to print.

    Beside a file NAME.csv comes NAME.datapackage.json, which says what the columns are. An interval that
    nobody listened to has a blank count, not zero. A workbook (xlsx) may hold several tables.
    A summary is a page a sensor: table, charts, coverage, method and cautions.

    \b
    For example, the counts of March, day by day:
      ginnel export counts --every day --from 2026-03-01 --to 2026-04-01 --output march.csv
    """  # noqa: D301 (the backspace is click's mark for lines that stay as they are)
    kind = kind or ("html" if tables == ("summary",) else "csv")
    _check_usage(tables, kind, every, uncounted=uncounted, partitioned=partitioned, output=output)
    from ginnel import export as files
    from ginnel.config import load_settings
    from ginnel.reports import Every, site
    from ginnel.store import open_store

    settings = load_settings(config_file)
    with open_store(settings.store.url, read_only=True) as store:
        zone = site(store).timezone
        asked = files.Question(
            sensors=sensors or None,
            start_us=None if start is None else moment_us(start, zone),
            end_us=None if end is None else moment_us(end, zone),
            every=Every(every),
            with_uncounted=uncounted,
        )
        if asked.start_us is not None and asked.end_us is not None and asked.start_us >= asked.end_us:
            raise click.UsageError("--to must be later than --from")
        if kind == "tmg":
            stations = {one.name: one.station for one in settings.sensor if one.station is not None}
            n_rows = _write_records(store, tables[0], asked, stations, output)
        elif kind in _SUMMARY_FORMATS:
            n_rows = _write_summary(store, asked, kind, output)
        else:
            n_rows = _write(store, tables, asked, kind, partitioned=partitioned, output=output)
    if output is not None:
        what = "page" if kind in _SUMMARY_FORMATS else "row"
        click.echo(f"{output}: {n_rows} {what}{'' if n_rows == 1 else 's'}", err=True)


def _check_usage(
    tables: tuple[str, ...], kind: str, every: str, *, uncounted: bool, partitioned: bool, output: Path | None
) -> None:
    if uncounted and "passages" not in tables:
        raise click.UsageError("--uncounted goes with passages only")
    if len(set(tables)) != len(tables):
        raise click.UsageError("each table goes in once")
    if len(tables) > 1 and kind != "xlsx":
        raise click.UsageError("several tables go together with --format xlsx only")
    if ("summary" in tables) != (kind in _SUMMARY_FORMATS):
        raise click.UsageError("html and pdf are for a summary, and a summary is html or pdf")
    if kind in ("parquet", "xlsx", "pdf") and output is None:
        raise click.UsageError(f"{kind} needs --output FILE")
    if kind == "tmg" and (tables[0] not in ("counts", "speeds") or every != "hour"):
        raise click.UsageError("tmg has counts or speeds by the hour")
    if partitioned and (tables != ("passages",) or kind != "parquet"):
        raise click.UsageError("--partitioned goes with passages and --format parquet only")


def _write(
    store: Store,
    tables: tuple[str, ...],
    asked: Question,
    kind: str,
    *,
    partitioned: bool,
    output: Path | None,
) -> int:
    from ginnel import export as files

    made = [files.TABLES[name](store, asked) for name in tables]
    if partitioned and output is not None:
        return files.write_partitioned(store, made[0], output)
    return files.write(store, made, sys.stdout.buffer if output is None else output, files.Format(kind))


def _write_records(
    store: Store,
    table: str,
    asked: Question,
    stations: Mapping[str, StationSettings],
    output: Path | None,
) -> int:
    from ginnel.export.tmg import speed_records, volume_records, write_records

    records = (volume_records if table == "counts" else speed_records)(store, asked, stations)
    write_records(records, sys.stdout.buffer if output is None else output)
    if records.n_without_direction:
        click.echo(f"{records.n_without_direction} passages of unknown direction are in no record", err=True)
    return len(records.lines)


def _write_summary(store: Store, asked: Question, kind: str, output: Path | None) -> int:
    from ginnel.export.summary import summaries
    from ginnel.export.summary_pages import write_summary

    pages = summaries(store, asked)
    write_summary(pages, sys.stdout.buffer if output is None else output, kind)
    return len(pages)
