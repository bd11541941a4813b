"""Beam, range law, walls and the samples of one point that moves.

Doppler figures: the check table for 10.525 and 24.125 GHz, c exact. The range law is the radar equation.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import pytest

from ginnel.sim import Beam, Floor, Mover, Receiver, Scene, Wall, constant_speed, stop_and_go
from ginnel.sim.sensor import beam_gain, echo_paths
from ginnel.words import Channels, Direction, FloatArray, Mounting, MoverKind, Sensor

LEVEL = Mounting(height_m=1.0)
CLEAN = Receiver(bits=None)


@dataclass(frozen=True)
class Point:
    """One scatterer of 1 m^2, a metre above the floor, so far to the left of its path."""

    left_m: float = 0.0

    def cycle_rate_hz(self, speed_mps: FloatArray) -> FloatArray:
        return np.zeros_like(speed_mps)

    def places_m(self, phase: FloatArray, speed_mps: FloatArray) -> FloatArray:
        return np.stack([0 * phase, self.left_m + 0 * phase, 1 + 0 * phase], -1)[None]

    def powers(self, facing: FloatArray) -> FloatArray:
        return np.ones((1, *facing.shape))


def point_scene(
    speed_mps: float,
    direction: Direction,
    carrier_hz: float = 10.525e9,
    channels: Channels = Channels.IQ,
    y_m: float = 0.0,
    left_m: float = 0.0,
) -> Scene:
    path = constant_speed(
        crossed_s=8.0, speed_mps=speed_mps, direction=direction, far_m=30, behind_m=30, y_m=y_m
    )
    mover = Mover(path=path, body=Point(left_m=left_m), kind=MoverKind.ON_WHEELS, flicker_db=0.0)
    sensor = Sensor(name="s", carrier_hz=carrier_hz, channels=channels, mounting=LEVEL)
    return Scene(
        sensor=sensor,
        duration_s=16,
        movers=(mover,),
        receiver=CLEAN,
        beam=Beam(width_deg=(1e6, 1e6)),
        peak_snr_db=200.0,
    )


def level_db(x_m: float) -> float:
    places = np.array([[[x_m, 0.0, 1.0]]])
    _, levels = echo_paths(places, np.ones((1, 1)), LEVEL, Beam(), ())
    return float(20 * np.log10(levels[0, 0]))


@pytest.mark.parametrize("x_m", [2.0, 5.0, 12.5])
def test_doubling_the_range_costs_12_04_db(x_m: float) -> None:
    assert level_db(2 * x_m) - level_db(x_m) == pytest.approx(-12.0412, abs=1e-4)


def test_samples_of_a_passing_point_obey_the_range_law() -> None:
    samples = point_scene(1.0, Direction.APPROACHING).samples()
    at_6_m, at_3_m = (abs(samples[round((8.0 - x) * 8000)]) for x in (6.0, 3.0))
    assert 20 * np.log10(at_3_m / at_6_m) == pytest.approx(12.0412, abs=0.01)


@pytest.mark.parametrize(("carrier_hz", "expected_hz"), [(10.525e9, 94.088), (24.125e9, 215.666)])
@pytest.mark.parametrize("direction", [Direction.APPROACHING, Direction.RECEDING])
def test_a_walking_point_gives_the_tabled_doppler_with_its_sign(
    carrier_hz: float, expected_hz: float, direction: Direction
) -> None:
    samples = point_scene(1.34, direction, carrier_hz).samples()
    begin = 2.0 if direction is Direction.APPROACHING else 10.0
    part = samples[round(begin * 8000) : round((begin + 4) * 8000)].astype(np.complex128)
    # Mean phase step: exact for a pure tone.
    tone_hz = np.angle(part[1:] * part[:-1].conj()).mean() * 8000 / (2 * np.pi)
    sign = 1 if direction is Direction.APPROACHING else -1
    assert tone_hz == pytest.approx(sign * expected_hz, abs=2e-3)


def test_sideways_offset_bends_the_doppler_by_the_cosine() -> None:
    # v x / sqrt(x^2 + d^2) at x = d is 1/sqrt(2): 66.530 of 94.088 Hz.
    samples = point_scene(1.34, Direction.APPROACHING, y_m=3.0).samples().astype(np.complex128)
    at = round((8.0 - 3.0 / 1.34) * 8000)
    part = samples[at - 200 : at + 200]
    tone_hz = np.angle(part[1:] * part[:-1].conj()).mean() * 8000 / (2 * np.pi)
    assert tone_hz == pytest.approx(94.088 * 0.70711, abs=0.1)


@pytest.mark.parametrize("direction", [Direction.APPROACHING, Direction.RECEDING])
def test_samples_are_those_of_the_plain_formula_in_double_precision(direction: Direction) -> None:
    # The slow, obvious version: A exp(-j 4 pi R / lambda) / R^2 with R from the place at each sample.
    speed_mps, y_m, left_m = 3.0, 2.0, 1.0
    scene = point_scene(speed_mps, direction, 24.125e9, y_m=y_m, left_m=left_m)
    got = scene.samples()
    t = np.arange(len(got)) / 8000
    towards = -1.0 if direction is Direction.APPROACHING else 1.0
    # Left of somebody who goes towards -x is -y.
    distance_m = np.hypot(speed_mps * (t - 8.0), y_m + towards * left_m)
    expected = np.exp(-4j * np.pi * distance_m * 24.125e9 / 299_792_458) / distance_m**2
    heard = slice(2000, len(got) - 2000)
    scale = np.abs(got[heard]).max() / np.abs(expected[heard]).max()
    error = np.abs(got[heard] / (scale * expected[heard]) - 1)
    assert error.max() < 1e-4


def test_who_stops_keeps_facing_the_way_and_every_part_stops() -> None:
    # A stiff body: no part of it may move faster than its centre while it brakes, or at all while it stands.
    path = stop_and_go(
        started_s=0, speed_mps=2.0, direction=Direction.APPROACHING, stop_at_m=6.0, dwell_s=3.0
    )
    mover = Mover(path=path, body=Point(left_m=2.0), kind=MoverKind.ON_WHEELS, flicker_db=0.0)
    scene = replace(point_scene(1.0, Direction.APPROACHING), movers=(mover,), duration_s=9.0)
    samples = scene.samples().astype(np.complex128)
    speed_mps = np.angle(samples[1:] * samples[:-1].conj()) * 8000 / (2 * np.pi) / 70.21524
    heard = speed_mps[1600 : round((path.ended_s - 0.2) * 8000)]
    assert np.abs(heard).max() < 2.05
    standing = slice(round(5.5 * 8000), round(7.5 * 8000))
    assert np.abs(speed_mps[standing]).max() < 0.01


def test_mono_is_the_real_part_of_the_pair() -> None:
    mono = point_scene(1.34, Direction.APPROACHING, channels=Channels.MONO).samples()
    pair = point_scene(1.34, Direction.APPROACHING).samples()
    np.testing.assert_allclose(mono, pair.real, atol=1e-7)


def test_beam_is_half_power_at_half_its_width_and_turns_with_the_mounting() -> None:
    mounting = Mounting(height_m=1.0, beam_angle_deg=30.0, tilt_deg=10.0, beam_width_deg=(60.0, 30.0))
    quiet = Beam(floor_db=-200.0)

    def gain_db(side_deg: float, up_deg: float) -> float:
        side, up = np.deg2rad(side_deg), np.deg2rad(up_deg)
        x, y, z = np.cos(up) * np.cos(side), np.cos(up) * np.sin(side), np.sin(up)
        gain = beam_gain(quiet, mounting, np.array([x]), np.array([y]), np.array([z]))
        return float(10 * np.log10(gain[0]))

    assert gain_db(30, -10) == pytest.approx(0.0, abs=1e-9)
    assert gain_db(30, -10 + 15) == pytest.approx(-3.0103, abs=1e-3)
    assert gain_db(30, -10 - 15) == pytest.approx(-3.0103, abs=1e-3)
    # Sideways within the beam's own plane: 30 degrees off its axis.
    tilt = np.deg2rad(10)
    side = np.deg2rad(30)
    ahead, left = np.cos(side), np.sin(side)
    level, z = ahead * np.cos(tilt), -ahead * np.sin(tilt)
    x = level * np.cos(side) - left * np.sin(side)
    y = level * np.sin(side) + left * np.cos(side)
    gain = beam_gain(quiet, mounting, np.array([x]), np.array([y]), np.array([z]))
    assert 10 * np.log10(gain[0]) == pytest.approx(-3.0103, abs=1e-3)


def test_behind_the_sensor_only_the_floor_is_left_and_lobes_vary_it() -> None:
    x = np.full(2000, -5.0)
    y = np.linspace(-3, 3, 2000)
    flat = beam_gain(Beam(floor_db=-20), LEVEL, x, y, np.zeros(2000))
    np.testing.assert_allclose(10 * np.log10(flat), -20.0, atol=0.05)
    lobed = 10 * np.log10(beam_gain(Beam(floor_db=-20, side_lobes_db=6), LEVEL, x, y, np.zeros(2000)))
    assert np.ptp(lobed) > 3.0
    assert abs(lobed + 20).max() < 13.0


def test_a_wall_adds_an_image_path_that_is_longer_and_weaker() -> None:
    places = np.array([[[4.0, 0.0, 1.0]]])
    ranges_m, levels = echo_paths(places, np.ones((1, 1)), LEVEL, Beam(), (Wall(y_m=1.5, reflection=0.3),))
    # By hand: the image lies at y = 3, so 5 m off by Pythagoras; half of 4 + 5 m.
    assert ranges_m[:, 0] == pytest.approx([4.0, 4.5])
    assert levels[1, 0] < 0.6 * levels[0, 0]


def test_a_ripple_is_smooth_uneven_and_of_the_size_asked_for() -> None:
    """Over many seeds the gain in dB varies by the standard deviation; 0.5 degrees further it is alike."""
    angle = np.deg2rad(np.linspace(-60.0, 60.0, 241))
    ahead, left, up = np.cos(angle), np.sin(angle), np.zeros_like(angle)
    smooth = beam_gain(Beam(), LEVEL, ahead, left, up)
    uneven = np.array(
        [beam_gain(Beam(ripple_db=1.0, seed=seed), LEVEL, ahead, left, up) / smooth for seed in range(200)]
    )
    ripple_db = 10 * np.log10(uneven)
    assert ripple_db.std() == pytest.approx(1.0, abs=0.1)
    assert np.abs(np.diff(ripple_db, axis=1)).max() < 0.8
    assert not np.allclose(ripple_db[0], ripple_db[1])


def test_a_ripple_comes_from_its_seed() -> None:
    places = np.array([3.0]), np.array([1.0]), np.array([-1.0])
    one, again, other = (beam_gain(Beam(ripple_db=2.0, seed=seed), LEVEL, *places)[0] for seed in (1, 1, 2))
    assert one == again != other


def test_a_floor_mirrors_what_is_above_it() -> None:
    """Sensor and point 2 m and 1 m up, 4 m apart: 4 m level, image 3 m below the sensor, 5 m away (3-4-5)."""
    mounting = Mounting(height_m=2.0)
    place = np.array([[[4.0, 0.0, 1.0]]])
    wide = Beam(width_deg=(1e6, 1e6), floor_db=-300.0)
    ranges_m, levels = echo_paths(place, np.ones((1, 1)), mounting, wide, (Floor(reflection=0.3),))
    direct_m = np.sqrt(17.0)
    assert ranges_m[:, 0] == pytest.approx([direct_m, (direct_m + 5.0) / 2])
    assert levels[:, 0] == pytest.approx([1 / 17.0, 0.6 / (direct_m * 5.0)])


def test_a_ceiling_is_a_floor_above() -> None:
    """The point is 1.5 m below a ceiling of 2.5 m: its image is at 4 m, 2 m above the sensor."""
    place = np.array([[[3.0, 0.0, 1.0]]])
    wide = Beam(width_deg=(1e6, 1e6), floor_db=-300.0)
    ceiling = (Floor(up_m=2.5),)
    ranges_m, _ = echo_paths(place, np.ones((1, 1)), Mounting(height_m=2.0), wide, ceiling)
    assert ranges_m[1, 0] == pytest.approx((np.sqrt(10.0) + np.sqrt(13.0)) / 2)
