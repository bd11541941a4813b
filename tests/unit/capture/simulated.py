"""One simulated capture as bytes, and what a replay finds in it."""

from __future__ import annotations

from dataclasses import replace
from functools import cache

import numpy as np

from ginnel import sim
from ginnel.chain import Chain
from ginnel.words import Channels, Direction, Mounting, Passage, SampleArray, Sensor

RATE_HZ = 2000.0
SENSOR = Sensor(name="lane", mounting=Mounting(height_m=2.4, tilt_deg=15.0))
SENSOR_IQ = replace(SENSOR, channels=Channels.IQ)
DURATION_S = 50.0


@cache
def pcm(sensor: Sensor = SENSOR) -> bytes:
    """Somebody approaches, somebody leaves; 16 bit."""
    scene = sim.Scene(
        sensor=sensor,
        duration_s=DURATION_S,
        sample_rate_hz=RATE_HZ,
        movers=(
            sim.walker(crossed_s=18.0, speed_mps=1.2, direction=Direction.APPROACHING, seed=0),
            sim.walker(crossed_s=36.0, speed_mps=1.5, direction=Direction.RECEDING, seed=1),
        ),
        seed=7,
    )
    samples = np.concatenate(list(scene.blocks()))
    values = samples.view(np.float32) if sensor.channels is Channels.IQ else samples
    whole: bytes = np.clip(np.rint(values * 32768.0), -32768, 32767).astype("<i2").tobytes()
    return whole


def samples_of(data: bytes, sensor: Sensor = SENSOR) -> SampleArray:
    values = np.frombuffer(data, "<i2").astype(np.float32) / np.float32(32768.0)
    return values.view(np.complex64) if sensor.channels is Channels.IQ else values


def replayed(samples: SampleArray, started_us: int, sensor: Sensor = SENSOR) -> list[Passage]:
    """What the chain finds when all samples are there at once."""
    chain = Chain(sensor, RATE_HZ, started_us)
    return [*chain.push(samples), *chain.finish()]
