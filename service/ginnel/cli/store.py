"""`ginnel store`: looking after the log on disk."""

from __future__ import annotations

import time
from collections.abc import Iterator
from contextlib import AbstractContextManager
from pathlib import Path
from typing import TYPE_CHECKING

import click

from ginnel.cli.import_counts import import_counts
from ginnel.cli.options import config_option, quiet_option

if TYPE_CHECKING:
    from ginnel.config import Settings
    from ginnel.store import Backup, Store


@click.group()
def store() -> None:
    """Look after the log on disk."""


store.add_command(import_counts)


@store.command()
@config_option
@quiet_option
def upgrade(config_file: Path | None, quiet: bool) -> None:
    """Make the store's tables, or bring them up to this version. Harmless when repeated."""
    from ginnel import store as log
    from ginnel.config import load_settings

    url = load_settings(config_file).store.url
    before = log.current(url, create=True)
    log.upgrade(url)
    after = log.current(url)
    with log.open_store(url) as opened:
        name = opened.name
    if not quiet:
        what = "was up to date" if before == after else "is up to date now"
        click.echo(f"{name} {what} ({after})")


@store.command()
@config_option
@quiet_option
def check(config_file: Path | None, quiet: bool) -> None:
    """Look for what is wrong in the store, and say what it holds. Nothing is changed.

    Pages of the file, rows that refer to nothing, spans that overlap, passages outside all spans, and
    whether the hourly roll-ups say what the passages say. Exit code 1 where anything is wrong.
    """
    from ginnel import store as log
    from ginnel.cli.progress import progress
    from ginnel.config import load_settings

    url = load_settings(config_file).store.url
    with log.open_store(url, read_only=True) as opened:
        with progress("Checking", 1.0, quiet=quiet) as advance:
            faults = log.find_faults(opened, on_progress=advance)
        if not quiet:
            click.echo(f"{opened.name}: revision {log.current(url)}")
            for line in _contents(opened):
                click.echo(line)
    for fault in faults:
        click.echo(f"ginnel: {fault}", err=True)
    if faults:
        click.get_current_context().exit(1)
    if not quiet:
        click.echo("no faults")


@store.command()
@config_option
@quiet_option
def backup(config_file: Path | None, quiet: bool) -> None:
    """Make a backup now, in the folder of [backup], and check it by reading it through."""
    from ginnel import store as log
    from ginnel.config import load_settings

    settings = load_settings(config_file)
    made = log.back_up(settings.store.url, Path(settings.backup.folder), _now_us())
    if not quiet:
        click.echo(_backup_line(made))


@store.command()
@click.argument("backup_file", metavar="[BACKUP]", required=False, type=click.Path(path_type=Path))
@click.option("--list", "is_list", is_flag=True, help="Only list the backups there are.")
@config_option
@quiet_option
def restore(backup_file: Path | None, is_list: bool, config_file: Path | None, quiet: bool) -> None:
    """Put a backup in the store's place; without BACKUP the newest.

    The store that was there is renamed, not removed. For PostgreSQL the command that does it is shown,
    and nothing is done. End `ginnel listen` first. What was recorded since the backup can be replayed.
    """
    from sqlalchemy.engine import make_url

    from ginnel import store as log
    from ginnel.config import load_settings
    from ginnel.errors import StoreError

    settings = load_settings(config_file)
    url, folder = settings.store.url, Path(settings.backup.folder)
    known = log.backups(folder)
    if is_list:
        click.echo("\n".join(map(_backup_line, known)) or f"no backups in {folder}")
        return
    if backup_file is None and not known:
        raise StoreError(f"there are no backups in {folder}: name one, or see [backup] folder")
    chosen = backup_file or known[-1].path
    if not chosen.is_file():
        raise StoreError(f"there is no backup {chosen}")
    if make_url(url).get_backend_name() == "postgresql":
        click.echo(log.postgresql_restore_command(url, chosen))
        return
    with _nobody_listens(settings):
        aside = log.restore_sqlite(url, chosen, _now_us())
    if not quiet:
        click.echo(f"restored from {chosen}")
        if aside is not None:
            click.echo(f"the store that was there is now {aside}")


@store.command()
@config_option
@quiet_option
def prune(config_file: Path | None, quiet: bool) -> None:
    """Let go now of what is older than [retention] and [backup] say; the daemon does so every night."""
    from ginnel import store as log
    from ginnel.clock import SystemClock
    from ginnel.config import load_settings
    from ginnel.daemon.upkeep import prune as let_go

    settings = load_settings(config_file)
    # a person who says so has looked at the clock
    with log.open_store(settings.store.url) as opened:
        told = let_go(opened, SystemClock(is_always_set=True), settings.retention)
    gone = log.prune_backups(Path(settings.backup.folder), settings.backup.keep_days, _now_us())
    if not quiet:
        click.echo(told or "nothing is old enough")
        for one in gone:
            click.echo(f"removed {one.path}")


@store.command()
@config_option
@quiet_option
def vacuum(config_file: Path | None, quiet: bool) -> None:
    """Give the room that removed rows have left back to the disk.

    A SQLite file is rewritten, for which as much room again must be free; nobody can write meanwhile.
    """
    from ginnel import store as log
    from ginnel.config import load_settings

    url = load_settings(config_file).store.url
    log.open_store(url).close()
    freed_bytes = log.vacuum(url, least_empty_share=0.0)
    if not quiet:
        click.echo(f"{freed_bytes / 1e6:.1f} MB given back")


def _contents(opened: Store) -> Iterator[str]:
    """One line for each sensor."""
    from ginnel import store as log
    from ginnel.times import utc_text

    for sensor in log.sensors(opened):
        extent = log.extent_us(opened, sensor.name)
        if extent is None:
            yield f"{sensor.name}: nothing yet"
            continue
        whole = (extent[0] - extent[0] % 3_600_000_000, extent[1])  # from the hour in which it begins
        n_passages = log.hourly_counts(opened, sensor.name, *whole).count.sum()
        listened_h = log.hourly_listening(opened, sensor.name, *whole).listened_us.sum() / 3.6e9
        yield (
            f"{sensor.name}: {n_passages} passages, {listened_h:.2f} h listened, "
            f"{utc_text(extent[0])} to {utc_text(extent[1])}"
        )


def _backup_line(one: Backup) -> str:
    from ginnel.times import utc_text

    return f"{one.path}  {utc_text(one.made_us)[:19]}Z  {one.size_bytes / 1e6:.1f} MB"


def _nobody_listens(settings: Settings) -> AbstractContextManager[object]:
    """Keep `ginnel listen` out, as it keeps us out while it runs."""
    from ginnel.daemon.places import Lock, make_places

    return Lock(make_places(Path(settings.listen.state)))


def _now_us() -> int:
    return time.time_ns() // 1000
