"""What falsifies a speed: lamps that look like one, and a carrier or an angle told wrongly."""

from __future__ import annotations

import math
from dataclasses import dataclass

from ginnel.doppler.kinematics import hz_per_mps
from ginnel.survey.plan_radar import CAR, Target

_N_LAMP_LINES = 6
#: Spread of free walking speeds, m/s: Weidmann, ETH IVT 90 (1993); of cars on one road, a sixth: common
#: practice, no source.
_WALKING_SD_MPS, _DRIVING_SD_RATIO = 0.26, 1 / 6
_NORMAL_95 = 1.6449  # 95th percentile of the normal curve
_ANGLES_OFF_DEG = (1.0, 2.0, 5.0)
_OFFSET_OFF_RATIO = 0.1


@dataclass(frozen=True, slots=True, kw_only=True)
class Line:
    """A line that hum or lamps make, and the radial speed that it looks like."""

    shift_hz: float
    speed_mps: float
    made_by: str
    is_expected: bool  # in the middle nine tenths of the speeds expected here
    hidden_share: float  # of movers, straight towards the sensor, within half a bin of it


@dataclass(frozen=True, slots=True, kw_only=True)
class SpeedError:
    """How far a speed is off when something is told wrongly; 0.01 reads 1 % high."""

    cause: str
    ratio: float


def _spread_mps(target: Target) -> float:
    return _DRIVING_SD_RATIO * target.speed_mps if target is CAR else _WALKING_SD_MPS


def usual_speeds_mps(target: Target) -> tuple[float, float]:
    """Give the middle nine tenths of speeds, as of a normal spread: walkers 0.912 to 1.768 m/s."""
    reach_mps = _NORMAL_95 * _spread_mps(target)
    return target.speed_mps - reach_mps, target.speed_mps + reach_mps


def mains_lines(carrier_hz: float, mains_hz: float, target: Target, bin_hz: float) -> tuple[Line, ...]:
    """Hum, and the first lines of lamps, which flicker at twice the mains frequency.

    100 Hz looks like 1.4242 m/s at 10.525 GHz.
    """
    sd_mps = _spread_mps(target)
    low_mps, high_mps = usual_speeds_mps(target)
    half_bin_mps = bin_hz / 2 / hz_per_mps(carrier_hz)

    def below(speed_mps: float) -> float:
        return 0.5 * (1 + math.erf((speed_mps - target.speed_mps) / (sd_mps * math.sqrt(2))))

    found = []
    for multiple in (1, *range(2, 2 * _N_LAMP_LINES + 1, 2)):
        speed_mps = multiple * mains_hz / hz_per_mps(carrier_hz)
        found.append(
            Line(
                shift_hz=multiple * mains_hz,
                speed_mps=speed_mps,
                made_by="hum" if multiple == 1 else "lamps",
                is_expected=low_mps <= speed_mps <= high_mps,
                hidden_share=below(speed_mps + half_bin_mps) - below(speed_mps - half_bin_mps),
            )
        )
    return tuple(found)


def carrier_error_ratio(true_hz: float, told_hz: float) -> float:
    """Error of all speeds when the carrier is not what the settings say.

    10.587 GHz told as 10.525 reads 0.589 % high.
    """
    return true_hz / told_hz - 1


def angle_error_ratio(true_deg: float, told_deg: float) -> float:
    """Error of a speed read at one angle to the path and divided by the cosine of another.

    15 degrees told as 0 reads 3.407 % low: the cosine is 0.96593.
    """
    return math.cos(math.radians(true_deg)) / math.cos(math.radians(told_deg)) - 1


def distance_error_ratio(x_in_nearest: float, told_over_true: float) -> float:
    """Error of a speed read at x (in nearest distances) when the nearest distance is told wrongly."""
    return math.hypot(x_in_nearest, told_over_true) / math.hypot(x_in_nearest, 1) - 1


def speed_errors(carrier_hz: float, beam_angle_deg: float) -> tuple[SpeedError, ...]:
    """Give the usual mistakes, each with what it does to a single reading of the speed.

    The spread of 25 MHz (below 20 GHz) or 50 MHz is about the width of the bands at 10.525 and 24.125 GHz.
    """
    spread_hz = 25e6 if carrier_hz < 20e9 else 50e6
    found = [
        SpeedError(
            cause=f"carrier {spread_hz / 1e6:g} MHz higher than told",
            ratio=carrier_error_ratio(carrier_hz + spread_hz, carrier_hz),
        )
    ]
    found += [
        SpeedError(
            cause=f"beam at {beam_angle_deg + off_deg:g} degrees, told as {beam_angle_deg:g}",
            ratio=angle_error_ratio(beam_angle_deg + off_deg, beam_angle_deg),
        )
        for off_deg in _ANGLES_OFF_DEG
    ]
    found += [
        SpeedError(
            cause=f"nearest distance told {_OFFSET_OFF_RATIO:.0%} too long, read {x:g} times as far off",
            ratio=distance_error_ratio(x, 1 + _OFFSET_OFF_RATIO),
        )
        for x in (1.0, 3.0)
    ]
    return tuple(found)
