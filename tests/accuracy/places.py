"""The invented sites of the scoreboard: where the sensor hangs, and the walks by which a site is learnt."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace

import numpy as np
from tests.accuracy.cases import Case

from ginnel import sim
from ginnel.words import Aspect, Channels, Direction, Mounting, Sensor

RATE_HZ = 2000.0
EDGE_S = 16.0  # nobody crosses so near to an end of a scene: a slow walker is seen for as long
FAR_M = 15.0
WAYS = (Direction.APPROACHING, Direction.RECEDING)
X_BAND_HZ = 10.525e9
K_BAND_HZ = 24.125e9
#: Free walking speeds: Weidmann (ETH IVT 90, 1993), kept within what one meets in a corridor.
SPEED_MPS = (1.34, 0.26)

#: Makes a mover that crosses at a moment.
MakeMover = Callable[[np.random.Generator, float], sim.Mover]


def corridor(channels: Channels = Channels.MONO, **changes: object) -> Sensor:
    """A sensor at the end of a corridor, high on the wall, looking down along it."""
    sensor = Sensor(
        name="corridor",
        channels=channels,
        mounting=Mounting(height_m=2.4, tilt_deg=15.0, beam_width_deg=(80.0, 40.0)),
    )
    return replace(sensor, **changes)  # type: ignore[arg-type]  # the fields are checked where they are named


def wayside(channels: Channels, *, angle_deg: float, offset_m: float) -> Sensor:
    """A sensor beside a path, looking across it at an angle."""
    return Sensor(
        name="wayside",
        channels=channels,
        mounting=Mounting(
            aspect=Aspect.OBLIQUE,
            height_m=1.8,
            offset_m=offset_m,
            beam_angle_deg=angle_deg,
            tilt_deg=5.0,
            beam_width_deg=(80.0, 40.0),
        ),
    )


def roadside(channels: Channels, carrier_hz: float) -> Sensor:
    """A sensor on a pole beside a road, looking along it at a small angle."""
    return Sensor(
        name="roadside",
        carrier_hz=carrier_hz,
        channels=channels,
        max_speed_mps=60.0,
        min_speed_mps=2.0,
        speed_bands_mps=(8.0, 14.0, 20.0),
        mounting=Mounting(
            aspect=Aspect.OBLIQUE,
            height_m=2.5,
            offset_m=4.0,
            beam_angle_deg=15.0,
            tilt_deg=3.0,
            beam_width_deg=(40.0, 40.0),
        ),
    )


def walking_speed_mps(rng: np.random.Generator) -> float:
    """Draw a free walking speed."""
    return float(np.clip(rng.normal(*SPEED_MPS), 0.8, 2.0))


def way(rng: np.random.Generator) -> Direction:
    """Draw a direction."""
    return WAYS[int(rng.integers(2))]


def walks(
    rng: np.random.Generator,
    crossed_s: float,
    *,
    speed_mps: float | None = None,
    direction: Direction | None = None,
    centre_m: float = 0.0,
    behind_m: float = 0.5,
) -> sim.Mover:
    """Somebody who walks through as people do: stature, line, strength and pace are drawn."""
    return sim.walker(
        crossed_s=crossed_s,
        speed_mps=speed_mps or walking_speed_mps(rng),
        direction=direction or way(rng),
        far_m=FAR_M,
        behind_m=behind_m,
        y_m=centre_m + float(np.clip(rng.normal(0.0, 0.3), -0.8, 0.8)),
        stature_m=float(np.clip(rng.normal(1.72, 0.09), 1.5, 2.0)),
        unsteady=0.03,
        power_db=float(rng.normal(0.0, 1.5)),
        seed=int(rng.integers(2**31)),
    )


def one_by_one(
    rng: np.random.Generator,
    n: int,
    make: MakeMover = walks,
    *,
    from_s: float = 0.0,
    alone_s: float = 20.0,
    mean_wait_s: float = 6.0,
) -> tuple[list[sim.Mover], float]:
    """Movers at Poisson arrivals with a dead time, so that each is alone; and when it is over."""
    movers, at_s = [], from_s
    for _ in range(n):
        at_s += alone_s + float(rng.exponential(mean_wait_s))
        movers.append(make(rng, at_s))
    return movers, at_s + alone_s


def learnt(
    rng: np.random.Generator, n: int = 14, make: MakeMover = walks, *, alone_s: float = 18.0
) -> tuple[list[sim.Mover], float]:
    """Ordinary single passages before anything is scored: a site that has been seen before."""
    movers, until_s = one_by_one(rng, n, make, alone_s=alone_s, mean_wait_s=2.0)
    return movers, until_s


def corridor_case(
    movers: Sequence[sim.Mover],
    until_s: float,
    *,
    seed: int,
    learnt_s: float = 0.0,
    sensor: Sensor | None = None,
    peak_snr_db: float = 25.0,
    **changes: object,
) -> Case:
    """A corridor with a wall behind the sensor, at its usual sample rate."""
    sensor = sensor or corridor()
    scene = sim.Scene(
        sensor=sensor,
        duration_s=until_s + EDGE_S,
        sample_rate_hz=RATE_HZ,
        movers=tuple(movers),
        ends_at_sensor=True,
        peak_snr_db=peak_snr_db,
        seed=seed,
    )
    scene = replace(scene, **changes)  # type: ignore[arg-type]  # as above
    return Case(scene=scene, told=sensor, learnt_s=learnt_s)
