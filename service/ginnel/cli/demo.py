"""`ginnel demo`: the whole job on invented data."""

from __future__ import annotations

import tempfile
from collections.abc import Sequence
from contextlib import ExitStack
from pathlib import Path
from typing import TYPE_CHECKING

import click

from ginnel.cli.options import quiet_option

if TYPE_CHECKING:
    from ginnel.demo import Tally

PORT = 8470


@click.command()
@click.option(
    "--dir",
    "folder",
    type=click.Path(path_type=Path, file_okay=False),
    help="Keep captures, settings and store here; without it they are gone afterwards.",
)
@click.option("--no-serve", is_flag=True, help="Print the summary and end.")
@click.option(
    "--port", type=click.IntRange(0, 65535), help=f"Port of the dashboard; {PORT} or any that is free."
)
@quiet_option
def demo(folder: Path | None, no_serve: bool, port: int | None, quiet: bool) -> None:
    """See the whole job on invented data, with nothing to configure.

    Makes the captures of a day at two sensors, finds the passages in them, compares them with who really
    walked there, and shows the dashboard until Ctrl-C. The eight weeks before that day are drawn from an
    invented pattern, and marked so.
    """
    from ginnel import demo as place
    from ginnel.cli.progress import progress
    from ginnel.config import Settings
    from ginnel.errors import GinnelError
    from ginnel.web.server import Server, bind

    def bound(settings: Settings) -> Server:
        if port is not None:
            return bind(settings, port)
        try:
            return bind(settings, PORT)
        except GinnelError:
            return bind(settings, 0)

    with ExitStack() as stack:
        if folder is None:
            folder = Path(stack.enter_context(tempfile.TemporaryDirectory(prefix="ginnel-demo-")))
        settings = place.prepare(folder)
        with progress("A day at the Tannery annex", place.work_s(), quiet=quiet) as advance:
            tallies = place.run(settings, advance, lambda: place.draw_weeks(settings))
        if not quiet:
            click.echo("\n".join(table(tallies)))
        if no_serve:
            return
        server = stack.enter_context(bound(settings))
        if not quiet:
            click.echo(f"\nThe dashboard is at {server.address} (Ctrl-C ends it)")
        server.run()


def table(tallies: Sequence[Tally]) -> list[str]:
    """Say what was counted against what was true, a line for each sensor and direction."""
    from ginnel.words import Direction

    rows = [("sensor", "direction", "counted", "really passed")]
    for tally in tallies:
        names = {
            Direction.APPROACHING: tally.sensor.approaching_name,
            Direction.RECEDING: tally.sensor.receding_name,
            Direction.UNKNOWN: "direction unknown",
        }
        for direction, name in names.items():
            counted, true = tally.counted[direction], tally.true[direction]
            if direction is not Direction.UNKNOWN or counted:
                rows.append((tally.sensor.name, name, str(counted), str(true)))
        total = (str(sum(tally.counted.values())), str(sum(tally.true.values())))
        rows.append((tally.sensor.name, f"in {tally.listened_s / 3600:.1f} h listened", *total))
    widths = [max(len(row[i]) for row in rows) for i in range(4)]
    return [
        f"{a:<{widths[0]}}  {b:<{widths[1]}}  {c:>{widths[2]}}  {d:>{widths[3]}}".rstrip()
        for a, b, c, d in rows
    ]
