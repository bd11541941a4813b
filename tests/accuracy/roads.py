"""Rows about vehicles on a road, seen from a pole beside it."""

from __future__ import annotations

from functools import partial

import numpy as np
from tests.accuracy import places
from tests.accuracy.cases import Case, Goals, Row

from ginnel import sim
from ginnel.words import Channels, Direction

_BODIES = (sim.CAR, sim.CAR, sim.CAR, sim.VAN, sim.BUS, sim.MOTORCYCLE)
_LANE_M = 1.6  # a lane's middle on either side of the road's


def traffic(seed: int, *, channels: Channels, carrier_hz: float, rate_hz: float, n: int = 26) -> Case:
    """All sorts at 20 to 90 km/h in two lanes; one in four brings a second behind it."""
    rng = np.random.default_rng([seed, 11])
    sensor = places.roadside(channels, carrier_hz)
    movers: list[sim.Mover] = []
    at_s = 0.0
    learnt_s = 0.0
    for number in range(n + 10):
        at_s += 12.0 + float(rng.exponential(5.0))
        if number == 10:
            learnt_s = at_s - 6.0
        speed_mps, direction = float(rng.uniform(20.0, 90.0)) / 3.6, places.way(rng)
        headways_s = (0.0, float(rng.uniform(1.5, 3.0))) if number >= 10 and rng.uniform() < 0.25 else (0.0,)
        lane_m = -_LANE_M if direction is Direction.APPROACHING else _LANE_M
        movers += [
            sim.vehicle(
                crossed_s=at_s + behind_s,
                speed_mps=speed_mps * float(rng.uniform(0.97, 1.03)),
                direction=direction,
                far_m=70.0,
                behind_m=40.0,
                y_m=sensor.mounting.offset_m + lane_m,
                body=_BODIES[int(rng.integers(len(_BODIES)))],
                seed=int(rng.integers(2**31)),
            )
            for behind_s in headways_s
        ]
    scene = sim.Scene(
        sensor=sensor,
        duration_s=at_s + places.EDGE_S,
        sample_rate_hz=rate_hz,
        movers=tuple(movers),
        peak_snr_db=25.0,
        peak_level=0.02,
        seed=seed,
    )
    return Case(scene=scene, told=sensor, learnt_s=learnt_s)


_GOALS = Goals(recall=0.97, precision=0.98, direction=0.98, bias_percent=1.0, mae_percent=2.0)

ROWS = (
    Row(
        name="roadside 20 to 90 km/h, mono 24.125 GHz",
        make=partial(traffic, channels=Channels.MONO, carrier_hz=places.K_BAND_HZ, rate_hz=16000.0),
        goals=_GOALS,
    ),
    Row(
        name="roadside 20 to 90 km/h, I/Q 10.525 GHz",
        make=partial(traffic, channels=Channels.IQ, carrier_hz=places.X_BAND_HZ, rate_hz=6000.0),
        goals=_GOALS,
    ),
)
