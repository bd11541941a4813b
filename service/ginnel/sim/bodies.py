"""What moves: bodies as a few scatterers that swing, roll and turn about a centre.

A body knows nothing of sensors or paths: given the phase of its cycle (gait, pedals, wheels) and
its speed it says where its scatterers are, in metres forward, left and up of the point on the
floor beneath it, and how strongly each reflects (power, in m^2 for a body of 0 dB).

Walkers follow Boulic, Thalmann and Thalmann, "A global human walking model with real-time kinematic
personification", The Visual Computer 6 (1990) 344-358. Joint angles: the control points for
relative speeds 0.5 to 1.3, scaled down below and kept above. Elbows are common practice, no source.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Protocol

import numpy as np

from ginnel.words import FloatArray

_TAU = 2 * np.pi

# Segment lengths as fractions of stature (the model's own).
_HIP_HEIGHT, _TORSO, _HEAD = 0.491, 0.288, 0.130
_THIGH, _SHANK, _FOOT = 0.245, 0.246, 0.143
_UPPER_ARM, _LOWER_ARM = 0.188, 0.152
_HALF_SHOULDER, _HALF_HIP = 0.1295, 0.0955

# Joint control points: (share of the cycle, degrees), joined by a monotone cubic.
_HIP = ((-0.1, 25.0), (0.5, -15.0), (0.9, 25.0))
_KNEE = ((0.0, 3.0), (0.17, 3.0), (0.4, 3.0), (0.75, 70.0), (1.0, 3.0))


class Body(Protocol):
    """Anything that moves and reflects."""

    def cycle_rate_hz(self, speed_mps: FloatArray) -> FloatArray:
        """Cycles a second at a speed, shape kept."""

    def places_m(self, phase: FloatArray, speed_mps: FloatArray) -> FloatArray:
        """Forward, left and up of each scatterer, shape (scatterers, times, 3); phase in cycles."""

    def powers(self, facing: FloatArray) -> FloatArray:
        """Reflected power of each scatterer, shape (scatterers, times).

        ``facing`` is the cosine between heading and the way to the sensor: 1 head on, -1 from behind.
        """


def relative_speed(speed_mps: FloatArray, stature_m: float) -> FloatArray:
    """Speed in hip heights a second: the model's RV."""
    return np.asarray(speed_mps) / (_HIP_HEIGHT * stature_m)


def cycle_s(speed_mps: float, stature_m: float = 1.75) -> float:
    """Duration of a walking cycle (two steps): 1.346 / sqrt(RV). 1.34 m/s gives 1.0778 s."""
    return float(1.346 / np.sqrt(relative_speed(np.asarray(speed_mps), stature_m)))


def cycle_length_m(speed_mps: float, stature_m: float = 1.75) -> float:
    """Way covered in a walking cycle: 1.346 sqrt(RV) hip heights. 1.34 m/s gives 1.4443 m."""
    return speed_mps * cycle_s(speed_mps, stature_m)


def support_s(speed_mps: float, stature_m: float = 1.75) -> float:
    """Time for which one foot is on the floor in a cycle: 0.752 Dc - 0.143."""
    return 0.752 * cycle_s(speed_mps, stature_m) - 0.143


def _joint(points: tuple[tuple[float, float], ...], phase: FloatArray) -> FloatArray:
    """Angle in radians, from a periodic monotone cubic through the control points."""
    from scipy.interpolate import PchipInterpolator

    grid = np.linspace(0.0, 1.0, 257)
    places, degrees = np.array(points).T
    curve = PchipInterpolator(places, degrees)
    # Points may begin before 0: what lies beyond the last one is the next cycle's beginning.
    angles = curve(np.where(grid > places[-1], grid - 1.0, grid))
    return np.asarray(np.deg2rad(np.interp(phase % 1.0, grid, angles)))


@dataclass(frozen=True, slots=True, kw_only=True)
class Walker:
    """A person on foot: torso, head, arms, legs; ``running`` swings further and faster.

    ``limbs_db`` makes arms and legs stronger: at 5 dB a thigh is as strong as the torso.
    """

    stature_m: float = 1.75
    running: bool = False
    limbs_db: float = 0.0

    def cycle_rate_hz(self, speed_mps: FloatArray) -> FloatArray:
        """Cycles a second; runners keep about 165 steps a minute (common practice, no source)."""
        rate_hz = np.sqrt(relative_speed(np.abs(speed_mps), self.stature_m)) / 1.346
        return np.asarray(np.where(speed_mps > 0.3, 1.38, rate_hz) if self.running else rate_hz)

    def torso_m(self, phase: FloatArray, speed_mps: FloatArray) -> FloatArray:
        """Forward, left and up movement of the torso about its even motion, shape (times, 3)."""
        rv = relative_speed(speed_mps, self.stature_m)
        slow = np.minimum(rv, 0.5)
        forward_a = -0.084 * slow**2 + 0.084 * slow  # 0.021 from RV = 0.5 on
        lateral_a = -0.128 * slow**2 + 0.128 * slow  # 0.032
        vertical_a = 0.015 * rv
        duration_s = 1.346 / np.sqrt(np.maximum(rv, 0.05))
        lag = 0.625 - (0.752 - 0.143 / duration_s)
        grow = 1.5 if self.running else 1.0
        forward = -forward_a * np.sin(_TAU * (2 * phase + 2 * lag))
        left = -lateral_a * np.sin(_TAU * (phase - 0.1))
        up = -vertical_a + vertical_a * np.sin(_TAU * (2 * phase - 0.35))
        return np.stack([grow * forward, left, grow * up], axis=-1)

    def places_m(self, phase: FloatArray, speed_mps: FloatArray) -> FloatArray:
        """Torso, head, then for each side upper arm, hand, thigh, shank, foot: 12 scatterers."""
        h = self.stature_m
        rv = relative_speed(speed_mps, h)
        swing = np.minimum(rv / 0.5, 1.0) * (1.4 if self.running else 1.0)
        sway = self.torso_m(phase, speed_mps)
        hip_up = _HIP_HEIGHT * h
        zero = np.zeros_like(phase)
        parts = [
            np.stack([zero, zero, zero + hip_up + 0.6 * _TORSO * h], -1),
            np.stack([zero, zero, zero + hip_up + (_TORSO + 0.7 * _HEAD) * h], -1),
        ]
        for side, lag in ((1.0, 0.5), (-1.0, 0.0)):
            t = phase + lag
            arm_a = np.deg2rad(9.88) * np.minimum(rv, 2.3)
            shoulder = np.deg2rad(3.0) * swing - arm_a / 2 - arm_a * np.cos(_TAU * t)
            elbow = np.deg2rad(90.0 if self.running else 20.0) * swing + arm_a * (
                0.5 - 0.5 * np.cos(_TAU * t)
            )
            y = zero + side * _HALF_SHOULDER * h
            z = hip_up + _TORSO * h
            upper, lower = _UPPER_ARM * h, _LOWER_ARM * h
            parts.append(
                np.stack([0.5 * upper * np.sin(shoulder), y, z - 0.5 * upper * np.cos(shoulder)], -1)
            )
            fore = shoulder + elbow
            parts.append(
                np.stack(
                    [
                        upper * np.sin(shoulder) + 0.8 * lower * np.sin(fore),
                        y,
                        z - upper * np.cos(shoulder) - 0.8 * lower * np.cos(fore),
                    ],
                    -1,
                )
            )
            thigh = swing * _joint(_HIP, t)
            shin = thigh - swing * _joint(_KNEE, t)
            y = zero + side * _HALF_HIP * h
            knee_x, knee_z = _THIGH * h * np.sin(thigh), hip_up - _THIGH * h * np.cos(thigh)
            ankle_x, ankle_z = knee_x + _SHANK * h * np.sin(shin), knee_z - _SHANK * h * np.cos(shin)
            parts.append(np.stack([0.5 * knee_x, y, 0.5 * (hip_up + knee_z)], -1))
            parts.append(np.stack([0.5 * (knee_x + ankle_x), y, 0.5 * (knee_z + ankle_z)], -1))
            parts.append(np.stack([ankle_x + 0.3 * _FOOT * h * np.cos(shin), y, ankle_z], -1))
        return np.stack(parts) + sway

    def powers(self, facing: FloatArray) -> FloatArray:
        """Torso 1, head 0.1, then upper arm, hand, thigh, shank and foot.

        The shares are tuned on the four recordings of real walkers at 24 GHz, 2026-12-01, so that the power
        above 1.8 times the torso's frequency is about 1 % (there 0.3 to 1.9 %) and that within 0.8 to 1.25
        times about 74 % (there 45 to 70 %: real people also change their pace).
        """
        side = 10 ** (self.limbs_db / 10) * np.array([0.10, 0.08, 0.35, 0.08, 0.01])
        return np.asarray(np.array([1.0, 0.10, *side, *side])[:, None] * np.ones_like(facing))


@dataclass(frozen=True, slots=True, kw_only=True)
class Trolley:
    """A person who pushes something on wheels: the walker and a stiff load in front."""

    stature_m: float = 1.75
    length_m: float = 0.9

    def cycle_rate_hz(self, speed_mps: FloatArray) -> FloatArray:
        """As the walker's."""
        return Walker(stature_m=self.stature_m).cycle_rate_hz(speed_mps)

    def places_m(self, phase: FloatArray, speed_mps: FloatArray) -> FloatArray:
        """Return the walker's places, arms held still, and two corners of the load."""
        places = Walker(stature_m=self.stature_m).places_m(phase, speed_mps)
        torso = places[0]
        for arm in (2, 3, 7, 8):
            places[arm] = torso + np.array([0.25, 0.0, -0.2])
        load = np.zeros((2, *torso.shape))
        load[0] += np.array([0.5, 0.0, 0.7])
        load[1] += np.array([0.5 + self.length_m, 0.0, 0.5])
        return np.concatenate([places, load])

    def powers(self, facing: FloatArray) -> FloatArray:
        """Return the walker's powers and the load's, stronger on the side that is seen."""
        walker = Walker().powers(facing)
        front = 0.5 + 0.4 * facing
        return np.concatenate([walker, np.stack([0.3 * (1.3 - front), 0.6 * front])])


@dataclass(frozen=True, slots=True, kw_only=True)
class Cyclist:
    """A person on a bicycle: torso and frame ride evenly, legs and wheels go round."""

    cadence_hz: float = 1.2  # turns of the pedals a second; common practice, no source
    wheel_m: float = 0.34

    def cycle_rate_hz(self, speed_mps: FloatArray) -> FloatArray:
        """Wheel turns a second: the cycle of this body is its wheel."""
        return np.asarray(speed_mps / (_TAU * self.wheel_m))

    def places_m(self, phase: FloatArray, speed_mps: FloatArray) -> FloatArray:
        """Torso, frame, two knees, rims of two wheels."""
        zero = np.zeros_like(phase)
        pedal = _TAU * phase * (self.cadence_hz * _TAU * self.wheel_m / 5.0)  # one gear, made for 5 m/s
        turn = _TAU * phase
        parts = [
            np.stack([zero - 0.1, zero, zero + 1.25], -1),
            np.stack([zero, zero, zero + 0.65], -1),
            np.stack([0.1 + 0.15 * np.cos(pedal), zero + 0.1, 0.75 + 0.15 * np.sin(pedal)], -1),
            np.stack([0.1 - 0.15 * np.cos(pedal), zero - 0.1, 0.75 - 0.15 * np.sin(pedal)], -1),
        ]
        rim_m, rim_up = self.wheel_m * np.sin(turn), self.wheel_m * (1 + np.cos(turn))
        # The top of a rim runs ahead at twice the speed.
        parts += [np.stack([hub_m + rim_m, zero, rim_up], -1) for hub_m in (0.52, -0.52)]
        return np.stack(parts)

    def powers(self, facing: FloatArray) -> FloatArray:
        """Torso 1, frame 0.4, knees and rims little."""
        return np.asarray(np.array([1.0, 0.4, 0.08, 0.08, 0.03, 0.03])[:, None] * np.ones_like(facing))


@dataclass(frozen=True, slots=True, kw_only=True)
class Vehicle:
    """A motor vehicle: front, two places along the body, rear, four points on wheels.

    ``power_m2`` is the strength of the face it shows. Figures of order, common practice, no source:
    motorcycle 3, car 10, van 20, bus or lorry 60.
    """

    length_m: float = 4.4
    width_m: float = 1.7
    height_m: float = 0.7
    power_m2: float = 10.0
    wheel_m: float = 0.31

    def cycle_rate_hz(self, speed_mps: FloatArray) -> FloatArray:
        """Wheel turns a second."""
        return np.asarray(speed_mps / (_TAU * self.wheel_m))

    def places_m(self, phase: FloatArray, speed_mps: FloatArray) -> FloatArray:
        """Front, bonnet, cabin, rear, then one point on the rim of each wheel."""
        ones = np.ones_like(phase)
        half, side = self.length_m / 2, self.width_m / 2
        stiff = [
            (half, 0.0, self.height_m),
            (0.3 * half, 0.5 * side, 1.3 * self.height_m),
            (-0.2 * half, -0.5 * side, 1.5 * self.height_m),
            (-half, 0.0, self.height_m),
        ]
        parts = [np.stack([x * ones, y * ones, z * ones], -1) for x, y, z in stiff]
        for number, (hub_m, y) in enumerate(
            ((0.6 * half, side), (0.6 * half, -side), (-0.6 * half, side), (-0.6 * half, -side))
        ):
            turn = _TAU * (phase + 0.23 * number)
            forward = hub_m + self.wheel_m * np.sin(turn)
            parts.append(np.stack([forward, y * ones, self.wheel_m * (1 + np.cos(turn))], -1))
        return np.stack(parts)

    def powers(self, facing: FloatArray) -> FloatArray:
        """Return powers: the face towards the sensor is strong, the other one almost hidden."""
        ahead = np.clip(0.5 + 0.5 * facing, 0.03, 1.0) ** 2
        behind = np.clip(0.5 - 0.5 * facing, 0.03, 1.0) ** 2
        ones = np.ones_like(facing)
        body = [0.15 * ones, 0.15 * ones]
        return np.asarray(self.power_m2 * np.stack([ahead, *body, behind, *([0.01 * ones] * 4)]))


MOTORCYCLE = Vehicle(length_m=2.1, width_m=0.5, height_m=0.8, power_m2=3.0)
CAR = Vehicle()
VAN = Vehicle(length_m=5.9, width_m=2.0, height_m=1.0, power_m2=20.0, wheel_m=0.34)
BUS = Vehicle(length_m=11.5, width_m=2.5, height_m=1.3, power_m2=60.0, wheel_m=0.48)
