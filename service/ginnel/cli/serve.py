"""`ginnel serve`: the dashboard."""

from __future__ import annotations

from pathlib import Path

import click

from ginnel.cli.options import config_option, quiet_option


@click.command()
@config_option
@click.option(
    "--port", type=click.IntRange(0, 65535), help="Another than in the settings; 0 takes any free one."
)
@quiet_option
def serve(config_file: Path | None, port: int | None, quiet: bool) -> None:
    """Show the dashboard until Ctrl-C.

    It listens on this machine only, unless the settings name another address and somebody has a
    password (`ginnel users add NAME`).
    """
    from ginnel.config import load_settings
    from ginnel.web.server import bind

    settings = load_settings(config_file)
    with bind(settings, port) as server:
        if not quiet:
            click.echo(f"The dashboard is at {settings.web.public_url or server.address} (Ctrl-C ends it)")
        server.run()
