"""`ginnel serve`: the dashboard, on this machine only."""

from __future__ import annotations

from pathlib import Path

import click

from ginnel.cli.options import config_option, quiet_option


@click.command()
@config_option
@click.option(
    "--port", type=click.IntRange(0, 65535), default=8470, show_default=True, help="0 takes any free one."
)
@quiet_option
def serve(config_file: Path | None, port: int, quiet: bool) -> None:
    """Show the dashboard on this machine until Ctrl-C.

    It listens on 127.0.0.1 only, so that nobody else on the network sees it.
    """
    from ginnel.config import load_settings
    from ginnel.web.server import bind

    with bind(load_settings(config_file), port) as server:
        if not quiet:
            click.echo(f"The dashboard is at {server.address} (Ctrl-C ends it)")
        server.run()
