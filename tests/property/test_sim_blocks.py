"""Laws of the simulator: block size changes nothing; echoes of several movers add up."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st

from ginnel.sim import (
    Clicks,
    Door,
    Fan,
    Hum,
    IqError,
    Lamps,
    Receiver,
    Scene,
    Wall,
    leaves,
    rain,
    vehicle,
    walker,
)
from ginnel.words import Channels, Sensor

FULL = Scene(
    sensor=Sensor(name="s", channels=Channels.IQ, highpass_hz=8.0),
    duration_s=4.3,
    sample_rate_hz=6000,
    movers=(walker(crossed_s=3.0), vehicle(crossed_s=2.0, y_m=4.0)),
    nuisances=(Hum(), Lamps(), Fan(), leaves(), rain(), Door(opens_s=(1.0,)), Clicks(per_hour=3000)),
    walls=(Wall(y_m=2.0),),
    receiver=Receiver(flicker_corner_hz=40.0, iq=IqError(gain_db=0.5, phase_deg=2.0, gain_drift_db=1.0)),
)
WHOLE = FULL.samples()


@settings(max_examples=15, deadline=None)
@given(block_samples=st.one_of(st.sampled_from([1000, 7681, 7680, 30_000]), st.integers(97, 20_000)))
def test_block_size_never_changes_a_sample(block_samples: int) -> None:
    np.testing.assert_array_equal(np.concatenate(list(FULL.blocks(block_samples))), WHOLE)


@settings(max_examples=10, deadline=None)
@given(
    crossed_s=st.lists(st.floats(0.5, 3.5), min_size=2, max_size=3),
    speed_mps=st.floats(0.5, 3.0),
    far_m=st.floats(3.0, 15.0),
)
def test_echoes_add_up(crossed_s: list[float], speed_mps: float, far_m: float) -> None:
    movers = tuple(
        walker(crossed_s=t, speed_mps=speed_mps, far_m=far_m, seed=k) for k, t in enumerate(crossed_s)
    )
    quiet = Scene(
        sensor=Sensor(name="s"),
        duration_s=4,
        sample_rate_hz=2000,
        receiver=Receiver(bits=None),
        peak_snr_db=200.0,
    )
    together = replace(quiet, movers=movers).samples()
    apart = sum(replace(quiet, movers=(mover,)).samples().astype(np.float64) for mover in movers)
    np.testing.assert_allclose(together, apart, atol=2e-6)
