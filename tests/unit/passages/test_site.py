"""What a mounting makes of a mover: the level law, the beam, zones, priors."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from ginnel.doppler.frames import plan_frames
from ginnel.passages.site import N_ZONES, NEPERS_PER_DB, VEHICLE, WALKER, ZONE_COSINE2, Site
from ginnel.words import Aspect, Mounting, Sensor


def site_of(sensor: Sensor, rate_hz: float = 4000.0) -> Site:
    return Site(sensor, plan_frames(sensor, rate_hz))


CORRIDOR = site_of(Sensor(name="s", mounting=Mounting(height_m=2.4, tilt_deg=15.0)))
LEVEL = site_of(Sensor(name="s", mounting=Mounting(height_m=1.0, offset_m=0.0)))
OBLIQUE = site_of(
    Sensor(
        name="s",
        mounting=Mounting(
            aspect=Aspect.OBLIQUE,
            height_m=1.0,
            offset_m=2.0,
            beam_angle_deg=45.0,
            beam_width_deg=(60.0, 40.0),
        ),
    )
)


@pytest.mark.parametrize("near_m", [1.0, 2.0, 5.0, 10.0, 20.0])
def test_on_the_beams_axis_level_falls_by_12_db_with_each_doubling(near_m: float) -> None:
    # Radar equation, R^-4: -12.0412 dB a doubling; nearest distance 0.3 m bends that a little at 1 m.
    near, far = LEVEL.nominal_level(np.array([near_m, 2 * near_m])) / NEPERS_PER_DB
    exact = 40 * np.log10(np.hypot(near_m, 0.3) / np.hypot(2 * near_m, 0.3))
    assert far - near == pytest.approx(exact, abs=0.02)
    if near_m >= 5:
        assert far - near == pytest.approx(-12.0412, abs=0.03)


def test_the_level_is_relative_to_its_greatest() -> None:
    x = np.concatenate([-np.geomspace(100, 0.01, 500), np.geomspace(0.01, 100, 500)])
    for site in (CORRIDOR, LEVEL, OBLIQUE):
        assert site.nominal_level(x).max() == pytest.approx(0.0, abs=0.01)


def test_half_power_is_lost_once_each_way_at_half_the_beam_width() -> None:
    # 30 degrees off a beam of 60 degrees, on either side: 3 dB out and 3 dB back. The path is 2 m aside
    # and the beam turned by 45 degrees: 15 and 75 degrees are seen at x = 2 / tan.
    angles = np.deg2rad([15.0, 45.0, 75.0])
    x_m = 2.0 / np.tan(angles)
    level_db = OBLIQUE.nominal_level(x_m) / NEPERS_PER_DB + 40 * np.log10(np.hypot(x_m, 2.0))
    # Lobes of -13 dB add to the main one: 10 log10(10^-0.3 + 10^-1.3) is -2.58 dB, on the axis +0.21.
    assert level_db - level_db[1] == pytest.approx([-5.59, 0.0, -5.59], abs=0.1)


def test_behind_the_sensor_it_hears_less() -> None:
    ahead, behind = CORRIDOR.nominal_level(np.array([3.0, -3.0])) / NEPERS_PER_DB
    assert ahead - behind > 20


@given(log_range=st.lists(st.floats(-3, 8), min_size=1, max_size=20))
def test_zone_weights_sum_to_one_and_none_is_negative(log_range: list[float]) -> None:
    weights = CORRIDOR.zone_weights(np.array(log_range))
    assert weights.shape == (N_ZONES, len(log_range))
    assert (weights >= 0).all()
    assert weights.sum(axis=0) == pytest.approx(1.0)


def test_each_zone_has_its_own_edge_to_itself() -> None:
    np.testing.assert_allclose(CORRIDOR.zone_weights(CORRIDOR.zone_edges), np.eye(N_ZONES), atol=1e-12)


def test_zone_cosines_are_those_of_their_distances() -> None:
    # At 1, 2, 4.5, 10 and 25 nearest distances; cos^2 = 1 - (d / R)^2.
    assert pytest.approx([0.0, 0.75, 0.95062, 0.99, 0.9984], abs=1e-5) == ZONE_COSINE2


def test_priors_are_proper() -> None:
    for site in (CORRIDOR, OBLIQUE):
        assert (np.linalg.eigvalsh(site.level_precision) > 0).all()
        assert (np.linalg.eigvalsh(site.drift_precision) > 0).all()


def test_a_bodys_own_size_costs_nothing_but_an_odd_level_curve_does() -> None:
    # Ten times as strong all along against 10 dB in one zone alone.
    def cost(level_db: list[float]) -> float:
        level = np.array(level_db) * NEPERS_PER_DB
        return float(0.5 * level @ CORRIDOR.level_precision @ level)

    assert cost([10.0] * N_ZONES) < 0.1
    assert cost([0.0, 0.0, 10.0, 0.0, 0.0]) > 5.0


def test_roads_get_vehicles_and_paths_get_walkers() -> None:
    road = site_of(Sensor(name="s", carrier_hz=24.125e9, max_speed_mps=30.0), 44100.0)
    assert (road.body, CORRIDOR.body) == (VEHICLE, WALKER)


def test_height_is_part_of_the_nearest_distance() -> None:
    assert CORRIDOR.offset_m == pytest.approx(1.4)  # 2.4 m less a centre line at 1 m
    assert LEVEL.offset_m == pytest.approx(0.3)  # nobody walks through the sensor
