"""Options that several commands share."""

from __future__ import annotations

import re
from collections.abc import Callable
from datetime import datetime
from pathlib import Path
from typing import Any
from zoneinfo import ZoneInfo

import click

from ginnel.times import to_us

Decorator = Callable[[Callable[..., Any]], Callable[..., Any]]

config_option: Decorator = click.option(
    "--config",
    "config_file",
    type=click.Path(path_type=Path, dir_okay=False),
    help="The settings; without it ./ginnel.toml, then the file that GINNEL_CONFIG names.",
)
quiet_option: Decorator = click.option(
    "--quiet", "-q", is_flag=True, help="No progress and no summary; errors only."
)
sensor_option: Decorator = click.option(
    "--sensor", "sensor_name", metavar="NAME", help="The sensor's name in the settings."
)


class Moment(click.ParamType[datetime]):
    """A moment or day in ISO 8601; without an offset it is the site's own time."""

    name = "TIME"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> datetime:
        """Read the text; the site's zone is added later, by `moment_us`."""
        if isinstance(value, datetime):
            return value
        try:
            return datetime.fromisoformat(value)
        except ValueError:
            self.fail(f"{value!r} is not a time such as 2026-03-02, 2026-03-02T08:00 or 2026-03-02T08:00:00Z")


def moment_us(moment: datetime, timezone: str) -> int:
    """Microseconds since 1970 UTC of a moment; one without an offset is in the zone."""
    return to_us(moment if moment.tzinfo is not None else moment.replace(tzinfo=ZoneInfo(timezone)))


_RATE = re.compile(r"^\s*(\d+(?:\.\d+)?)\s*(k?)(?:hz)?\s*$", re.IGNORECASE)


class Rate(click.ParamType[float]):
    """A sample rate: 8000, 44.1k, 48kHz."""

    name = "RATE"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> float:
        """Read the text as Hz."""
        if isinstance(value, float):
            return value
        found = _RATE.match(str(value))
        if not found or not float(found[1]):
            self.fail(f"{value!r} is not a sample rate such as 8000, 44.1k or 48kHz")
        return float(found[1]) * (1000.0 if found[2] else 1.0)
