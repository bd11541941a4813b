"""What one mounting makes of a mover: its Doppler line and its level along the path.

Positions are metres along the path, x = 0 beside the sensor. Levels are natural logarithms of
power. Everything that may differ between sites is a prior here, wide enough for a mounting told
wrongly, and every fit may move away from it at a price.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ginnel.doppler.frames import FramePlan
from ginnel.doppler.kinematics import BODY_CENTRE_M, hz_per_mps, nearest_distance_m
from ginnel.words import Aspect, Channels, FloatArray, Mounting, Sensor

#: Natural-log units of power in one decibel.
NEPERS_PER_DB = np.log(10.0) / 10.0
#: Zones along the path end at these multiples of the nearest distance.
_ZONE_RATIOS = (1.0, 2.0, 4.5, 10.0, 25.0)
N_ZONES = len(_ZONE_RATIOS)
#: Squared cosine between path and line of sight there: how well a zone shows the speed.
ZONE_COSINE2 = 1.0 - 1.0 / np.array(_ZONE_RATIOS) ** 2
#: Half-power beam widths of a small patch module, degrees; common practice, no source.
_USUAL_BEAM_DEG = (80.0, 40.0)
#: Side and back lobes of such a module, one way; common practice, no source.
_SIDE_LOBE_DB, _BACK_LOBE_DB = -13.0, -23.0
#: Sites whose fastest speed is above this look at vehicles.
_VEHICLE_MAX_SPEED_MPS = 12.0


@dataclass(frozen=True, slots=True)
class Body:
    """How far a mover is from being a point."""

    length_m: float  # along the path: the spread of its own aspect angles near the sensor
    limb_share: float  # of the power, spread about the line by limbs or wheels
    gait_ratio: float  # rms wobble of the torso's speed, as a share of it
    reach_m: float  # how far along the path it may be heard
    same_within_m: float  # crossings closer than this belong to one body
    longest_m: float  # no body is longer
    bend_ratio: float  # a line heard this near to the sensor, in nearest distances, shows its bend
    may_turn: bool  # walkers do; vehicles on a road hardly ever
    claim_db: float  # how far above its level a mover's line may be and still be its own
    # Prior spreads, weighed against evidence that model errors limit (see ``fit.SATURATION``):
    zone_level_sd: float  # log power in one zone against the nominal curve
    level_slope_sd: float  # its slope with log distance; nominally R^-4
    drift_sd: float  # relative change of speed in one zone
    drift_step_sd: float  # the same, from one zone to the next
    # No zone departs further than this from the whole, whatever it would gain:
    most_level: float
    most_drift: float
    offset_log_sd: float  # nearest distance, relative: a mounting or a lane told wrongly


#: Torso swing of the Boulic-Thalmann walk, +-0.245 m/s at 1.34 m/s, is 0.13 rms.
WALKER = Body(
    length_m=0.3,
    limb_share=0.4,
    gait_ratio=0.12,
    reach_m=25.0,
    same_within_m=0.95,
    longest_m=1.2,
    bend_ratio=1.0,
    may_turn=True,
    claim_db=3.0,
    zone_level_sd=1.5 * NEPERS_PER_DB,
    level_slope_sd=0.3,
    drift_sd=0.05,
    drift_step_sd=0.04,
    most_level=6.0 * NEPERS_PER_DB,
    most_drift=0.12,
    offset_log_sd=0.12,
)
#: Drivers brake and speed up; ground reflections and compression make R^-2 to R^-6 of R^-4.
VEHICLE = Body(
    length_m=3.0,
    limb_share=0.03,
    gait_ratio=0.01,
    reach_m=150.0,
    same_within_m=12.0,
    longest_m=18.75,  # the longest road train, Council Directive 96/53/EC, from memory
    bend_ratio=0.4,
    may_turn=False,
    claim_db=10.0,
    zone_level_sd=4.0 * NEPERS_PER_DB,
    level_slope_sd=0.8,
    drift_sd=0.04,
    drift_step_sd=0.06,
    most_level=20.0 * NEPERS_PER_DB,
    most_drift=0.3,
    offset_log_sd=0.12,
)


class Site:
    """Doppler line and level of movers at one mounting; frozen after birth."""

    def __init__(self, sensor: Sensor, plan: FramePlan) -> None:
        self.sensor = sensor
        self.plan = plan
        self.is_iq = sensor.channels is Channels.IQ
        self.body = VEHICLE if sensor.max_speed_mps > _VEHICLE_MAX_SPEED_MPS else WALKER
        self.bins_per_mps = hz_per_mps(sensor.carrier_hz) / plan.bin_hz
        self.frame_s = plan.frame_len * plan.factor / plan.sample_rate_hz
        self.frame_rate_hz = plan.frame_rate_hz
        self.offset_m = max(0.3, nearest_distance_m(sensor.mounting))
        self.zone_edges = np.log(np.array(_ZONE_RATIOS) * max(self.offset_m, 1.0))
        self._curve_x_m = np.concatenate([-np.geomspace(300, 0.01, 300), np.geomspace(0.01, 300, 600)])
        level = self._nominal_level(self._curve_x_m)
        self._curve = level - level.max()
        audible = self._curve[self._curve_x_m < 0] > -30 * NEPERS_PER_DB
        behind = -self._curve_x_m[self._curve_x_m < 0][audible]
        #: How far behind the sensor line a mover may still be heard.
        self.behind_m = float(behind.max()) if len(behind) else 0.0
        slope = self.zone_edges - self.zone_edges.mean()
        covariance = (
            self.body.zone_level_sd**2 * np.eye(N_ZONES)
            + self.body.level_slope_sd**2 * np.outer(slope, slope)
            + 1e2 * np.ones((N_ZONES, N_ZONES))  # the body's own size is not known at all
        )
        #: Prior precision of zone levels about their mean, and of zone drifts.
        self.level_precision: FloatArray = np.linalg.inv(covariance)
        step = np.diff(np.eye(N_ZONES), axis=0)
        self.drift_precision: FloatArray = (
            step.T @ step / self.body.drift_step_sd**2 + np.eye(N_ZONES) / self.body.drift_sd**2
        )

    def nominal_level(self, x_m: FloatArray) -> FloatArray:
        """Level along the path relative to its maximum, from the beam twice and R^-4."""
        return np.asarray(np.interp(x_m, self._curve_x_m, self._curve))

    def zone_weights(self, log_range: FloatArray) -> FloatArray:
        """Share of each zone at log distances: hat functions, shape (N_ZONES, *log_range.shape)."""
        edges = self.zone_edges
        clipped = np.clip(log_range, edges[0], edges[-1])
        weights = np.empty((N_ZONES, *log_range.shape))
        position = np.interp(clipped, edges, np.arange(N_ZONES))
        for zone in range(N_ZONES):
            weights[zone] = np.maximum(0.0, 1.0 - np.abs(position - zone))
        return weights

    def _nominal_level(self, x_m: FloatArray) -> FloatArray:
        both_ways_db = 2 * beam_db(self.sensor.mounting, x_m)
        return np.asarray(both_ways_db * NEPERS_PER_DB - 4 * np.log(np.hypot(x_m, self.offset_m)))


def beam_db(mounting: Mounting, x_m: FloatArray) -> FloatArray:
    """Gain towards a mover's centre line at places along the path, one way, dB against the beam's axis.

    A Gaussian main lobe with the mounting's half-power widths, on side and back lobes.
    """
    width_deg = mounting.beam_width_deg or _USUAL_BEAM_DEG
    drop_m = mounting.height_m - BODY_CENTRE_M
    beam_deg = mounting.beam_angle_deg if mounting.aspect is Aspect.OBLIQUE else 0.0
    azimuth_deg = np.degrees(np.arctan2(mounting.offset_m, x_m)) - beam_deg
    elevation_deg = np.degrees(np.arctan2(drop_m, np.hypot(x_m, mounting.offset_m))) - mounting.tilt_deg
    main_db = -3.0 * ((2 * azimuth_deg / width_deg[0]) ** 2 + (2 * elevation_deg / width_deg[1]) ** 2)
    lobe_db = np.where(x_m > 0, _SIDE_LOBE_DB, _BACK_LOBE_DB)
    return np.asarray(10 * np.log10(10 ** (main_db / 10) + 10 ** (lobe_db / 10)))
