"""A plan's figures as tables of words, the same on a terminal and on a page."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.doppler.kinematics import hz_per_mps
from ginnel.survey.plan import Lane, Plan
from ginnel.survey.plan_mountings import Choice
from ginnel.survey.plan_radar import CAR, PERSON, field_v_m, power_density_w_m2, public_reference_w_m2
from ginnel.survey.plan_speeds import Line, speed_errors

_PLACES_M = np.array([0.5, 1.0, 2.0, 3.0, 5.0, 8.0, 12.0, 20.0, 30.0, 50.0, 100.0])
_DENSITY_AT_M = np.array([0.1, 0.2, 0.5, 1.0, 3.0])
#: Field disturbance sensors in the USA, 47 CFR 15.245: 2.5 V/m; at 3 m, from memory.
_USA_BANDS_HZ, _USA_V_M, _USA_AT_M = ((10.5e9, 10.55e9), (24.075e9, 24.175e9)), 2.5, 3.0


@dataclass(frozen=True, slots=True, kw_only=True)
class FigureTable:
    """A titled table whose first column names the row; notes stand below."""

    title: str
    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    notes: tuple[str, ...] = ()


def summary(plan: Plan) -> tuple[str, ...]:
    """Say in a few lines what was planned."""
    sensor, module, mounting = plan.sensor, plan.module, plan.sensor.mounting
    width_deg = mounting.beam_width_deg
    beam = "usual beam" if width_deg is None else f"beam {width_deg[0]:g} by {width_deg[1]:g} degrees"
    return (
        f"{sensor.name}: {sensor.carrier_hz / 1e9:g} GHz, {sensor.channels}, {module.power_mw:g} mW, "
        f"{module.gain_dbi:g} dBi, {beam}",
        f"{mounting.height_m:g} m up, {mounting.offset_m:g} m from the middle of a path "
        f"{plan.path_width_m:g} m wide, turned by {mounting.beam_angle_deg:g} degrees "
        f"({mounting.aspect}), tilted by {mounting.tilt_deg:g}",
        f"frames of {plan.frame_s * 1e3:.0f} ms, bins of {plan.bin_hz:.2f} Hz; noise in a bin "
        f"{plan.noise_dbm:.1f} dBm; heard from {plan.needed_snr_db:.1f} dB above it",
    )


def figure_tables(plan: Plan, lines: tuple[Line, ...], ranked: tuple[Choice, ...]) -> tuple[FigureTable, ...]:
    """Give all figures of a plan, the most wanted first."""
    return (
        _measurable(plan),
        _lanes(plan),
        _along(plan),
        _mains(lines),
        _errors(plan),
        _mountings(ranked),
        _density(plan),
    )


def _measurable(plan: Plan) -> FigureTable:
    limits = (("lowest", plan.lowest), ("highest", plan.highest))
    return FigureTable(
        title="Measurable radial speed",
        heads=("", "m/s", "set by"),
        rows=tuple((name, f"{limit.speed_mps:.2f}", limit.set_by) for name, limit in limits),
    )


def _lanes(plan: Plan) -> FigureTable:
    def stretch(found: tuple[float, float] | None) -> str:
        return "-" if found is None else f"{found[0]:.1f} to {found[1]:.1f}"

    def row(lane: Lane, place: str) -> tuple[str, ...]:
        too_fast = lane.target.speed_mps > plan.highest.speed_mps
        return (
            f"{lane.target.name}, {place}",
            f"{lane.nearest_m:.2f}",
            stretch(lane.ahead_m),
            stretch(lane.behind_m),
            f"{lane.dwell_s:.1f}",
            f"{lane.cycles:.0f}",
            "-" if lane.ahead_m is None else f"{lane.mean_bias_ratio:.1%}",
            "too fast" if too_fast else _yes(lane.is_countable),
        )

    places = ("near edge", "middle", "far edge") * 2
    speeds = ", ".join(f"{target.name} at {target.speed_mps:.2f} m/s" for target in (PERSON, CAR))
    return FigureTable(
        title=f"Where the weakest mover is heard ({speeds})",
        heads=("mover", "nearest m", "ahead m", "behind m", "for s", "cycles", "mean bias", "countable"),
        rows=tuple(row(lane, place) for lane, place in zip(plan.lanes, places, strict=True)),
        notes=tuple(f"Cross-sections, {target.name}: {target.source}." for target in (PERSON, CAR)),
    )


def _along(plan: Plan) -> FigureTable:
    along, mover = plan.along(_PLACES_M), plan.expected
    per_mps = hz_per_mps(plan.sensor.carrier_hz)
    return FigureTable(
        title=f"Along the middle of the path, ahead ({mover.name} at {mover.speed_mps:.2f} m/s; "
        f"levels: person {PERSON.usual_m2:g} m2, car {CAR.usual_m2:g} m2)",
        heads=("m", "radial m/s", "bias", "Hz", "beam dB", "person dBm", "SNR dB", "car dBm", "SNR dB"),
        rows=tuple(
            (
                f"{along.x_m[i]:g}",
                f"{mover.speed_mps * along.cosine[i]:.2f}",
                f"{along.cosine[i] - 1:.1%}",
                f"{mover.speed_mps * along.cosine[i] * per_mps:.0f}",
                f"{along.beam_db[i]:.1f}",
                f"{along.person_dbm[i]:.1f}",
                f"{along.person_snr_db[i]:.0f}",
                f"{along.car_dbm[i]:.1f}",
                f"{along.car_snr_db[i]:.0f}",
            )
            for i in range(len(_PLACES_M))
        ),
    )


def _mains(lines: tuple[Line, ...]) -> FigureTable:
    return FigureTable(
        title="Lines of the mains, and the speed that they look like",
        heads=("from", "Hz", "m/s", "movers there", "usual speed"),
        rows=tuple(
            (
                line.made_by,
                f"{line.shift_hz:g}",
                f"{line.speed_mps:.2f}",
                f"{line.hidden_share:.1%}",
                _yes(line.is_expected),
            )
            for line in lines
        ),
    )


def _errors(plan: Plan) -> FigureTable:
    found = speed_errors(plan.sensor.carrier_hz, plan.sensor.mounting.beam_angle_deg)
    return FigureTable(
        title="What a mistake does to a speed read at one place (a passage is fitted over many)",
        heads=("mistake", "reads"),
        rows=tuple((error.cause, f"{error.ratio:+.2%}") for error in found),
    )


def _mountings(ranked: tuple[Choice, ...]) -> FigureTable:
    return FigureTable(
        title="Mountings of the same module, best first",
        heads=("mounting", "countable", "spread m", "uneven dB", "mean bias"),
        rows=tuple(
            (
                choice.name,
                _yes(choice.is_countable),
                f"{choice.farthest_m:.1f}",
                f"{choice.unevenness_db:.0f}",
                "-" if choice.bias_ratio is None else f"{choice.bias_ratio:.1%}",
            )
            for choice in ranked
        ),
    )


def _density(plan: Plan) -> FigureTable:
    carrier_hz = plan.sensor.carrier_hz
    level = public_reference_w_m2(carrier_hz)
    beside = "-" if level is None else f"{level:.2f}"
    notes = [
        "Reference: ICNIRP 2020, local, mean of 6 minutes. What may be emitted, and where, local rules "
        "decide."
    ]
    if any(low_hz <= carrier_hz <= high_hz for low_hz, high_hz in _USA_BANDS_HZ):
        field = field_v_m(plan.module, _USA_AT_M)
        notes.append(
            f"Field at {_USA_AT_M:g} m: {field:.3f} V/m; in the USA {_USA_V_M:g} V/m may be there "
            "(47 CFR 15.245)."
        )
    return FigureTable(
        title=f"Power density on the axis, for information (EIRP {plan.module.eirp_dbm:.1f} dBm; "
        "very near a bound only)",
        heads=("at m", "W/m2", "public reference"),
        rows=tuple(
            (f"{m:g}", f"{w:.2g}", beside)
            for m, w in zip(_DENSITY_AT_M, power_density_w_m2(plan.module, _DENSITY_AT_M), strict=True)
        ),
        notes=tuple(notes),
    )


def _yes(claim: bool) -> str:
    return "yes" if claim else "no"
