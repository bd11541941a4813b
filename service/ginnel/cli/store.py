"""`ginnel store`: looking after the log on disk."""

from __future__ import annotations

from pathlib import Path

import click

from ginnel.cli.options import config_option, quiet_option


@click.group()
def store() -> None:
    """Look after the log on disk."""


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
    """Say whether the store can be opened by this version, and what it holds."""
    from ginnel import store as log
    from ginnel.config import load_settings
    from ginnel.times import utc_text

    url = load_settings(config_file).store.url
    with log.open_store(url, read_only=True) as opened:
        lines = [f"{opened.name}: revision {log.current(url)}"]
        for sensor in log.sensors(opened):
            extent = log.extent_us(opened, sensor.name)
            if extent is None:
                lines.append(f"{sensor.name}: nothing yet")
                continue
            listened_s = sum(logged.span.listened_s for logged in log.spans(opened, sensor.name))
            n_passages = log.passage_arrays(opened, sensor.name).crossed_us.size
            lines.append(
                f"{sensor.name}: {n_passages} passages, {listened_s / 3600:.2f} h listened, "
                f"{utc_text(extent[0])} to {utc_text(extent[1])}"
            )
    if not quiet:
        click.echo("\n".join(lines))
