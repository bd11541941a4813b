"""`ginnel plan`: what a planned mounting will hear, before anybody drills."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from ginnel.cli.options import Rate, config_option, sensor_option

if TYPE_CHECKING:
    from ginnel.config.sensor import SensorSettings
    from ginnel.survey.plan_tables import FigureTable
    from ginnel.words import Sensor

_SENSOR_KEYS = ("carrier_hz", "channels", "mains_hz", "max_speed_mps", "highpass_hz")
_MOUNTING_KEYS = ("height_m", "offset_m", "beam_angle_deg", "tilt_deg", "beam_width_deg")
_MODULE_KEYS = ("power_mw", "gain_dbi", "noise_figure_db", "loss_db", "flicker_corner_hz", "lowpass_hz")


@click.command()
@config_option
@sensor_option
@click.option("--carrier-ghz", type=click.FloatRange(1, 300), help="The module's frequency, GHz.")
@click.option(
    "--power-mw", type=click.FloatRange(1e-3, 1e4), default=20, show_default=True, help="Its power, mW."
)
@click.option("--gain-dbi", type=click.FloatRange(-10, 50), default=8, show_default=True, help="Its antenna.")
@click.option(
    "--beam-width-deg", type=click.FloatRange(1, 180), nargs=2, help="Half power, horizontal and vertical."
)
@click.option("--channels", type=click.Choice(["mono", "iq"]), help="One output, or I and Q.")
@click.option(
    "--noise-figure-db", type=click.FloatRange(0, 60), default=20, show_default=True, help="Of the receiver."
)
@click.option(
    "--flicker-corner-hz",
    type=click.FloatRange(0, 1e6),
    default=0,
    show_default=True,
    help="Below this its noise rises as 1/f.",
)
@click.option(
    "--loss-db",
    type=click.FloatRange(0, 60),
    default=0,
    show_default=True,
    help="Cover and cables, both ways.",
)
@click.option("--highpass-hz", type=click.FloatRange(0, 1e4, min_open=True), help="Amplifier, lower corner.")
@click.option("--lowpass-hz", type=click.FloatRange(1, 1e6), help="Amplifier, upper corner.")
@click.option("--height-m", type=click.FloatRange(0, 50), help="Above the floor.")
@click.option("--offset-m", type=click.FloatRange(-100, 100), help="Sideways from the middle of the path.")
@click.option("--beam-angle-deg", type=click.FloatRange(0, 90), help="Between beam and path, from above.")
@click.option("--tilt-deg", type=click.FloatRange(0, 90), help="Beam below the horizontal.")
@click.option("--path-width-m", type=click.FloatRange(0.1, 100), help="In which people or vehicles move.")
@click.option(
    "--max-speed-mps", type=click.FloatRange(0.5, 100), help="Fastest to be followed; 60 for a road."
)
@click.option("--mains-hz", type=click.FloatRange(16, 400), help="Of the mains.")
@click.option("--rate", "rate_hz", type=Rate(), help="Sample rate, Hz; without it the source's, or 8000.")
@click.option(
    "--plot", "plot_file", type=click.Path(path_type=Path, dir_okay=False), help="Draw it too: .png or .svg."
)
def plan(
    config_file: Path | None,
    sensor_name: str | None,
    rate_hz: float | None,
    plot_file: Path | None,
    **given: Any,
) -> None:
    """Tell what a mounting will hear, before drilling: reach, speeds, lamps, and advice.

    What is not given comes from the settings, or from the defaults where there are none.
    """
    from ginnel.survey.plan import make_plan
    from ginnel.survey.plan_advice import advice
    from ginnel.survey.plan_mountings import choices
    from ginnel.survey.plan_radar import RadarModule
    from ginnel.survey.plan_speeds import mains_lines
    from ginnel.survey.plan_tables import figure_tables, summary

    settings = _sensor_settings(config_file, sensor_name)
    rate_hz = rate_hz or settings.source.rate_hz or 8000.0
    if not 500 <= rate_hz <= 1e6:
        raise click.BadParameter("must be from 500 Hz to 1 MHz", param_hint="--rate")
    sensor = _sensor(settings, given)
    if sensor.highpass_hz is not None and (given["lowpass_hz"] or 1e9) <= sensor.highpass_hz:
        raise click.BadParameter(
            f"must be above the lower corner, {sensor.highpass_hz:g}", param_hint="--lowpass-hz"
        )
    planned = make_plan(
        sensor,
        RadarModule(**{key: given[key] for key in _MODULE_KEYS}),
        path_width_m=given["path_width_m"] or settings.path_width_m or 2.0,
        sample_rate_hz=rate_hz,
    )
    lines = mains_lines(planned.sensor.carrier_hz, planned.sensor.mains_hz, planned.expected, planned.bin_hz)
    ranked = choices(planned)
    if plot_file is not None:
        from ginnel.survey.plan_plot import draw_plan

        draw_plan(planned, plot_file)
    for sentence in advice(planned, lines, ranked):
        click.echo(f"* {sentence}")
    click.echo("\n" + "\n  ".join(summary(planned)))
    for table in figure_tables(planned, lines, ranked):
        click.echo("\n" + _laid_out(table))


def _sensor_settings(config_file: Path | None, sensor_name: str | None) -> SensorSettings:
    """Return the sensor of the settings, or one of our own where there are none."""
    import os

    from ginnel.config import find_file, load_settings
    from ginnel.config.sensor import SensorSettings

    if find_file(config_file, os.environ) is None and sensor_name is None:
        return SensorSettings(name="planned")
    return load_settings(config_file).find_sensor(sensor_name)


def _sensor(settings: SensorSettings, given: dict[str, Any]) -> Sensor:
    """Lay what was typed over the settings."""
    from ginnel.words import Aspect, Channels

    given = given | {"carrier_hz": None if given["carrier_ghz"] is None else given["carrier_ghz"] * 1e9}
    given = given | {"channels": None if given["channels"] is None else Channels(given["channels"])}
    sensor = settings.to_sensor()
    turned = {key: given[key] for key in _MOUNTING_KEYS if given[key] is not None}
    if "beam_angle_deg" in turned:
        turned["aspect"] = Aspect.OBLIQUE if turned["beam_angle_deg"] else Aspect.AXIAL
    told = {key: given[key] for key in _SENSOR_KEYS if given[key] is not None}
    if told.get("max_speed_mps", sensor.max_speed_mps) <= sensor.min_speed_mps:
        raise click.BadParameter(
            f"must be above min_speed_mps, {sensor.min_speed_mps:g}", param_hint="--max-speed-mps"
        )
    return replace(sensor, mounting=replace(sensor.mounting, **turned), **told)


def _laid_out(table: FigureTable) -> str:
    """Lay out in columns, the first to the left and the others to the right."""
    cells = (table.heads, *table.rows)
    widths = [max(len(row[i]) for row in cells) for i in range(len(table.heads))]
    lines = [
        "  ".join(
            f"{cell:<{width}}" if i == 0 else f"{cell:>{width}}"
            for i, (cell, width) in enumerate(zip(row, widths, strict=True))
        )
        for row in cells
    ]
    return "\n  ".join([table.title, *lines, *table.notes])
