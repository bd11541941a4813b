"""Scenes as places are: each hard case is a kind one with a random draw of all that a simulator leaves out.

What the chain is told stays as it was; what is, differs. The extents are those of the project's own list of
requirements where it names them (mounting, bodies, limbs), else common practice, no source.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from tests.accuracy.cases import Case, Kindness, Row

from ginnel import sim
from ginnel.sim.motion import Path
from ginnel.words import MoverKind, Sensor

HEIGHT_M = 0.25
SIDEWAYS_M = 0.3
ANGLE_DEG = 4.0
#: A module keeps within its band: 10.500 to 10.550 GHz, 24.000 to 24.250 GHz.
CARRIER_TOLERANCE = {10.525e9: 25e6 / 10.525e9, 24.125e9: 125e6 / 24.125e9}
_LEVEL = 0.1  # of the kind scene's: the converter's steps are as large as the noise, or nearly so


@dataclass(frozen=True)
class Hardened:
    """Makes the hard case of what makes a kind one."""

    make: Callable[[int], Case]

    def __call__(self, seed: int) -> Case:
        """The hard case of a seed."""
        return harden(self.make(seed), seed)


def hard(row: Row) -> Row:
    """The hard variant of a row, held to the same goals."""
    return replace(row, make=Hardened(row.make), kindness=Kindness.HARD)


def harden(case: Case, seed: int) -> Case:
    """Draw the sensor as it really is, its surroundings, the bodies and their ways."""
    rng = np.random.default_rng([seed, 0x4A2D])
    scene = case.scene
    sideways_m = float(rng.uniform(-SIDEWAYS_M, SIDEWAYS_M))
    sensor = true_sensor(scene.sensor, sideways_m, rng)
    on_foot = all(mover.kind is MoverKind.ON_FOOT for mover in scene.movers)
    width_deg = sensor.mounting.beam_width_deg or (80.0, 40.0)
    return replace(
        case,
        scene=replace(
            scene,
            sensor=sensor,
            movers=tuple(_lively(mover, sideways_m, rng) for mover in scene.movers),
            beam=sim.Beam(
                width_deg=(width_deg[0] * rng.uniform(0.85, 1.2), width_deg[1] * rng.uniform(0.85, 1.2)),
                ripple_db=float(rng.uniform(0.4, 1.0)),
                side_lobes_db=6.0,
                seed=seed,
            ),
            walls=_corridor(sensor, rng) if on_foot and scene.ends_at_sensor else (_floor(rng),),
            receiver=_receiver(scene, rng),
            nuisances=(*scene.nuisances, sim.Hum(level_db=float(rng.uniform(0.0, 15.0)))),
            peak_level=scene.peak_level * _LEVEL,
        ),
    )


def true_sensor(told: Sensor, sideways_m: float, rng: np.random.Generator) -> Sensor:
    """The sensor as it really hangs, and the frequency that it really sends."""
    tolerance = CARRIER_TOLERANCE.get(told.carrier_hz, 0.0)
    mounting = told.mounting
    return replace(
        told,
        carrier_hz=told.carrier_hz * (1 + float(rng.uniform(-tolerance, tolerance))),
        highpass_hz=float(rng.uniform(2.0, 8.0)),
        mounting=replace(
            mounting,
            height_m=mounting.height_m + float(rng.uniform(-HEIGHT_M, HEIGHT_M)),
            offset_m=mounting.offset_m + sideways_m,
            beam_angle_deg=mounting.beam_angle_deg + float(rng.uniform(-ANGLE_DEG, ANGLE_DEG)),
            tilt_deg=mounting.tilt_deg + float(rng.uniform(-ANGLE_DEG, ANGLE_DEG)),
        ),
    )


def _lively(mover: sim.Mover, sideways_m: float, rng: np.random.Generator) -> sim.Mover:
    """A body that differs and fluctuates, on a way that drifts and bends, seen from beside."""
    path = mover.path
    moved = Path(times_s=path.times_s, x_m=path.x_m, y_m=path.y_m + sideways_m)
    body, on_foot = mover.body, mover.kind is MoverKind.ON_FOOT
    if isinstance(body, sim.Walker):
        body = replace(body, limbs_db=float(rng.uniform(-2.0, 5.0)))
    return replace(
        mover,
        path=sim.meandering(
            moved,
            drift_per_m=float(rng.normal(0.0, 0.03 if on_foot else 0.005)),
            swing_m=float(rng.uniform(0.0, 0.25)),
            wave_m=float(rng.uniform(8.0, 20.0) * (1.0 if on_foot else 4.0)),
            start_turns=float(rng.uniform()),
        ),
        body=body,
        power_db=mover.power_db + float(rng.normal(0.0, 2.6)),  # with the kind 1.5 dB: 3 dB
        flicker_db=3.0,
        stride_db=2.0 if on_foot else 0.0,
    )


def _floor(rng: np.random.Generator) -> sim.Floor:
    return sim.Floor(reflection=float(rng.uniform(0.15, 0.4)))


def _corridor(sensor: Sensor, rng: np.random.Generator) -> tuple[sim.Mirror, ...]:
    """Two walls, the floor and a ceiling."""
    middle_m, half_m = sensor.mounting.offset_m, float(rng.uniform(1.1, 2.0))
    return (
        sim.Wall(y_m=middle_m - half_m, reflection=float(rng.uniform(0.15, 0.4))),
        sim.Wall(y_m=middle_m + half_m, reflection=float(rng.uniform(0.15, 0.4))),
        _floor(rng),
        sim.Floor(up_m=sensor.mounting.height_m + 0.4, reflection=float(rng.uniform(0.1, 0.3))),
    )


def _receiver(scene: sim.Scene, rng: np.random.Generator) -> sim.Receiver:
    """Twelve bits, flicker noise, and in every other scene a gain step of up to 6 dB."""
    step = (float(rng.uniform(0.2, 0.8)) * scene.duration_s, float(rng.uniform(-6.0, 6.0)))
    return replace(
        scene.receiver,
        bits=12,
        flicker_corner_hz=float(rng.uniform(5.0, 40.0)),
        gain_steps=(step,) if rng.uniform() < 0.5 else (),
    )
