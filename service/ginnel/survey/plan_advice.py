"""What to do about a plan, in plain sentences."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from ginnel.doppler.kinematics import hz_per_mps
from ginnel.passages.site import beam_db
from ginnel.survey.plan import Lane, Plan
from ginnel.survey.plan_mountings import Choice
from ginnel.survey.plan_radar import most_gain_dbi
from ginnel.survey.plan_speeds import Line
from ginnel.words import Channels

#: Room above the fastest speed for the low-pass of the converter; common practice, no source.
_RATE_MARGIN = 2.5
_LOOKED_AT_M = np.arange(0.5, 25.0, 0.5)
_PLACES = ("near edge", "middle", "far edge")


def advice(plan: Plan, lines: tuple[Line, ...], ranked: tuple[Choice, ...]) -> tuple[str, ...]:
    """Say what is good, what is not and how to mend it; the verdict comes first."""
    return (
        _verdict(plan),
        *_on_the_beam(plan),
        *_on_the_speeds(plan),
        *_on_the_lines(lines),
        *_on_the_mounting(ranked),
        "Levels stand over the module's own noise. Hum, clutter, rain and the converter come on top and "
        "set the reach of most modules: listen where it will hang before you rely on the far end.",
    )


def _verdict(plan: Plan) -> str:
    lanes = plan.lanes_of(plan.expected)
    who = plan.expected.name
    deaf = [name for name, lane in zip(_PLACES, lanes, strict=True) if not lane.is_countable]
    if not deaf:
        return f"A {who} can be counted over the whole width of the path."
    if len(deaf) == len(lanes):
        return f"A {who} cannot be counted with this mounting: {_why(plan, lanes[1])}."
    lane = next(lane for lane in lanes if not lane.is_countable)
    return f"A {who} cannot be counted at the {' and the '.join(deaf)}: {_why(plan, lane)}."


def _why(plan: Plan, lane: Lane) -> str:
    if lane.target.speed_mps > plan.highest.speed_mps:
        return f"it moves faster than {plan.highest.speed_mps:.3g} m/s, the limit by {plan.highest.set_by}"
    if lane.target.speed_mps < plan.lowest.speed_mps:
        return f"it moves slower than {plan.lowest.speed_mps:.3g} m/s, the limit by {plan.lowest.set_by}"
    if lane.ahead_m is None:
        return "its echo is too weak everywhere ahead of the sensor"
    return (
        f"it is heard from {lane.ahead_m[1]:.1f} to {lane.ahead_m[0]:.1f} m ahead, for {lane.dwell_s:.1f} s, "
        "and not close enough to the sensor for long enough to show that it passed"
    )


def _on_the_beam(plan: Plan) -> Iterator[str]:
    mounting = plan.sensor.mounting
    if beam_db(mounting, _LOOKED_AT_M).max() < -6:
        yield (
            "The beam's axis misses the path by far: turn the sensor towards the path, or check the "
            "signs of offset and angle (positive: the path lies on the side to which the beam is turned)."
        )
    width_deg = mounting.beam_width_deg
    if width_deg is not None and plan.module.gain_dbi > most_gain_dbi(width_deg) + 0.5:
        yield (
            f"A beam of {width_deg[0]:g} by {width_deg[1]:g} degrees cannot gain "
            f"{plan.module.gain_dbi:g} dBi, at most {most_gain_dbi(width_deg):.1f}: check the data sheet."
        )


def _on_the_speeds(plan: Plan) -> Iterator[str]:
    per_mps = hz_per_mps(plan.sensor.carrier_hz)
    wanted_hz = _RATE_MARGIN * plan.sensor.max_speed_mps * per_mps
    if plan.sample_rate_hz < wanted_hz:
        yield (
            f"Record at {wanted_hz:.0f} Hz or more: {plan.sample_rate_hz:g} Hz is little for "
            f"{plan.sensor.max_speed_mps:g} m/s."
        )
    if "amplifier" in plan.lowest.set_by and plan.lowest.speed_mps > plan.expected.speed_mps / 3:
        yield (
            f"The amplifier swallows what is slower than {plan.lowest.speed_mps:.2f} m/s: a larger coupling "
            "capacitor would let slow movers through."
        )
    if plan.sensor.channels is Channels.MONO:
        yield (
            "One channel tells the way from the rise and fall of the level; a module with I and Q tells it "
            "at once."
        )


def _on_the_lines(lines: tuple[Line, ...]) -> Iterator[str]:
    expected = [line for line in lines if line.is_expected]
    for line in expected:
        yield (
            f"{line.made_by.capitalize()} at {line.shift_hz:g} Hz would look like {line.speed_mps:.2f} m/s, "
            f"a usual speed here; {line.hidden_share:.0%} of movers are within half a bin of it."
        )
    if any(line.made_by == "lamps" for line in expected):
        yield "Keep fluorescent and cheap LED lamps out of the beam."
    if any(line.made_by == "hum" for line in expected):
        yield "Feed the module from a clean supply, with a short shielded cable."


def _on_the_mounting(ranked: tuple[Choice, ...]) -> Iterator[str]:
    best = ranked[0]
    planned = next(choice for choice in ranked if choice.name == "as planned")
    if not best.is_countable:
        yield "No mounting tried counts over the whole width with this module: mend what is said above first."
    elif best is not planned and not planned.is_countable:
        yield f"Better, if it can be had: {best.name}. It counts over the whole width."
    elif best is not planned and best.farthest_m < planned.farthest_m - 0.2:
        yield (
            f"Better, if it can be had: {best.name}. It passes within {best.farthest_m:.1f} m of everybody "
            f"instead of {planned.farthest_m:.1f} m, so followers are told apart closer to each other."
        )
    if not planned.is_even:
        yield (
            f"A mover on one side of the path is {planned.unevenness_db:.0f} dB louder than on the other "
            "and will hide it when both pass at once: more height or distance evens that out."
        )
