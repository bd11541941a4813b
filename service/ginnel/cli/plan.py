"""`ginnel plan`: what a planned mounting will hear, before anybody drills."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from ginnel.cli.options import Rate, config_option, sensor_option

if TYPE_CHECKING:
    from ginnel.config.sensor import SensorSettings
    from ginnel.survey.plan import Lane, Plan
    from ginnel.survey.plan_mountings import Choice
    from ginnel.survey.plan_speeds import Line
    from ginnel.words import Sensor

_PLACES_M = (0.5, 1.0, 2.0, 3.0, 5.0, 8.0, 12.0, 20.0, 30.0, 50.0, 100.0)
_DENSITY_AT_M = (0.1, 0.2, 0.5, 1.0, 3.0)
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

    settings = _sensor_settings(config_file, sensor_name)
    rate_hz = rate_hz or settings.source.rate_hz or 8000.0
    if not 500 <= rate_hz <= 1e6:
        raise click.BadParameter("must be from 500 Hz to 1 MHz", param_hint="--rate")
    planned = make_plan(
        _sensor(settings, given),
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
    for part in (_what(planned), _speeds(planned), _lanes(planned), _along(planned), _mains(lines)):
        click.echo("\n" + "\n".join(part))
    for part in (_errors(planned), _mountings(ranked), _density(planned), _sources()):
        click.echo("\n" + "\n".join(part))


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


def _table(title: str, heads: Sequence[str], rows: Sequence[Sequence[str]]) -> list[str]:
    """Lay out in columns, the first to the left and the others to the right."""
    widths = [max(len(row[i]) for row in (heads, *rows)) for i in range(len(heads))]
    return [
        title,
        *(
            "  "
            + "  ".join(
                f"{cell:<{w}}" if i == 0 else f"{cell:>{w}}"
                for i, (cell, w) in enumerate(zip(row, widths, strict=True))
            ).rstrip()
            for row in (heads, *rows)
        ),
    ]


def _what(plan: Plan) -> list[str]:
    sensor, module, mounting = plan.sensor, plan.module, plan.sensor.mounting
    width_deg = mounting.beam_width_deg
    beam = "usual beam" if width_deg is None else f"beam {width_deg[0]:g} by {width_deg[1]:g} degrees"
    return [
        f"{sensor.name}: {sensor.carrier_hz / 1e9:g} GHz, {sensor.channels}, {module.power_mw:g} mW, "
        f"{module.gain_dbi:g} dBi, {beam}",
        f"  {mounting.height_m:g} m up, {mounting.offset_m:g} m from the middle of a path "
        f"{plan.path_width_m:g} m wide, turned by {mounting.beam_angle_deg:g} degrees "
        f"({mounting.aspect}), tilted by {mounting.tilt_deg:g}",
        f"  frames of {plan.frame_s * 1e3:.0f} ms, bins of {plan.bin_hz:.2f} Hz; noise in a bin "
        f"{plan.noise_dbm:.1f} dBm; heard from {plan.needed_snr_db:.1f} dB above it",
    ]


def _speeds(plan: Plan) -> list[str]:
    return [
        "Measurable radial speed",
        f"  lowest  {plan.lowest.speed_mps:6.2f} m/s, by {plan.lowest.set_by}",
        f"  highest {plan.highest.speed_mps:6.2f} m/s, by {plan.highest.set_by}",
    ]


def _lanes(plan: Plan) -> list[str]:
    def stretch(found: tuple[float, float] | None) -> str:
        return "-" if found is None else f"{found[0]:.1f} to {found[1]:.1f}"

    def row(lane: Lane, place: str) -> list[str]:
        heard = lane.ahead_m is not None
        too_fast = lane.target.speed_mps > plan.highest.speed_mps
        return [
            f"{lane.target.name}, {place}",
            f"{lane.nearest_m:.2f}",
            stretch(lane.ahead_m),
            stretch(lane.behind_m),
            f"{lane.dwell_s:.1f}",
            f"{lane.cycles:.0f}",
            f"{lane.mean_bias_ratio:.1%}" if heard else "-",
            "too fast" if too_fast else "yes" if lane.is_countable else "no",
        ]

    places = ("near edge", "middle", "far edge") * 2
    return _table(
        f"Where the weakest mover is heard (person {_speed(plan, 0)}, car {_speed(plan, 3)})",
        ("mover", "nearest m", "ahead m", "behind m", "for s", "cycles", "mean bias", "countable"),
        [row(lane, place) for lane, place in zip(plan.lanes, places, strict=True)],
    )


def _speed(plan: Plan, lane_idx: int) -> str:
    return f"at {plan.lanes[lane_idx].target.speed_mps:.2f} m/s"


def _along(plan: Plan) -> list[str]:
    import numpy as np

    from ginnel.doppler.kinematics import hz_per_mps
    from ginnel.survey.plan_radar import CAR, PERSON

    along = plan.along(np.array(_PLACES_M))
    speed_mps = plan.expected.speed_mps
    per_mps = hz_per_mps(plan.sensor.carrier_hz)
    return _table(
        f"Along the middle of the path, ahead ({plan.expected.name} at {speed_mps:.2f} m/s; "
        f"levels: person {PERSON.usual_m2:g} m2, car {CAR.usual_m2:g} m2)",
        ("m", "radial m/s", "bias", "Hz", "beam dB", "person dBm", "SNR dB", "car dBm", "SNR dB"),
        [
            [
                f"{along.x_m[i]:g}",
                f"{speed_mps * along.cosine[i]:.2f}",
                f"{along.cosine[i] - 1:.1%}",
                f"{speed_mps * along.cosine[i] * per_mps:.0f}",
                f"{along.beam_db[i]:.1f}",
                f"{along.person_dbm[i]:.1f}",
                f"{along.person_snr_db[i]:.0f}",
                f"{along.car_dbm[i]:.1f}",
                f"{along.car_snr_db[i]:.0f}",
            ]
            for i in range(len(_PLACES_M))
        ],
    )


def _mains(lines: tuple[Line, ...]) -> list[str]:
    return _table(
        "Lines of the mains, and the speed that they look like",
        ("from", "Hz", "m/s", "movers there", "usual speed"),
        [
            [
                line.made_by,
                f"{line.shift_hz:g}",
                f"{line.speed_mps:.2f}",
                f"{line.hidden_share:.1%}",
                "yes" if line.is_expected else "no",
            ]
            for line in lines
        ],
    )


def _errors(plan: Plan) -> list[str]:
    from ginnel.survey.plan_speeds import speed_errors

    return _table(
        "What a mistake does to a speed read at one place (a passage is fitted over many)",
        ("mistake", "reads"),
        [
            [error.cause, f"{error.ratio:+.2%}"]
            for error in speed_errors(plan.sensor.carrier_hz, plan.sensor.mounting.beam_angle_deg)
        ],
    )


def _mountings(ranked: tuple[Choice, ...]) -> list[str]:
    def row(choice: Choice) -> list[str]:
        return [
            choice.name,
            "yes" if choice.is_countable else "no",
            f"{choice.farthest_m:.1f}",
            f"{choice.unevenness_db:.0f}",
            "-" if choice.lanes[1].ahead_m is None else f"{choice.bias_ratio:.1%}",
        ]

    return _table(
        "Mountings of the same module, best first (counts over the whole width; least spread; least bias)",
        ("mounting", "countable", "spread m", "uneven dB", "mean bias"),
        [row(choice) for choice in ranked],
    )


def _density(plan: Plan) -> list[str]:
    import numpy as np

    from ginnel.survey.plan_radar import power_density_w_m2, public_reference_w_m2

    density = power_density_w_m2(plan.module, np.array(_DENSITY_AT_M))
    level = public_reference_w_m2(plan.sensor.carrier_hz)
    beside = "-" if level is None else f"{level:.2f}"
    lines = _table(
        f"Power density on the axis, for information (EIRP {plan.module.eirp_dbm:.1f} dBm; "
        "very near a bound only)",
        ("at m", "W/m2", "public reference"),
        [[f"{m:g}", f"{w:.2g}", beside] for m, w in zip(_DENSITY_AT_M, density, strict=True)],
    )
    return [
        *lines,
        "  The reference is the local one of ICNIRP 2020, mean of 6 minutes, over 6 GHz. What may be "
        "emitted, and where, local rules decide.",
    ]


def _sources() -> list[str]:
    from ginnel.survey.plan_radar import CAR, PERSON

    return ["Cross-sections", *(f"  {target.source}" for target in (PERSON, CAR))]
