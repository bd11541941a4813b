"""What a sensor will hear of movers on its path, before anybody drills: `make_plan`.

The path runs along x with the sensor line at x = 0 and the beam towards positive x, as in
`doppler.kinematics`. Every figure is for a mover on one line along the path.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from ginnel.doppler.frames import FramePlan, plan_frames
from ginnel.doppler.frontend import CELL_FALSE_ALARM_RATE
from ginnel.doppler.kinematics import cosine, hz_per_mps, nearest_distance_m, range_m, wavelength_m
from ginnel.passages.site import VEHICLE, WALKER, Body, beam_db
from ginnel.survey.plan_radar import CAR, PERSON, RadarModule, Target, needed_snr_db, noise_dbm, received_dbm
from ginnel.words import FloatArray, Mounting, Sensor

#: Noise bandwidth of a Hann window, bins (Harris 1978).
_HANN_BINS = 1.5
#: Half the main lobe of a Hann window: nearer to 0 Hz a line merges with what stands still.
_CLEAR_BINS = 2
#: A mover is heard where this share of frames shows it.
_DETECTION_RATE = 0.9
_LEAST_FRAMES = 4  # without overlap, in which a mover must be heard; common practice, no source
_STEP_M = 0.02


@dataclass(frozen=True, slots=True, kw_only=True)
class Limit:
    """A bound of the measurable radial speed, and what sets it."""

    speed_mps: float
    set_by: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Lane:
    """What is heard of one target whose centre moves along one line of the path.

    Stretches are (nearest, farthest) distances from the sensor line, m, on either side of it.
    """

    target: Target
    y_m: float  # from the middle of the path, away from the sensor is positive
    nearest_m: float
    ahead_m: tuple[float, float] | None
    behind_m: tuple[float, float] | None
    dwell_s: float
    cycles: float  # of the Doppler tone in the time heard
    mean_bias_ratio: float | None  # of radial speed against speed, over the stretch ahead; 0 is unbiased
    peak_dbm: float
    is_countable: bool  # heard for long enough, and near enough to the sensor to show the crossing


@dataclass(frozen=True, slots=True, kw_only=True)
class Along:
    """Levels and geometry at places ahead of the sensor, arrays of one shape, for the path's middle."""

    x_m: FloatArray
    range_m: FloatArray
    cosine: FloatArray
    beam_db: FloatArray  # both ways
    person_dbm: FloatArray
    person_snr_db: FloatArray
    car_dbm: FloatArray
    car_snr_db: FloatArray


@dataclass(frozen=True, slots=True, kw_only=True)
class Plan:
    """All that a planned mounting will hear."""

    sensor: Sensor
    module: RadarModule
    path_width_m: float
    sample_rate_hz: float
    bin_hz: float
    frame_s: float
    noise_dbm: float  # in one bin, white
    needed_snr_db: float
    lowest: Limit
    highest: Limit
    lanes: tuple[Lane, ...]  # person, then car; each near edge, middle, far edge

    def lanes_of(self, target: Target) -> tuple[Lane, ...]:
        """Near edge, middle and far edge of the path for one target."""
        return tuple(lane for lane in self.lanes if lane.target is target)

    @property
    def expected(self) -> Target:
        """What the sensor's speeds are made for."""
        return CAR if self.sensor.max_speed_mps >= CAR.speed_mps else PERSON

    def along(self, x_m: FloatArray) -> Along:
        """Level, signal to noise and geometry at places along the middle of the path."""
        mounting, carrier_hz = self.sensor.mounting, self.sensor.carrier_hz
        nearest_m = nearest_distance_m(mounting)
        distance_m, one_way_db = range_m(x_m, nearest_m), np.minimum(beam_db(mounting, x_m), 0.0)
        levels = {
            t.name: received_dbm(self.module, carrier_hz, t.usual_m2, distance_m, one_way_db)
            for t in (PERSON, CAR)
        }
        noises = {t.name: _noise_of(self.sensor, self.module, self.bin_hz, t, x_m) for t in (PERSON, CAR)}
        return Along(
            x_m=x_m,
            range_m=distance_m,
            cosine=cosine(x_m, nearest_m),
            beam_db=2 * one_way_db,
            person_dbm=levels["person"],
            person_snr_db=levels["person"] - noises["person"],
            car_dbm=levels["car"],
            car_snr_db=levels["car"] - noises["car"],
        )


def make_plan(
    sensor: Sensor, module: RadarModule, *, path_width_m: float = 2.0, sample_rate_hz: float = 8000.0
) -> Plan:
    """Reckon what a planned mounting will hear.

    Parameters
    ----------
    sensor : carrier, channels, speeds, amplifier's lower corner and mounting
    module : what the data sheet says
    path_width_m : width in which people or vehicles move, m, centred on the path's middle
    sample_rate_hz : Hz, at which the module's output will be recorded

    Raises
    ------
    ValueError
        path_width_m or sample_rate_hz is not positive.
    """
    if path_width_m <= 0 or sample_rate_hz <= 0:
        raise ValueError(f"{path_width_m=} and {sample_rate_hz=} must be positive")
    frames = plan_frames(sensor, sample_rate_hz)
    lowest, highest = _speed_limits(sensor, module, frames)
    needed_db = needed_snr_db(_DETECTION_RATE, CELL_FALSE_ALARM_RATE)
    return Plan(
        sensor=sensor,
        module=module,
        path_width_m=path_width_m,
        sample_rate_hz=sample_rate_hz,
        bin_hz=frames.bin_hz,
        frame_s=1 / frames.bin_hz,
        noise_dbm=float(noise_dbm(module, _HANN_BINS * frames.bin_hz)),
        needed_snr_db=needed_db,
        lowest=lowest,
        highest=highest,
        lanes=tuple(
            _lane(sensor, module, frames, target, y_m, (lowest, highest), needed_db)
            for target in (PERSON, CAR)
            for y_m in (-path_width_m / 2, 0.0, path_width_m / 2)
        ),
    )


def on_line(mounting: Mounting, y_m: float) -> Mounting:
    """Return the mounting as a mover sees it that keeps y_m beyond the path's middle."""
    away = -1.0 if mounting.offset_m < 0 else 1.0
    return replace(mounting, offset_m=mounting.offset_m + away * y_m)


def _speed_limits(sensor: Sensor, module: RadarModule, frames: FramePlan) -> tuple[Limit, Limit]:
    """Lowest and highest radial speed, each with the part that sets it."""
    per_mps = hz_per_mps(sensor.carrier_hz)
    lows = [
        Limit(speed_mps=sensor.min_speed_mps, set_by="min_speed_mps in the settings"),
        Limit(speed_mps=_CLEAR_BINS * frames.bin_hz / per_mps, set_by="the length of a frame"),
    ]
    if sensor.highpass_hz is not None:
        lows.append(Limit(speed_mps=sensor.highpass_hz / per_mps, set_by="the amplifier's lower corner"))
    highs = [
        Limit(speed_mps=sensor.max_speed_mps, set_by="max_speed_mps in the settings"),
        Limit(speed_mps=frames.sample_rate_hz / 2 / per_mps, set_by="half the sample rate"),
    ]
    if module.lowpass_hz is not None:
        highs.append(Limit(speed_mps=module.lowpass_hz / per_mps, set_by="the amplifier's upper corner"))
    return max(lows, key=lambda limit: limit.speed_mps), min(highs, key=lambda limit: limit.speed_mps)


def _noise_of(
    sensor: Sensor, module: RadarModule, bin_hz: float, target: Target, x_m: FloatArray
) -> FloatArray:
    """Noise in the bin where the target's line lies, dBm."""
    along = np.abs(cosine(x_m, nearest_distance_m(sensor.mounting)))
    shift_hz = np.maximum(target.speed_mps * along * hz_per_mps(sensor.carrier_hz), bin_hz / 2)
    return noise_dbm(module, _HANN_BINS * bin_hz, shift_hz)


def _lane(
    sensor: Sensor,
    module: RadarModule,
    frames: FramePlan,
    target: Target,
    y_m: float,
    limits: tuple[Limit, Limit],
    needed_db: float,
) -> Lane:
    """Follow the weakest such target along one line."""
    body: Body = VEHICLE if target is CAR else WALKER
    sensor = replace(sensor, mounting=on_line(sensor.mounting, y_m))
    nearest_m = nearest_distance_m(sensor.mounting)
    half_m = np.arange(_STEP_M / 2, body.reach_m, _STEP_M)
    x_m = np.concatenate([-half_m[::-1], half_m])
    distance_m = range_m(x_m, nearest_m)
    level_dbm = received_dbm(
        module, sensor.carrier_hz, target.low_m2, distance_m, np.minimum(beam_db(sensor.mounting, x_m), 0.0)
    )
    snr_db = level_dbm - _noise_of(sensor, module, frames.bin_hz, target, x_m)
    ratio = np.abs(cosine(x_m, nearest_m))
    radial_mps = target.speed_mps * ratio
    heard = (snr_db >= needed_db) & (radial_mps >= limits[0].speed_mps) & (radial_mps <= limits[1].speed_mps)
    ahead, behind = x_m[heard & (x_m > 0)], -x_m[heard & (x_m < 0)]
    dwell_s = float(np.count_nonzero(heard)) * _STEP_M / target.speed_mps
    bend_m = max(body.bend_ratio * nearest_m, _STEP_M) + body.length_m / 2
    enough = dwell_s * frames.bin_hz >= _LEAST_FRAMES
    return Lane(
        target=target,
        y_m=y_m,
        nearest_m=nearest_m,
        ahead_m=(float(ahead.min()), float(ahead.max())) if len(ahead) else None,
        behind_m=(float(behind.min()), float(behind.max())) if len(behind) else None,
        dwell_s=dwell_s,
        # every half wavelength of distance is a cycle
        cycles=float(np.sum(ratio[heard]) * _STEP_M / (wavelength_m(sensor.carrier_hz) / 2)),
        mean_bias_ratio=float(np.mean(ratio[heard & (x_m > 0)]) - 1) if len(ahead) else None,
        peak_dbm=float(level_dbm.max()),
        is_countable=bool(enough and len(ahead) and ahead.min() <= bend_m),
    )
