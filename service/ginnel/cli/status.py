"""`ginnel status`: is it listening, is anything wrong."""

from __future__ import annotations

import time
from pathlib import Path
from typing import TYPE_CHECKING

import click

from ginnel.cli.options import config_option

if TYPE_CHECKING:
    from collections.abc import Iterator
    from datetime import tzinfo

    from ginnel.reports.status import SensorStatus, Status

_EXIT_CODES = {"well": 0, "warning": 1, "failure": 2}


@click.command()
@config_option
@click.option("--quiet", "-q", is_flag=True, help="The exit code only.")
def status(config_file: Path | None, quiet: bool) -> None:
    """Say whether the sensors are listened to, and what is wrong.

    Made for monitoring too: exit code 0 when all is well, 1 with a warning, 2 with a failure, which is
    also when nobody listens or the store cannot be read.
    """
    from zoneinfo import ZoneInfo

    from ginnel.config import load_settings
    from ginnel.errors import GinnelError
    from ginnel.reports.status import status as told
    from ginnel.store import open_store

    try:
        settings = load_settings(config_file)
        with open_store(settings.store.url, read_only=True) as store:
            found = told(store, time.time_ns() // 1000, [one.name for one in settings.sensor] or None)
    except GinnelError as exc:
        if not quiet:
            click.echo("\n".join(f"ginnel: {line}" for line in str(exc).splitlines()), err=True)
        click.get_current_context().exit(2)
    if not quiet:
        click.echo("\n".join(_lines(found, ZoneInfo(settings.site.timezone))))
    click.get_current_context().exit(_EXIT_CODES[found.state])


def _lines(found: Status, zone: tzinfo) -> Iterator[str]:
    yield found.state.value
    if not found.sensors:
        yield "nobody listens: no sensor has been heard of lately; `ginnel listen` listens"
    for sensor in found.sensors:
        yield _sensor_line(sensor, found.at_us, zone)
        if not sensor.is_listened_to:
            yield "    Start `ginnel listen`, or see why it does not listen (journalctl -u ginnel-listen)."
    for one in found.conditions:
        yield f"{one.severity.value}: {one.sentence} (since {_time(one.raised_us, zone)})"
        yield f"    {one.advice}"


def _sensor_line(one: SensorStatus, now_us: int, zone: tzinfo) -> str:
    parts = ["is listened to" if one.is_listened_to else "is not listened to"]
    if one.heard_until_us is None:
        parts.append("never heard")
    else:
        parts.append(f"last heard {_ago(now_us - one.heard_until_us)}")
    parts.append(f"coverage of the last hour {100 * one.hour_coverage:.1f} %")
    passed = "none" if one.last_passage_us is None else _time(one.last_passage_us, zone)
    parts.append(f"last passage {passed}")
    return f"{one.sensor}: {', '.join(parts)}"


def _ago(elapsed_us: int) -> str:
    seconds = max(0, elapsed_us // 1_000_000)
    for length, unit in ((86_400, "d"), (3600, "h"), (60, "min")):
        if seconds >= 2 * length:
            return f"{seconds // length} {unit} ago"
    return f"{seconds} s ago"


def _time(moment_us: int, zone: tzinfo) -> str:
    from ginnel.times import from_us

    return from_us(moment_us, zone).strftime("%Y-%m-%d %H:%M:%S %Z")
