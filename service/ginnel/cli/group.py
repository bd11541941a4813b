"""The `ginnel` command itself: finds the file of a command, and turns errors into lines and exit codes."""

from __future__ import annotations

import contextlib
import errno
import importlib
import os
import sys
from typing import Any

import click

from ginnel import __version__
from ginnel.errors import GinnelError

#: One line of help for each command, so that `ginnel --help` imports none of them.
COMMANDS = {
    "demo": "See it all work on invented data, with nothing to configure.",
    "export": "Write passages, counts or speeds as files.",
    "init": "Write a commented ginnel.toml and an empty store.",
    "listen": "Listen live to all sensors, as a service.",
    "plan": "Tell what a planned mounting will hear, before drilling.",
    "replay": "Find the passages in recorded captures and log them.",
    "serve": "Show the dashboard.",
    "simulate": "Make captures with known truth.",
    "status": "Say whether it is listening, and what is wrong.",
    "store": "Look after the log on disk.",
    "users": "Say who may see the dashboard.",
}


class _LazyGroup(click.Group):
    """A group whose commands are imported when they are first asked for."""

    def list_commands(self, ctx: click.Context) -> list[str]:
        return sorted(COMMANDS)

    def get_command(self, ctx: click.Context, cmd_name: str) -> click.Command | None:
        if cmd_name not in COMMANDS:
            return None
        command: click.Command = getattr(importlib.import_module(f"ginnel.cli.{cmd_name}"), cmd_name)
        return command

    def format_commands(self, ctx: click.Context, formatter: click.HelpFormatter) -> None:
        with formatter.section("Commands"):
            formatter.write_dl(sorted(COMMANDS.items()))

    def main(self, *args: Any, **kwargs: Any) -> Any:
        """Run; what the system refuses and no room foresaw is a line too."""
        try:
            try:
                return super().main(*args, **kwargs)
            finally:
                sys.stdout.flush()  # here, where a failure still gets its line
        except OSError as exc:
            what = exc.filename or "the output"
            if exc.errno != errno.EPIPE:  # whoever reads has had enough, as `head` does
                click.echo(f"ginnel: {what}: {exc.strerror or exc}", err=True)
            with contextlib.suppress(OSError, ValueError):
                # what is still buffered has nowhere to go; the interpreter would try, and fail, at its end
                os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
            sys.exit(1)

    def invoke(self, ctx: click.Context) -> object:
        try:
            return super().invoke(ctx)
        except GinnelError as exc:
            for line in str(exc).splitlines():
                click.echo(f"ginnel: {line}", err=True)
            ctx.exit(1)


@click.group(
    cls=_LazyGroup, context_settings={"help_option_names": ["-h", "--help"], "max_content_width": 110}
)
@click.version_option(__version__, prog_name="ginnel", message="%(prog)s %(version)s")
def main() -> None:
    """Keep an honest log of who and what passed a CW Doppler radar sensor.

    Exit codes: 0 done, 1 failed, 2 wrong usage.
    """
