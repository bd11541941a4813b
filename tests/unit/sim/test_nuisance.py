"""Nuisances: lines where mains physics puts them, at the level that was asked for; I/Q symmetry."""

from __future__ import annotations

import numpy as np
import pytest
from numpy.typing import NDArray

from ginnel.sim import Clicks, Clutter, Door, Fan, Hum, Lamps, Nuisance, Receiver, Scene, leaves, rain
from ginnel.words import Channels, Sensor

RATE_HZ = 8000


def powers(nuisance: Nuisance, *, channels: Channels, mains_hz: float = 50.0) -> NDArray[np.float64]:
    """Mean power spectrum of 100 ms Hann frames over the white noise's, for bins of 10 Hz."""
    sensor = Sensor(name="s", channels=channels, mains_hz=mains_hz)
    scene = Scene(
        sensor=sensor,
        duration_s=20,
        sample_rate_hz=RATE_HZ,
        nuisances=(nuisance,),
        receiver=Receiver(bits=None),
    )
    frames = scene.samples().reshape(-1, 800)
    window = np.hanning(801)[:-1]
    power = (np.abs(np.fft.fft(frames * window)) ** 2).mean(axis=0)
    noise = scene.noise_rms**2 * (window**2).sum() * (2 if channels is Channels.IQ else 1)
    return np.asarray(power / noise, dtype=np.float64)


@pytest.mark.parametrize("mains_hz", [50.0, 60.0])
def test_hum_stands_at_mains_frequency_at_its_level_with_odd_harmonics(mains_hz: float) -> None:
    ratio = powers(Hum(level_db=25.0, wander_hz=0.0), channels=Channels.MONO, mains_hz=mains_hz)
    line = round(mains_hz / 10)
    assert 10 * np.log10(ratio[line]) == pytest.approx(25.0, abs=0.5)
    assert 10 * np.log10(ratio[3 * line]) == pytest.approx(19.0, abs=0.7)
    assert 10 * np.log10(ratio[2 * line]) < 3.0


def test_lamps_stand_at_twice_mains_frequency_and_are_symmetric_in_iq() -> None:
    # 100 Hz reads 1.4242 m/s at 10.525 GHz: the false friend of the check table.
    ratio = powers(Lamps(level_db=30.0), channels=Channels.IQ)
    for harmonic in (10, 20, 30, 40):
        assert ratio[harmonic] > 5.0
        assert ratio[harmonic] == pytest.approx(ratio[-harmonic], rel=0.15)
    assert ratio[5] < 3.0


@pytest.mark.parametrize("channels", list(Channels))
def test_lamps_and_hum_have_their_level_in_one_channel(channels: Channels) -> None:
    # In I/Q a real line shares its power between +f and -f, and the noise doubles: the channel I tells.
    sensor = Sensor(name="s", channels=channels)
    for nuisance, line_hz in (
        (Lamps(level_db=28.0, wander_hz=0.0), 100),
        (Hum(level_db=28.0, wander_hz=0.0), 50),
    ):
        scene = Scene(
            sensor=sensor, duration_s=20, nuisances=(nuisance,), receiver=Receiver(bits=None), seed=line_hz
        )
        window = np.hanning(801)[:-1]
        frames = scene.samples().real.reshape(-1, 800)
        power = (np.abs(np.fft.rfft(frames * window)) ** 2).mean(axis=0)
        noise = scene.noise_rms**2 * (window**2).sum()
        assert 10 * np.log10(power[line_hz // 10] / noise) == pytest.approx(28.0, abs=0.3)


@pytest.mark.parametrize("centre_mps", [0.0, 2.5])
@pytest.mark.parametrize("channels", list(Channels))
def test_clutter_has_its_density_over_the_noise(channels: Channels, centre_mps: float) -> None:
    steady = Clutter(level_db=20.0, centre_mps=centre_mps, width_mps=1.0, gust_db=0.0)
    ratio = powers(steady, channels=channels)
    # 2.5 m/s are 175.5 Hz at 10.525 GHz.
    band = ratio[17:19] if centre_mps else ratio[1:3]
    assert 10 * np.log10(band.mean()) == pytest.approx(20.0, abs=1.0)


def test_lamps_can_be_switched() -> None:
    sensor = Sensor(name="s")
    scene = Scene(sensor=sensor, duration_s=4, nuisances=(Lamps(level_db=50.0, on_s=((2.0, 3.0),)),))
    seconds = scene.samples().reshape(4, -1).std(axis=1)
    assert seconds[2] > 3 * max(seconds[0], seconds[1], seconds[3])


def test_a_fan_keeps_within_its_tip_speed_and_goes_both_ways() -> None:
    ratio = powers(Fan(level_db=40.0, tip_mps=2.0), channels=Channels.IQ)
    # 2 m/s are 140.4 Hz at 10.525 GHz; phase modulation spills a little beyond.
    assert ratio[[12, -12]].min() > 10.0
    assert ratio[30:50].max() < 3.0


@pytest.mark.parametrize(("clutter", "at_hz"), [(leaves(level_db=20.0), 0), (rain(level_db=20.0), 176)])
def test_clutter_fills_its_band_of_speeds_and_no_more(clutter: Clutter, at_hz: int) -> None:
    ratio = powers(clutter, channels=Channels.IQ)
    band = round(at_hz / 10)
    assert ratio[band] > 10.0
    assert ratio[-band] > 10.0
    assert ratio[100:300].max() < 2.0


def test_leaves_come_in_gusts() -> None:
    scene = Scene(sensor=Sensor(name="s"), duration_s=60, nuisances=(leaves(level_db=30.0),))
    level_db = 20 * np.log10(scene.samples().reshape(60, -1).std(axis=1))
    assert np.ptp(level_db) > 6.0


def test_a_door_is_heard_only_while_it_swings() -> None:
    door = Door(opens_s=(2.0,), swing_s=1.5, stays_s=2.0, x_m=3.0)
    sensor = Sensor(name="s", channels=Channels.IQ)
    scene = Scene(
        sensor=sensor, duration_s=10, nuisances=(door,), peak_snr_db=200.0, receiver=Receiver(bits=None)
    )
    samples = scene.samples().astype(np.complex128)
    moving = np.abs(np.diff(samples)).reshape(-1)
    half = np.array([moving[k * 4000 : (k + 1) * 4000 - 1].max() for k in range(20)])
    swinging = {4, 5, 6, 11, 12, 13}  # halves of seconds: 2 to 3.5 s, 5.5 to 7 s
    assert min(half[k] for k in swinging) > 10 * max(half[k] for k in set(range(20)) - swinging - {7, 14})


def test_clicks_are_short_broad_and_as_many_as_asked_for() -> None:
    scene = Scene(
        sensor=Sensor(name="s"),
        duration_s=10,
        nuisances=(Clicks(at_s=(1.0, 4.5, 7.25), size=0.5),),
        peak_snr_db=80.0,
    )
    loud = np.flatnonzero(np.abs(scene.samples()) > 0.25)
    starts = loud[np.diff(loud, prepend=-1000) > 400]
    np.testing.assert_allclose(starts / RATE_HZ, [1.0, 4.5, 7.25], atol=2 / RATE_HZ)
    assert np.ptp(loud[loud < 2 * RATE_HZ]) < 0.02 * RATE_HZ
