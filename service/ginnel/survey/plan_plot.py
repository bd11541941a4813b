"""A plan as a picture: radial speed, levels and mains lines."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from ginnel.doppler.kinematics import cosine, nearest_distance_m
from ginnel.errors import ExportError
from ginnel.passages.site import VEHICLE, WALKER
from ginnel.survey.plan import Plan, on_line
from ginnel.survey.plan_radar import CAR, PERSON
from ginnel.survey.plan_speeds import mains_lines, usual_speeds_mps

if TYPE_CHECKING:
    from matplotlib.axes import Axes

SUFFIXES = (".png", ".svg")
_DARK, _WARM, _PALE = "#1f4e79", "#b3541e", "#8a8f98"


def draw_plan(plan: Plan, file: Path) -> None:
    """Write the picture as PNG or SVG, by the file's suffix.

    Raises
    ------
    ExportError
        The suffix is another, matplotlib is not installed, or the file cannot be written.
    """
    if file.suffix.lower() not in SUFFIXES:
        raise ExportError(f"{file}: a plot is a .png or an .svg file")
    try:
        from matplotlib.figure import Figure
    except ModuleNotFoundError as exc:
        raise ExportError("a plot needs matplotlib: pip install matplotlib") from exc
    figure = Figure(figsize=(7.5, 9.5), layout="constrained")
    speed, level, lines = figure.subplots(3, 1, height_ratios=[3, 3, 1.6])
    _draw_speed(speed, plan)
    _draw_level(level, plan)
    _draw_lines(lines, plan)
    figure.suptitle(f"{plan.sensor.name}: what it will hear at {plan.sensor.carrier_hz / 1e9:g} GHz")
    try:
        figure.savefig(file, format=file.suffix[1:].lower(), dpi=150)
    except OSError as exc:
        raise ExportError(f"{file}: cannot be written: {exc.strerror or exc}") from exc


def _draw_speed(axes: Axes, plan: Plan) -> None:
    """Radial speed ahead and behind, for the edges and the middle, with the measurable range."""
    target = plan.expected
    reach_m = VEHICLE.reach_m if target is CAR else WALKER.reach_m / 2
    x_m = np.linspace(-reach_m, reach_m, 801)
    width_m = plan.path_width_m
    for y_m, style, name in (
        (-width_m / 2, ":", "near edge"),
        (0.0, "-", "middle"),
        (width_m / 2, "--", "far edge"),
    ):
        nearest_m = nearest_distance_m(on_line(plan.sensor.mounting, y_m))
        axes.plot(x_m, target.speed_mps * np.abs(cosine(x_m, nearest_m)), style, color=_DARK, label=name)
    axes.axhspan(0, plan.lowest.speed_mps, color=_PALE, alpha=0.3, label=f"too slow: {plan.lowest.set_by}")
    axes.set(
        xlabel="place along the path, m; the beam looks to the right",
        ylabel="radial speed, m/s",
        title=f"A {target.name} at {target.speed_mps:.2f} m/s",
    )
    axes.legend(loc="lower right", fontsize="small")


def _draw_level(axes: Axes, plan: Plan) -> None:
    """Levels ahead of the sensor over the noise of one bin."""
    x_m = np.geomspace(0.3, VEHICLE.reach_m, 400)
    along = plan.along(x_m)
    axes.semilogx(x_m, along.person_dbm, color=_DARK, label=f"person, {PERSON.usual_m2:g} m²")
    axes.semilogx(x_m, along.car_dbm, "--", color=_WARM, label=f"car, {CAR.usual_m2:g} m²")
    axes.axhline(plan.noise_dbm + plan.needed_snr_db, color=_PALE, label="least that is heard")
    axes.axhline(plan.noise_dbm, color=_PALE, linestyle=":", label="receiver's noise in one bin")
    ahead_m = plan.lanes_of(plan.expected)[1].ahead_m
    if ahead_m is not None:
        axes.axvspan(*ahead_m, color=_DARK, alpha=0.08, label=f"a {plan.expected.name} is followed")
    axes.set(xlabel="ahead of the sensor, m", ylabel="echo, dBm", xlim=(x_m[0], x_m[-1]))
    axes.grid(visible=True, alpha=0.3)
    axes.legend(loc="lower left", fontsize="small")


def _draw_lines(axes: Axes, plan: Plan) -> None:
    """Speeds that hum and lamps look like, beside those expected."""
    lines = mains_lines(plan.sensor.carrier_hz, plan.sensor.mains_hz, plan.expected, plan.bin_hz)
    for line in lines:
        colour = _WARM if line.is_expected else _PALE
        axes.axvline(line.speed_mps, color=colour, linestyle=":" if line.made_by == "hum" else "-")
        axes.text(line.speed_mps, 0.97, f" {line.shift_hz:g} Hz", rotation=90, va="top", fontsize="x-small")
    axes.axvspan(*usual_speeds_mps(plan.expected), color=_DARK, alpha=0.2)
    axes.set(
        xlabel=f"radial speed, m/s; shaded: usual for a {plan.expected.name}; full: lamps, dotted: hum",
        xlim=(0, max(plan.expected.speed_mps * 1.5, lines[-1].speed_mps * 1.05)),
        ylim=(0, 1),
        yticks=[],
    )
