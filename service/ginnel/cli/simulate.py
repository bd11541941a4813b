"""`ginnel simulate`: captures with known truth."""

from __future__ import annotations

from dataclasses import replace
from datetime import datetime
from pathlib import Path
from typing import TYPE_CHECKING

import click

from ginnel.cli.options import Moment, Rate, config_option, moment_us, quiet_option, sensor_option

if TYPE_CHECKING:
    from ginnel.words import Sensor, Site


@click.command()
@click.argument(
    "folder", metavar="[DIR]", default="captures", type=click.Path(path_type=Path, file_okay=False)
)
@config_option
@sensor_option
@click.option("--channels", type=click.Choice(["mono", "iq"]), help="Other than the sensor's own.")
@click.option("--minutes", type=click.FloatRange(0.5, 1440), default=10, show_default=True, help="How long.")
@click.option(
    "--per-hour",
    type=click.FloatRange(0, 3600),
    default=120,
    show_default=True,
    help="Walkers an hour, both ways.",
)
@click.option(
    "--started-at", type=Moment(), default="2026-03-02T08:00:00", show_default=True, help="When it begins."
)
@click.option("--rate", "rate_hz", type=Rate(), default="8000", show_default=True, help="Sample rate, Hz.")
@click.option("--format", "kind", type=click.Choice(["wav", "sigmf"]), default="wav", show_default=True)
@click.option(
    "--seed", type=click.IntRange(0), default=0, show_default=True, help="The same seed gives the same files."
)
@quiet_option
def simulate(
    folder: Path,
    config_file: Path | None,
    sensor_name: str | None,
    channels: str | None,
    minutes: float,
    per_hour: float,
    started_at: datetime,
    rate_hz: float,
    kind: str,
    seed: int,
    quiet: bool,
) -> None:
    """Make a capture of invented walkers in DIR (./captures), and a file that tells the truth about it.

    The sensor is the one in the settings where there are any, else a ceiling module in a corridor.
    """
    from ginnel import sim
    from ginnel.cli.progress import progress
    from ginnel.errors import GinnelError
    from ginnel.words import US_PER_S, Channels

    if not 1_000 <= rate_hz <= 192_000 or rate_hz != round(rate_hz):
        raise click.BadParameter("must be a whole number of Hz from 1000 to 192000", param_hint="--rate")
    site, sensor = _site_and_sensor(config_file, sensor_name)
    if channels is not None:
        sensor = replace(sensor, channels=Channels(channels))
    started_us = moment_us(started_at, site.timezone)
    if started_us % US_PER_S:
        raise click.BadParameter(
            "must be a whole second, since it goes into a file name", param_hint="--started-at"
        )
    duration_s = 60.0 * minutes
    scene = sim.Scene(
        sensor=sensor,
        duration_s=duration_s,
        sample_rate_hz=rate_hz,
        movers=sim.poisson_walkers(
            duration_s=duration_s,
            per_hour=per_hour,
            centre_m=sensor.mounting.offset_m,
            edge_s=min(15.0, duration_s / 3),
            seed=seed,
        ),
        seed=seed,
    )
    stem = folder / sim.capture_name(sensor.name, started_us)
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with progress("Simulating", duration_s, quiet=quiet) as advance:
            if kind == "wav":
                capture = sim.write_wav(scene, stem.with_name(f"{stem.name}.wav"), on_progress=advance)
            else:
                capture = sim.write_sigmf(scene, stem, started_us, on_progress=advance)
        truth = sim.write_truth(scene, stem.with_name(f"{stem.name}-truth.csv"), started_us)
    except OSError as exc:
        raise GinnelError(f"{folder} cannot be written: {exc.strerror or exc}") from exc
    if not quiet:
        walkers = len(scene.truth())
        click.echo(f"{capture}: {minutes:g} min, {walkers} walkers")
        click.echo(f"{truth}: who they were")


def _site_and_sensor(config_file: Path | None, sensor_name: str | None) -> tuple[Site, Sensor]:
    """Take the sensor of the settings, or one of our own where there are none."""
    import os

    from ginnel.config import find_file, load_settings
    from ginnel.words import Mounting, Sensor, Site

    if find_file(config_file, os.environ) is None and sensor_name is None:
        return Site(name="nowhere"), Sensor(name="simulated", mounting=Mounting(height_m=2.4, tilt_deg=15.0))
    settings = load_settings(config_file)
    return settings.site.to_site(), settings.find_sensor(sensor_name).to_sensor()
